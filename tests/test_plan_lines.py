"""The line of a key, found in any valid TOML text."""

import tomllib

from hypothesis import given
from hypothesis import strategies as st

from coverage_lab.plan.lines import LONGEST_STATEMENT, line_of, lines_of

# A statement, K standing for its number, and the path of the key that it holds.
STATEMENTS: list[tuple[str, tuple | None]] = [
    ("", None),
    ("# [no] table = 'here'", None),
    ("kK = 'a # [b]'  # a remark", ("kK",)),
    ("kK = [\n  1,  # one\n\n  [2, 3],\n]", ("kK",)),
    ('"k K" = """\n[not]\na = 1 \u2028 b = 2\n"""', ("k K",)),
    ("kK.inner = 1", ("kK", "inner")),
    ("kK = { inner = [1], other = 2 }", ("kK", "other")),
    ("[kK] # = [x]", ()),
    ("[ kK . 'deep er' ]", ()),
    ("[[many]]", ()),
    ("[many.kK]", ()),
]
TABLES = {"[kK] # = [x]": ("kK",), "[ kK . 'deep er' ]": ("kK", "deep er")}


def text_with_lines(chosen: list[tuple[str, tuple | None]]) -> tuple[str, dict[tuple, int]]:
    """A TOML text of these statements, with the line that every key was put on."""
    lines: list[str] = []
    places: dict[tuple, int] = {}
    table: tuple = ()
    elements = 0
    for k, (statement, path) in enumerate(chosen):
        if statement.startswith("[many") and not elements:
            statement = "[[many]]"
        if statement == "[[many]]":
            table, elements = ("many", elements), elements + 1
        elif statement.startswith("[many"):
            table = ("many", elements - 1, f"k{k}")
        elif statement in TABLES:
            table = tuple(part.replace("K", str(k)) for part in TABLES[statement])
        if path is not None:
            places[(*table, *(part.replace("K", str(k)) for part in path))] = len(lines) + 1
        lines += statement.replace("K", str(k)).split("\n")
    return "\n".join(lines), places


@given(
    st.lists(st.sampled_from(STATEMENTS), max_size=12),
    st.sampled_from(["", " ", "\t"]),
    st.sampled_from(["\n", "\r\n"]),
)
def test_every_key_is_found_on_its_line(chosen: list, indent: str, ending: str) -> None:
    text, places = text_with_lines(chosen)
    text = "\n".join(f"{indent}{line}" for line in text.split("\n"))
    tomllib.loads(text)
    found = lines_of(text.replace("\n", ending))
    assert {path: line_of(path, found) for path in places} == places


def test_what_has_no_line_of_its_own_is_where_it_stands() -> None:
    found = lines_of("a = 1\n[sample]\ncandidates = [\n 3,\n 4]\n[[one.many]]\n[[one.many]]\n")
    assert line_of(("sample", "candidates", 1), found) == 3
    assert line_of(("sample", "n"), found) == 2
    assert line_of(("one",), found) == line_of(("one", "many"), found) == line_of(("one", "many", 0, "k"), found) == 6
    assert line_of(("one", "many", 1), found) == 7
    assert line_of(("outcome",), found) is None
    assert line_of((), found) is None


def test_a_very_long_statement_ends_the_walk_and_not_the_program() -> None:
    long = "\n".join(["a = 1", "b = [", *["1,"] * (LONGEST_STATEMENT + 5), "]", "c = 2"])
    found = lines_of(long)
    assert found == {("a",): 1}
