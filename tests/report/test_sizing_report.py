"""The report of a sample size: its folder, its page, and that both say what sample-size.json says."""

import base64
import hashlib
import json
import math
import re
import shutil
from collections.abc import Callable
from dataclasses import replace
from functools import cache
from itertools import pairwise
from pathlib import Path

import pandas as pd
import pytest
from PIL import Image
from report_audits import Tree, finished, page_of
from sizing_answers import PLANS, answered, planned

from coverage_lab.checks import InputFault
from coverage_lab.intervals import CATALOGUE
from coverage_lab.plan import read_plan
from coverage_lab.records_sizing import rows_of
from coverage_lab.report import (
    check_sizing_target,
    load_sizing,
    page,
    rewrite_sizing,
    sizing_document,
    write,
    write_sizing,
)
from coverage_lab.report.sizing_page import PICTURES
from coverage_lab.report.sizing_tables import targets
from coverage_lab.report.sizing_view import SECTIONS
from coverage_lab.report.sizing_words import as_audit, chance, half, risk
from coverage_lab.report.style import OWN_FAMILY, looks
from coverage_lab.report.word_file import installed

Report = Callable[[str], Path]
NAMES = sorted(PLANS)
ALWAYS = ["verdict", "plan", "protocol", "cautions", "references", "provenance"]
ASKED = {
    "precision": ["formula", "targets", "ladder", "alternatives"],
    "rare": ["ladder", "rare"],
    "seen": ["ladder", "rare"],
    "decision": ["ladder", "claim"],
    "all": ["formula", "targets", "ladder", "rare", "claim", "alternatives"],
    "none": ["formula", "targets"],
    "coverage": ["targets", "ladder", "alternatives"],
}


@pytest.fixture(scope="module")
def sized(tmp_path_factory: pytest.TempPathFactory) -> Report:
    """Report folders by the name of their plan, each written once and not to be changed."""
    root = tmp_path_factory.mktemp("sizes")

    @cache
    def written(name: str) -> Path:
        return write_sizing(answered(name), root / name).parent

    return written


def state(path: Path) -> dict[str, bytes]:
    """Every file below the path with its bytes."""
    return {str(file.relative_to(path)): file.read_bytes() for file in sorted(path.rglob("*")) if file.is_file()}


def said_in(folder: Path, section: str) -> str:
    """The words of a section."""
    return page_of(folder).by_id(section)


def numbers_of(value: object) -> list[float]:
    """Every number inside a document."""
    if isinstance(value, dict):
        return [number for item in value.values() for number in numbers_of(item)]
    if isinstance(value, list):
        return [number for item in value for number in numbers_of(item)]
    return [float(value)] if isinstance(value, int | float) and not isinstance(value, bool) else []


def unexplained(text: str, known: list[float]) -> list[str]:
    """The percentages, points and n of a text that are no rounding, either way, of a known number."""
    odd, text = [], re.sub(r"\bn = (\d{1,3}) (\d{3})\b", r"n = \1\2", text)
    for written in re.findall(r"(\d+(?:\.\d+)?) (?:%|points)", text):
        unit = 10.0 ** -len(written.partition(".")[2])
        if not any(abs(float(written) - 100 * value) < unit for value in known):
            odd.append(written)
    return odd + [n for n in re.findall(r"\bn = (\d+)", text) if float(n) not in known]


# --- the page


@pytest.mark.parametrize("name", NAMES)
def test_structure(name: str, sized: Report) -> None:
    tree = page_of(sized(name))
    assert tree.all("html")[0][0]["lang"] == "en"
    for tag in ("h1", "header", "nav", "main", "title"):
        assert len(tree.all(tag)) == 1, tag
    assert tree.all("a")[0][0]["href"] == "#verdict"  # the skip link comes first
    ids = [attributes["id"] for _, attributes, _ in tree.elements if "id" in attributes]
    assert len(ids) == len(set(ids))
    for attributes, _, _ in tree.all("section", "aside"):
        assert attributes["aria-labelledby"] in ids
    levels = [int(tag[1]) for tag, _, _ in tree.elements if re.fullmatch(r"h[1-6]", tag)]
    assert all(after - before <= 1 for before, after in pairwise(levels))


