"""Unusable plans: every fault is one exact line, all of them at once, and nothing ends in a traceback."""

from pathlib import Path

import pytest

from coverage_lab.checks import InputFault
from coverage_lab.intervals import EVERY
from coverage_lab.plan import make_plan, read_plan

GOOD = """\
title = "A study"
confidence = 0.95
side = "two-sided"

[outcome]
name = "a fault"
expected = 0.02
range = [0.005, 0.05]

[sample]
n = 250

[simulation]
replicates = 1000
"""
SIZE = "expected a whole number from 1 to 10000000"
SHARE = "expected a number strictly between 0 and 1"
RANGE = "expected [low, high] with 0 <= low <= high <= 1, not [0, 0] or [1, 1]"
REPLICATES = "expected a whole number from 1 to 1000000000"
TOP = (
    "title, confidence, side, study, outcome, sample, precision, rare, decision, standard, design, simulation, methods"
)

# What is replaced in the good plan, by what, and the fault without the file's name.
CHANGES = [
    # unknown keys
    ("confidence", "confidance", """:2: unknown key 'confidance': did you mean "confidence"?"""),
    ("n = 250", "n = 250\nm = 3", ":12: [sample]: unknown key 'm': must be one of n, candidates, horizon"),
    ("n = 250", "n = 250\nhorizn = 5000", """:12: [sample]: unknown key 'horizn': did you mean "horizon"?"""),
    ("n = 250", "n = 250\nside = 'upper'", ":12: [sample]: unknown key 'side': it belongs above the first table"),
    ("title", "replicates = 5\ntitle", ":1: unknown key 'replicates': it belongs in [simulation]"),
    ("title", "xyz = 5\ntitle", f":1: unknown key 'xyz': must be one of {TOP}"),
    ("[simulation]", "[simulations]", """:13: unknown key 'simulations': did you mean "simulation"?"""),
    ("[simulation]", "[precison]\n[simulation]", """:13: unknown key 'precison': did you mean "precision"?"""),
    (
        "[simulation]",
        "[design]\niccc = 0.1\n[simulation]",
        """:14: [design]: unknown key 'iccc': did you mean "icc"?""",
    ),
    # wrong types
    ('"A study"', "12", ":1: title = 12: expected one line of text"),
    ('"A study"', '"a\\nb"', ":1: title = 'a\\nb': expected one line of text"),
    ('"A study"', '" "', ":1: title = ' ': expected one line of text"),
    ('"A study"', '"\\u001b[2J"', ":1: title = '\\x1b[2J': expected one line of text"),
    ("0.95", '"0.95"', f":2: confidence = '0.95': {SHARE}"),
    ("0.95", "true", f":2: confidence = True: {SHARE}"),
    ("0.95", "[0.95]", f":2: confidence = [0.95]: {SHARE}"),
    ("0.95", "2026-01-01", f":2: confidence = datetime.date(2026, 1, 1): {SHARE}"),
    ('"two-sided"', '"both"', ":3: side = 'both': expected two-sided, upper or lower"),
    ('"two-sided"', "2", ":3: side = 2: expected two-sided, upper or lower"),
    ("[sample]\nn = 250", "[[sample]]\nn = 250", ":10: sample = [{'n': 250}]: expected a table [sample]"),
    (
        "[simulation]",
        "[study]\ntarget = 'all'\n[simulation]",
        ":14: [study] target = 'all': expected population or process",
    ),
    ("[simulation]", "[study]\nunit = 5\n[simulation]", ":14: [study] unit = 5: expected text"),
    # percentages, and what is no number
    ("0.95", "95", f":2: confidence = 95: {SHARE} (95 % is written 0.95)"),
    ("0.95", "99.9", f":2: confidence = 99.9: {SHARE} (99.9 % is written 0.999)"),
    ("0.02", "2", f":7: [outcome] expected = 2: {SHARE} (2 % is written 0.02)"),
    ("[0.005, 0.05]", "[0.5, 5]", f":8: [outcome] range = [0.5, 5]: {RANGE} (5 % is written 0.05)"),
    ("0.95", "1", f":2: confidence = 1: {SHARE}"),
    ("0.95", "0.0", f":2: confidence = 0.0: {SHARE}"),
    ("0.95", "-0.5", f":2: confidence = -0.5: {SHARE}"),
    ("0.95", "nan", f":2: confidence = nan: {SHARE}"),
    ("0.95", "inf", f":2: confidence = inf: {SHARE}"),
    ("0.02", "nan", f":7: [outcome] expected = nan: {SHARE}"),
    # ranges
    ("[0.005, 0.05]", "[0.05, 0.005]", f":8: [outcome] range = [0.05, 0.005]: {RANGE}"),
    ("[0.005, 0.05]", "[]", f":8: [outcome] range = []: {RANGE}"),
    ("[0.005, 0.05]", "[0.005]", f":8: [outcome] range = [0.005]: {RANGE}"),
    ("[0.005, 0.05]", "[0.005, 0.01, 0.05]", f":8: [outcome] range = [0.005, 0.01, 0.05]: {RANGE}"),
    ("[0.005, 0.05]", "[-0.1, 0.05]", f":8: [outcome] range = [-0.1, 0.05]: {RANGE}"),
    ("[0.005, 0.05]", "[0.005, inf]", f":8: [outcome] range = [0.005, inf]: {RANGE}"),
    ("[0.005, 0.05]", "[nan, nan]", f":8: [outcome] range = [nan, nan]: {RANGE}"),
    ("[0.005, 0.05]", "[0, 0]", f":8: [outcome] range = [0, 0]: {RANGE}"),
    ("[0.005, 0.05]", "[1.0, 1.0]", f":8: [outcome] range = [1.0, 1.0]: {RANGE}"),
    ("[0.005, 0.05]", "0.05", f":8: [outcome] range = 0.05: {RANGE}"),
    ("[0.005, 0.05]", "['a', true]", f":8: [outcome] range = ['a', True]: {RANGE}"),
    ("0.02", "0.2", ":7: [outcome] expected = 0.2: expected a proportion within the planned range, 0.005 to 0.05"),
    # sizes
    ("250", "0", f":11: [sample] n = 0: {SIZE}"),
    ("250", "-3", f":11: [sample] n = -3: {SIZE}"),
    ("250", "12.5", f":11: [sample] n = 12.5: {SIZE}"),
    ("250", "250.0", f":11: [sample] n = 250.0: {SIZE}"),
    ("250", "10000001", f":11: [sample] n = 10000001: {SIZE}"),
    ("250", "nan", f":11: [sample] n = nan: {SIZE}"),
    ("250", "true", f":11: [sample] n = True: {SIZE}"),
    (
        "n = 250",
        "n = 250\ncandidates = [9]",
        ":12: [sample] candidates = [9]: expected to be left out, since n is given; only one of the two can be",
    ),
    ("n = 250", "candidates = [\n  9,\n  0]", f":11: [sample] candidates, item 2 = 0: {SIZE}"),
    (
        "n = 250",
        "candidates = [9, 9]",
        ":11: [sample] candidates = [9, 9]: expected a list of different whole numbers from 1 to 10000000",
    ),
    (
        "n = 250",
        "candidates = []",
        ":11: [sample] candidates = []: expected a list of different whole numbers from 1 to 10000000",
    ),
    # weights
    (
        "[sample]",
        "prior = [0, 1]\n[sample]",
        ":10: [outcome] prior = [0, 1]: expected [a, b], two weights of a Beta distribution, both above 0",
    ),
    (
        "[sample]",
        "prior = [2000, 2]\n[sample]",
        ":10: [outcome] prior = [2000.0, 2.0]: expected weights "
        "that do not vanish over the planned range, 0.005 to 0.05",
    ),
    # standard and design
    (
        "[sample]",
        "[standard]\nkind = 'strict'\n[sample]",
        ":11: [standard] kind = 'strict': expected bradley, guaranteed or custom",
    ),
    (
        "[sample]",
        "[standard]\nkind = 'custom'\nmean_miss = 1\n[sample]",
        ':10: [standard]: expected the keys worst_miss and mean_miss, since kind = "custom", came only kind, mean_miss',
    ),
    (
        "[sample]",
        "[standard]\nworst_miss = 2\n[sample]",
        ':11: [standard] worst_miss = 2: expected to be left out unless kind = "custom"',
    ),
    (
        "[sample]",
        "[standard]\nkind = 'custom'\nmean_miss = 1\nworst_miss = -1\n[sample]",
        ":13: [standard] worst_miss = -1: expected a number above 0, a multiple of alpha",
    ),
    (
        "[sample]",
        "[design]\nkind = 'infinite'\n[sample]",
        """:11: [design] kind: unknown design 'infinite': did you mean "finite"?""",
    ),
    ("[sample]", "[design]\nkind = 3\n[sample]", ":11: [design] kind = 3: expected the name of a design"),
    (
        "[sample]",
        "[standard]\nkind = 'custom'\nmean_miss = 1\nworst_miss = 20\n[sample]",
        ":13: [standard] worst_miss = 20.0: expected a number below 20, or every interval would pass",
    ),
    # simulation
    ("1000", "-5", f":14: [simulation] replicates = -5: {REPLICATES}"),
    ("1000", "1e3", f":14: [simulation] replicates = 1000.0: {REPLICATES}"),
    ("1000", "1000\nseed = -1", ":15: [simulation] seed = -1: expected a whole number from 0 to 9223372036854775807"),
    (
        "1000",
        "1000\ngrid = [0.01, 0.5]",
        ":15: [simulation] grid, item 2 = 0.5: expected a proportion within the planned range, 0.005 to 0.05",
    ),
    (
        "1000",
        "1000\ngrid = [nan]",
        ":15: [simulation] grid, item 1 = nan: expected a proportion within the planned range",
    ),
    (
        "1000",
        "1000\ngrid = []",
        ":15: [simulation] grid = []: expected a list of proportions within the planned range, at least one",
    ),
    (
        "1000",
        "1000\nroutes = ['simulated', 'guessed']",
        ":15: [simulation] routes, item 2 = 'guessed': expected enumerated or simulated",
    ),
    (
        "1000",
        "1000\nroutes = []",
        ":15: [simulation] routes = []: expected a list of enumerated or simulated, or both",
    ),
    # methods
    (
        "1000",
        "1000\n[methods]\nonly = ['wilsn']",
        """:16: [methods] only: unknown method 'wilsn': did you mean "wilson"?""",
    ),
    (
        "1000",
        "1000\n[methods]\nprefer = ['zzz']",
        f":16: [methods] prefer: unknown method 'zzz': must be one of {', '.join(EVERY)}",
    ),
    (
        "1000",
        "1000\n[methods]\nonly = ['wald', 'wald']",
        ":16: [methods] only = ['wald', 'wald']: expected a list of different method names, at least one",
    ),
    (
        "1000",
        "1000\n[methods]\nonly = ['second-order']",
        ":16: [methods] only, item 1 = 'second-order': expected a method for side = \"two-sided\"; "
        "this one is for upper or lower only",
    ),
]