@pytest.mark.parametrize("name", sorted(ASKED))
def test_sections_that_the_plan_does_not_ask_for_are_absent(name: str, sized: Report) -> None:
    tree = page_of(sized(name))
    found = [attributes["id"] for attributes, _, _ in tree.all("section")]
    assert found == [section for section in SECTIONS if section in (*ALWAYS, *ASKED[name])]
    assert [attributes["href"][1:] for attributes, inside, _ in tree.all("a") if "nav" in inside] == found


@pytest.mark.parametrize("name", NAMES)
def test_images_and_tables_are_described(name: str, sized: Report) -> None:
    tree = page_of(sized(name))
    assert len(tree.all("img")) == len(tree.all("figure")) == len(tree.all("figcaption"))
    for attributes, _, _ in tree.all("img"):
        assert attributes["src"].startswith("data:image/png;base64,")
        assert re.search(r"\d", attributes["alt"])  # a finding, not a name
    assert len(tree.all("table")) == len(tree.all("caption"))
    assert {attributes["scope"] for attributes, _, _ in tree.all("th")} <= {"col", "row"}
    assert all(words for _, _, words in tree.all("th"))
    for attributes, _, _ in tree.all("div"):
        if attributes.get("role") == "region":
            assert attributes["tabindex"] == "0"
            assert attributes["aria-label"]


@pytest.mark.parametrize("name", NAMES)
def test_nothing_comes_from_elsewhere(name: str, sized: Report) -> None:
    folder = sized(name)
    text = (folder / "report.html").read_text(encoding="utf-8")
    tree = Tree(text)
    ids = {attributes["id"] for _, attributes, _ in tree.elements if "id" in attributes}
    assert not re.search(r"""(?:https?:)?//[a-z0-9]|url\(|@import""", re.sub(r"base64,[^\"]+", "", text))
    for _, attributes, _ in tree.elements:
        assert "style" not in attributes
        assert not [key for key in attributes if key.startswith("on")]
        link = attributes.get("href", "")
        if link.startswith("#"):
            assert link[1:] in ids
        elif link:
            assert (folder / link).is_file()
    assert len(text.encode()) < 2_000_000


def test_the_policy_allows_the_style_and_no_script(sized: Report) -> None:
    text = (sized("hostile") / "report.html").read_text(encoding="utf-8")
    assert not Tree(text).all("script")
    (style,) = re.findall("<style>(.*?)</style>", text, re.DOTALL)
    digest = base64.b64encode(hashlib.sha256(style.encode()).digest()).decode()
    policy = Tree(text).all("meta")[1][0]["content"]
    assert dict(part.strip().split(" ", 1) for part in policy.split(";")) == {
        "default-src": "'none'",
        "img-src": "data:",
        "style-src": f"'sha256-{digest}'",
        "base-uri": "'none'",
        "form-action": "'none'",
    }


def test_hostile_words_are_inert(sized: Report) -> None:
    folder = sized("hostile")
    tree = page_of(folder)
    assert tree.all("h1")[0][2].startswith("<script>alert(1)</script> </title> مرحبا 😀 xxx")
    assert all(attributes["src"].startswith("data:") for attributes, _, _ in tree.all("img"))
    assert "bold" not in [words for _, _, words in tree.all("b")]
    assert "<img src=x onerror=alert(2)>" in tree.by_id("plan")
    protocol = (folder / "protocol.md").read_text(encoding="utf-8")
    assert protocol.startswith(r"# \<script>alert(1)\</script>")
    assert r"(basis: \*so\* [it\](is))" in protocol
    assert protocol.count("\n# ") == 0


# --- what the page says


@pytest.mark.parametrize(
    ("name", "said"),
    [
        ("precision", r"Recommended n = \d+ with the Wilson score interval"),
        ("upper", r"Recommended n = \d+ with the Clopper–Pearson exact upper bound"),
        ("rare", r"Recommended n = 93 units, at most 1 event"),
        ("decision", r"Recommended n = 114: claim at 109 events or more"),
        ("seen", r"Recommended n = \d+ units"),
        ("none", r"None recommended No n meets the targets"),
    ],
)
def test_the_answer_comes_first(name: str, said: str, sized: Report) -> None:
    tree = page_of(sized(name))
    assert re.fullmatch(said, tree.all("h2")[0][2].replace("\u00a0", " "))
    assert answered(name).verdict.sentence in tree.by_id("verdict")


@pytest.mark.parametrize("name", NAMES)
def test_every_figure_of_the_answer_is_found_in_the_json(name: str, sized: Report) -> None:
    document = json.loads((sized(name) / "sample-size.json").read_text(encoding="utf-8"))
    alpha, standard = document["alpha"], document["standard"]
    known = [*numbers_of(document), 0.5, 0.05, 0.9999, 1 - 2 * alpha, 1 - alpha / 2, 0.025]
    known += [1 - alpha * standard[kind] for kind in ("worst_miss", "mean_miss")]
    if document["targets"]["decision"]:
        known.append(1 - 2 * document["targets"]["decision"]["alpha"])
    assert unexplained(said_in(sized(name), "verdict"), known) == []


def test_a_wrong_figure_would_be_noticed() -> None:
    assert unexplained("coverage 12.34 %, 0.5 points, n = 7 and n = 1 008", [1008.0]) == ["12.34", "0.5", "7"]


def test_rounding_never_flatters() -> None:
    assert [chance(value) for value in (0.91799, 0.99999, 0.0)] == ["91.7 %", "over 99.99 %", "0 %"]
    assert [risk(value) for value in (0.02401, 1e-7, 0.0)] == ["2.5 %", "under 0.01 %", "0 %"]
    assert [half(value) for value in (0.019961, 0.0123)] == ["2.00 points", "1.23 points"]


def test_the_taught_formula_stands_beside_what_it_delivers(sized: Report) -> None:
    formula = answered("precision").formula
    said = said_in(sized("precision"), "verdict")
    wanted = math.ceil(1.959964**2 * 0.3 * 0.7 / 0.09**2)  # common practice: z²p(1 - p)/d²
    assert f"gives n = {wanted} at p = 30 %" in said
    plain = formula.delivers[(formula.delivers["n"] == wanted) & (formula.delivers["method"] == "wald")].iloc[0]
    assert f"its expected half-width is {half(plain['half_width'])}" in said
    assert f"the probability that the half-width is at most 9 points is {chance(plain['assurance'])}" in said
    rows = re.findall(r"n = (\d+), (?:plus-or-minus \(Wald\)|Wilson score)", said_in(sized("precision"), "t-delivers"))
    assert len(rows) == 5  # two sizes, two methods, and the recommendation


def test_every_method_shows_its_first_n_and_the_n_from_which_it_holds(sized: Report) -> None:
    said = said_in(sized("precision"), "t-targets")
    assert "Expected half-width: first n" in said
    assert "Assurance: holds from n on" in said
    table = answered("precision").methods.set_index("method")
    label = {"wilson": "Wilson score", "clopper-pearson": "Clopper–Pearson exact", "jeffreys": "Jeffreys"}
    for method, words in label.items():
        row = table.loc[method]
        columns = [
            f"{name}_{which}" for name in ("expected_width", "assurance", "coverage") for which in ("first_n", "safe_n")
        ]
        wanted = ["not found" if pd.isna(row[name]) else str(row[name]) for name in (*columns, "first_n", "safe_n")]
        assert f"{words} {' '.join(wanted)}" in said
    section = said_in(sized("precision"), "targets")
    assert "Looked at: every n from 1 to 300." in section
    assert "Probability that the half-width is at most 9 points, at least 80 % at a true proportion of 20 %" in section


def test_a_target_that_was_not_scanned_is_said() -> None:
    answer = answered("precision")
    by = {**answer.by_method, "jeffreys": {**answer.by_method["jeffreys"], "coverage": None}}
    changed = replace(answer, by_method=by)
    table = targets(sizing_document(changed))
    (row,) = (row for row in table.rows if row[0].text == "Jeffreys")
    assert [cell.text for cell in row[5:]] == ["not scanned"] * 4
    assert all(cell.text.isdigit() for cell in row[1:5])


def test_every_rung_has_its_number(sized: Report) -> None:
    steps = answered("all").inflated.document()
    said = said_in(sized("all"), "t-ladder")
    assert said.endswith(
        f"As calculated the recommended n {steps['base']} Design effect for a design effect of 1.5 "
        f"{steps['design_effect']} Finite population nothing planned {steps['finite']} Losses nothing planned "
        f"{steps['loss']} Units to recruit in {steps['whole_clusters']} whole clusters {steps['units']}"
    )
    assert steps["units"] == 10 * steps["whole_clusters"] > steps["base"]
    protocol = (sized("precision") / "protocol.md").read_text(encoding="utf-8")
    steps = answered("precision").inflated.document()
    assert (
        f"{steps['finite']} in a finite population of 2\u202f000; {steps['loss']} to make up for 5 % lost" in protocol
    )