def faults_of(path: Path, **keywords) -> list[str]:
    with pytest.raises(InputFault) as caught:
        read_plan(path, **keywords)
    return [line.replace(str(path), "") for line in caught.value.faults]


def changed(folder: Path, *changes: tuple[str, str]) -> Path:
    text = GOOD
    for old, new in changes:
        assert old in text
        text = text.replace(old, new, 1)
    path = folder / "plan.toml"
    path.write_text(text, encoding="utf-8")
    return path


def test_the_good_plan_is_good(tmp_path: Path) -> None:
    assert read_plan(changed(tmp_path)).sizes == (250,)


@pytest.mark.parametrize(("old", "new", "line"), CHANGES, ids=[f"{old} -> {new}"[:60] for old, new, _ in CHANGES])
def test_one_fault_is_one_exact_line(old: str, new: str, line: str, tmp_path: Path) -> None:
    faults = faults_of(changed(tmp_path, (old, new)))
    assert line in faults
    if "confidance" not in new:
        assert faults == [line]


def test_a_one_sided_request_to_a_two_sided_method(tmp_path: Path) -> None:
    methods = "1000\n[methods]\nonly = ['wilson', 'blaker']\nprefer = ['sterne']"
    two_sided = 'expected a method for side = "upper"; this one is for two-sided only'
    assert faults_of(changed(tmp_path, ("two-sided", "upper"), ("1000", methods))) == [
        f":16: [methods] only, item 2 = 'blaker': {two_sided}",
        f":17: [methods] prefer, item 1 = 'sterne': {two_sided}",
    ]