def test_a_population_that_is_part_of_n_is_said(sized: Report) -> None:
    assert "in a finite population of 500; already part of the calculated n" in said_in(sized("seen"), "t-ladder")


def test_rare_outcomes_are_one_sided_and_zero_is_not_zero_risk(sized: Report) -> None:
    said = said_in(sized("rare"), "rare")
    assert "one-sided at 95 % confidence, whatever the plan's side" in said
    table = said_in(sized("rare"), "t-rare")
    for row in rows_of(answered("rare").rare):
        assert f"{row['events']} {row['n']} " in table
        assert chance(row["probability_at_hoped_for"]) in table
    # ln .05 / ln .95 = 58.4 (common practice); .95^93 + 93·.05·.95^92 = .0500 (from the binomial formula)
    assert [row["n"] for row in rows_of(answered("rare").rare)][:2] == [59, 93]
    assert answered("rare").zero_events in said
    assert "Zero events is not zero risk" in said_in(sized("rare"), "cautions")
    assert "Zero events" not in said_in(sized("decision"), "cautions")


def test_the_claim_shows_the_exact_test_and_the_fault_of_plus_or_minus(sized: Report) -> None:
    found = answered("decision").decision
    said = said_in(sized("decision"), "claim")
    assert f"First n with the power 100 {found.by_n.loc[99, 'critical']} events or more" in said
    assert f"Power holds from n on 114 109 events or more {risk(found.size)} {chance(found.power)}" in said
    rows = {row["method"]: row for row in rows_of(found.by_method)}
    for row in rows.values():
        keeps = "yes" if row["worst_size"] <= 0.025 else "no"
        figures = f"{row['critical']} events or more {risk(row['worst_size'])} {keeps} {chance(row['power'])}"
        assert figures in said_in(sized("decision"), "t-by-method")
    plain = rows["wald"]
    assert plain["worst_size"] > 0.05
    fault = (
        f"claim at {plain['critical']} events or more and be wrong with probability up to {risk(plain['worst_size'])}"
    )
    assert fault in said
    assert fault in said_in(sized("decision"), "verdict")


def test_where_another_target_sets_n_the_claim_is_told_at_that_n(sized: Report) -> None:
    answer = answered("all")
    assert answer.verdict.n > answer.decision.n
    row = answer.decision.by_n.set_index("n").loc[answer.verdict.n]
    rule = f"{int(row['critical'])} events or fewer"
    assert f"{rule} of {answer.verdict.n}" in said_in(sized("all"), "verdict")
    assert f"The recommended n {answer.verdict.n} {rule}" in said_in(sized("all"), "t-test")
    protocol = (sized("all") / "protocol.md").read_text(encoding="utf-8")
    assert f"will be claimed at {rule} in {answer.verdict.n} units" in protocol


def test_alternatives_are_priced_in_units(sized: Report) -> None:
    said = said_in(sized("precision"), "t-alternatives")
    verdict = answered("precision").verdict
    assert f"Wilson score, recommended {verdict.n} {verdict.units} reference" in said
    for item in verdict.alternatives:
        if item["safe_n"] is not None:
            units, more = verdict.units + item["more_units"], item["more_units"]
            assert f"{item['safe_n']} {units} {'+' if more > 0 else ''}{more} ".replace("-", "\u2212") in said
        assert item["against"] in said


def test_an_alternative_costs_nothing_less_than_another_target_asks_for(sized: Report) -> None:
    answer = answered("all")
    assert answer.verdict.needs["interval"] < answer.verdict.n  # seeing or claiming asks for more
    assert any(item["more_units"] is not None and item["more_units"] < 0 for item in answer.verdict.alternatives)
    assert "\u2212" not in said_in(sized("all"), "t-alternatives")


def test_without_a_recommendation_the_closest_is_shown_as_not_recommended(sized: Report) -> None:
    best = answered("none").verdict.best
    said = said_in(sized("none"), "verdict")
    assert f"Closest, not recommended: {best['label']} at n = {best['n']}" in said
    assert half(best["half_width"]) in said
    assert "closest, not recommended" in said_in(sized("none"), "t-delivers")
    assert "[n: to be stated" in said_in(sized("none"), "protocol")


def test_bounds_speak_of_their_distance(sized: Report) -> None:
    words = page_of(sized("upper")).all("main")[0][2].replace("\u00a0", " ")
    assert "half-width" not in words.replace(answered("upper").verdict.sentence, "").lower()
    assert "Probability that the distance of the bound from the true proportion is at most 10 points" in words


def test_a_method_of_the_users_own_is_drawn_in_colour() -> None:
    answer = answered("precision")
    mine = replace(CATALOGUE["jeffreys"], family=OWN_FAMILY)
    others = (method for method in answer.plan.methods if method.name != "jeffreys")
    changed = replace(answer, plan=replace(answer.plan, methods=(*others, mine)))
    assert [looks(as_audit(sizing_document(one)))["jeffreys"].emphasised for one in (answer, changed)] == [False, True]


def test_each_plan_has_its_cautions(sized: Report) -> None:
    for name in NAMES:
        said = said_in(sized(name), "cautions")
        assert "conditional on" in said
        assert "qualified statistical review" in said
    assert "α = 2.5 %" in said_in(sized("decision"), "cautions")
    assert "n independent units" in said_in(sized("all"), "cautions")
    assert "n independent units" not in said_in(sized("decision"), "cautions")


def test_figures_say_where_the_targets_hold(sized: Report) -> None:
    row = answered("precision").methods.set_index("method").loc["wilson"]
    images = [*page_of(sized("precision")).all("img"), *page_of(sized("decision")).all("img")]
    alts = " ".join(attributes["alt"] for attributes, _, _ in images).replace("\u00a0", " ")
    for target in ("expected_width", "assurance", "coverage"):
        first, safe = row[f"{target}_first_n"], row[f"{target}_safe_n"]
        assert f"Wilson score first at n = {first}, from n = {safe} on" in alts
    assert "first reached at n = 100 and holds from n = 114 on" in alts


def test_figures_of_a_plan_with_everything(sized: Report) -> None:
    files = {file for file in state(sized("all")) if file.startswith("figures/")}
    assert files == {picture.file for picture in PICTURES}
    for name in files:
        with Image.open(sized("all") / name) as image:
            assert round(image.info["dpi"][0]) == 300
            assert set(image.info) == {"dpi"}


# --- the folder


@pytest.mark.parametrize("name", NAMES)
def test_what_is_saved_reads_back_digit_for_digit(name: str, sized: Report) -> None:
    answer, saved = answered(name), load_sizing(sized(name))
    assert saved.document == json.loads(json.dumps(sizing_document(answer)))
    assert (
        saved.document.items() >= {k: v for k, v in answer.document().items() if k not in ("cautions", "plan")}.items()
    )
    made = {"scan": answer.scan, "characteristic": answer.characteristic}
    if answer.decision is not None:
        made["decision"] = answer.decision.by_n
    for table, frame in made.items():
        read = getattr(saved, table)
        assert rows_of(read) == rows_of(frame[list(read.columns)])


def test_a_table_that_is_not_asked_for_has_no_file(sized: Report) -> None:
    word = {"protocol.docx"} if installed() else set()
    always = {"sample-size.json", "plan.toml", "protocol.md", "report.html", *word}
    figure = "figures/operating-characteristics.png"
    assert set(state(sized("rare"))) == {*always, "rare.csv", "characteristic.csv", figure}
    assert set(state(sized("seen"))) == always


@pytest.mark.parametrize("name", ["all", "hostile"])
def test_the_saved_plan_reads_back_to_the_same_plan(name: str, sized: Report) -> None:
    assert read_plan(sized(name) / "plan.toml").document == planned(name).document


def test_the_same_answer_gives_the_same_bytes(sized: Report, tmp_path: Path) -> None:
    write_sizing(answered("all"), tmp_path / "again")
    assert state(tmp_path / "again") == state(sized("all"))


def test_the_page_is_made_again_from_the_saved_files_alone(tmp_path: Path) -> None:
    out = write_sizing(answered("decision"), tmp_path / "out").parent
    before = state(out)
    (out / "report.html").unlink()
    for file in (out / "figures").iterdir():
        file.unlink()
    rewrite_sizing(out)
    assert state(out) == before


def test_an_answer_to_the_same_plan_is_updated_and_other_files_stay(tmp_path: Path) -> None:
    out = write_sizing(answered("rare"), tmp_path / "out").parent
    before = state(out)
    (out / "notes.txt").write_text("mine")
    (out / "rare.csv").write_text("damaged")
    write_sizing(answered("rare"), out)
    assert state(out) == {**before, "notes.txt": b"mine"}