def test_methods_that_cannot_be_computed_at_the_planned_size(tmp_path: Path) -> None:
    methods = "1000\n[methods]\nonly = ['shortest-exact']"
    assert faults_of(changed(tmp_path, ("n = 250", "candidates = [900, 1200]"), ("1000", methods))) == [
        ":16: [methods] only = ['shortest-exact']: "
        "expected a method that can be computed at n = 1200; these go up to n = 1000"
    ]
    beside_another = ("1000", "1000\n[methods]\nonly = ['shortest-exact', 'wald']")
    assert read_plan(changed(tmp_path, ("n = 250", "n = 1200"), beside_another)).sizes == (1200,)


def test_all_faults_at_once_in_the_order_of_the_file(tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    path.write_text(
        """\
confidance = 0.95
side = "both"
n = 3
[outcome]
range = [0.05, 0.005]
[sample]
n = 12.5
[design]
kind = "infinite"
iccc = 0.1
[simulation]
replicates = -1
grid = [0.1,
  nan]
[methods]
only = ["wilsn", 4]
prefer = ["blakr"]
"""
    )
    assert faults_of(path) == [
        """:1: unknown key 'confidance': did you mean "confidence"?""",
        ":2: side = 'both': expected two-sided, upper or lower",
        ":3: unknown key 'n': it belongs in [sample]",
        f":5: [outcome] range = [0.05, 0.005]: {RANGE}",
        f":7: [sample] n = 12.5: {SIZE}",
        """:9: [design] kind: unknown design 'infinite': did you mean "finite"?""",
        """:10: [design]: unknown key 'iccc': did you mean "icc"?""",
        f":12: [simulation] replicates = -1: {REPLICATES}",
        ":13: [simulation] grid, item 2 = nan: expected a proportion within the planned range",
        ":16: [methods] only, item 2 = 4: expected the name of a method",
        """:16: [methods] only: unknown method 'wilsn': did you mean "wilson"?""",
        """:17: [methods] prefer: unknown method 'blakr': did you mean "blaker"?""",
    ]


def test_what_is_missing(tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    path.write_text('title = "A study"\n')
    outcome, sample = "[outcome]: expected the key range or expected", "[sample]: expected the key n or candidates"
    assert faults_of(path) == [f": {outcome}, or [rare] limit, or [decision] goal"]
    assert faults_of(path, overrides={}) == [
        f": {outcome}, or [rare] limit, or [decision] goal; or give --range, --expected, --rule-out or --goal"
    ]
    assert faults_of(path, audited=True) == [
        f": {outcome}, which an audit needs",
        f": {sample}, which an audit needs",
    ]
    assert faults_of(path, audited=True, overrides={}) == [
        f": {outcome}, which an audit needs; or give --range or --expected",
        f": {sample}, which an audit needs; or give --n",
    ]


def test_an_audit_needs_n(tmp_path: Path) -> None:
    path = changed(tmp_path, ("n = 250", "horizon = 900"))
    assert read_plan(path).sizes == ()
    assert faults_of(path, audited=True) == [":10: [sample]: expected the key n or candidates, which an audit needs"]


@pytest.mark.parametrize(
    ("content", "line"),
    [
        (b"", ': expected a plan, but the file is empty; "coverage-lab plan FILE" writes a first one'),
        (b"# nothing\n\n", ': expected a plan, but the file is empty; "coverage-lab plan FILE" writes a first one'),
        (b"\x89PNG\r\n\x1a\n\x00", ": expected a text file (TOML in UTF-8), but byte 1 is not text"),
        (b'title = "caf\xe9"', ": expected a text file (TOML in UTF-8), but byte 13 is not text"),
        (
            b"title = 'x'\nn 250\n",
            ":2: expected a plan file, but this is not TOML: "
            "Expected '=' after a key in a key/value pair (at line 2, column 3)",
        ),
        (
            b"a = 1\na = 2\n",
            ":2: expected a plan file, but this is not TOML: Cannot overwrite a value (at line 2, column 6)",
        ),
        (b"a = " + b"[" * 5000, ": expected a plan file, but this is not TOML: nested too deeply"),
        (b"#" * (1 << 20) + b"\n", ": expected a plan file, but this one is larger than 1 MiB"),
    ],
)
def test_files_that_are_no_plan(content: bytes, line: str, tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    path.write_bytes(content)
    assert faults_of(path) == [line]


def test_a_number_too_long_to_print(tmp_path: Path) -> None:
    [line] = faults_of(changed(tmp_path, ("250", "0x" + "f" * 9000)))
    assert line == f":11: [sample] n: {SIZE}, came a number of thousands of digits"


def test_no_file_and_a_folder(tmp_path: Path) -> None:
    assert faults_of(tmp_path / "none.toml") == [": expected a plan file, but there is no such file"]
    assert faults_of(tmp_path) == [": expected a plan file, but this is a folder"]
    file = changed(tmp_path)
    assert faults_of(file / "below.toml") == [": expected a plan file, but it cannot be read: Not a directory"]
    assert faults_of(tmp_path / "a\0b") == [": expected a plan file, but it cannot be read: embedded null byte"]


def test_a_mapping_has_the_same_lines_without_numbers() -> None:
    with pytest.raises(InputFault) as caught:
        make_plan({"sample": {"n": 12.5}, "outcome": {"expected": 0.1}, 3: 4})
    assert caught.value.faults == (f"unknown key '3': must be one of {TOP}", f"[sample] n = 12.5: {SIZE}")
    with pytest.raises(InputFault, match="plan = 7: expected a mapping with the keys of a plan file"):
        make_plan(7)


def test_faults_of_options_name_the_option(tmp_path: Path) -> None:
    overrides = {
        "n": (0, 3, "many"),
        "range": (0.5, 0.1),
        "confidence": 95,
        "seed": "x y",
        "replicates": 1.5,
        "side": "up",
    }
    assert faults_of(changed(tmp_path, ("title", "titel")), overrides=overrides) == [
        """:1: unknown key 'titel': did you mean "title"?""",
        f"--confidence 95: {SHARE} (95 % is written 0.95)",
        "--side up: expected two-sided, upper or lower",
        f"--range 0.5 0.1: {RANGE}",
        f"--n 0: {SIZE}",
        f"--n many: {SIZE}",
        f"--replicates 1.5: {REPLICATES}",
        "--seed x y: expected a whole number from 0 to 9223372036854775807",
    ]


def test_a_fault_of_a_file_that_an_option_brings_to_light(tmp_path: Path) -> None:
    assert faults_of(changed(tmp_path), overrides={"range": (0.1, 0.2)}) == [
        ":7: [outcome] expected = 0.02: expected a proportion within the planned range, 0.1 to 0.2"
    ]