def test_another_plans_answer_is_refused_and_left_alone(tmp_path: Path) -> None:
    out = write_sizing(answered("rare"), tmp_path / "out").parent
    before = state(out)
    for refused in (
        lambda: write_sizing(answered("seen"), out),
        lambda: check_sizing_target(out, planned("seen").document, overwrite=False),
    ):
        with pytest.raises(InputFault, match=r"another plan's sample size \('Untitled plan'\).*--overwrite"):
            refused()
    assert state(out) == before
    write_sizing(answered("seen"), out, overwrite=True)
    assert not {"rare.csv", "characteristic.csv", "figures/operating-characteristics.png"} & set(state(out))


def test_an_audits_folder_is_refused_and_only_overwritten_when_asked(report: Report, tmp_path: Path) -> None:
    out = Path(shutil.copytree(report("enumerated"), tmp_path / "out"))
    before = state(out)
    with pytest.raises(InputFault, match="it holds the files of an audit's report"):
        write_sizing(answered("seen"), out)
    assert state(out) == before
    write_sizing(answered("seen"), out, overwrite=True)
    assert set(state(out)) == set(state(write_sizing(answered("seen"), tmp_path / "fresh").parent))


def test_a_sample_sizes_folder_is_refused_by_an_audit(tmp_path: Path) -> None:
    out = write_sizing(answered("seen"), tmp_path / "out").parent
    with pytest.raises(InputFault, match="other files named"):
        write(finished("enumerated"), out)


@pytest.mark.parametrize("text", ["", "{", '{"format": "another"}', "[1]"])
def test_files_of_others_under_our_names_are_refused(text: str, tmp_path: Path) -> None:
    (tmp_path / "sample-size.json").write_text(text)
    with pytest.raises(InputFault, match=r"other files named sample-size\.json"):
        write_sizing(answered("seen"), tmp_path)
    with pytest.raises(InputFault, match="expected a sample size saved by coverage-lab"):
        load_sizing(tmp_path)
    assert state(tmp_path) == {"sample-size.json": text.encode()}


@pytest.mark.parametrize("damage", ["n,method\n1,wilson\n", "", "n,critical,size,power\nx,1,.1,.2\n"])
def test_damaged_tables_are_faults(damage: str, tmp_path: Path) -> None:
    out = write_sizing(answered("decision"), tmp_path / "out").parent
    before = (out / "report.html").read_bytes()
    (out / "decision.csv").write_text(damage)
    with pytest.raises(InputFault, match=r"decision\.csv: expected the table that a sample size saved"):
        rewrite_sizing(out)
    assert (out / "report.html").read_bytes() == before


def test_a_document_without_its_keys_is_a_fault(tmp_path: Path) -> None:
    out = write_sizing(answered("seen"), tmp_path / "out").parent
    document = json.loads((out / "sample-size.json").read_text(encoding="utf-8"))
    del document["verdict"]
    (out / "sample-size.json").write_text(json.dumps(document))
    with pytest.raises(InputFault, match=r"verdict missing"):
        rewrite_sizing(out)


def test_nothing_is_left_half_written(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    out = write_sizing(answered("rare"), tmp_path / "out").parent
    before = state(out)

    def broken(*arguments: object) -> str:
        raise RuntimeError("broken template")

    monkeypatch.setattr(page, "sheet", broken)
    for folder in (out, tmp_path / "new/one"):
        with pytest.raises(RuntimeError, match="broken template"):
            write_sizing(answered("rare"), folder)
    assert state(out) == before
    assert [path.name for path in tmp_path.iterdir()] == ["out"]


def test_progress_is_told(tmp_path: Path) -> None:
    told: list[tuple[str, float]] = []
    write_sizing(answered("decision"), tmp_path / "out", progress=lambda what, share: told.append((what, share)))
    assert told == [("drawing", 1.0)]


def test_when_it_was_made_is_shown_where_it_is_known(tmp_path: Path) -> None:
    made = {"version": "1", "libraries": {"numpy": "2"}, "plan_sha256": "ab", "created": "2000-01-01T00:00:00+00:00"}
    out = write_sizing(answered("seen"), tmp_path / "out", provenance=made).parent
    assert "2000-01-01" in said_in(out, "provenance")
