"""The page: its structure, its policy, that it is inert, and that it says what audit.json says."""

import base64
import hashlib
import re
from collections.abc import Callable
from itertools import pairwise
from pathlib import Path

import pytest
from PIL import Image
from report_audits import PLANS, Tree, finished, page_of

from coverage_lab.report import load
from coverage_lab.report.page import COLOURS, PICTURES, together
from coverage_lab.report.style import chief
from coverage_lab.report.tables import anchor
from coverage_lab.report.words import points_at, points_places, row_of, share
from coverage_lab.rounding import percent

Report = Callable[[str], Path]
NAMES = sorted(PLANS)


@pytest.mark.parametrize("name", NAMES)
def test_structure(name: str, report: Report) -> None:
    tree = page_of(report(name))
    assert tree.all("html")[0][0]["lang"] == "en"
    assert len(tree.all("h1")) == 1
    for tag in ("header", "nav", "main", "title"):
        assert len(tree.all(tag)) == 1, tag
    assert tree.all("a")[0][0]["href"] == "#verdict"  # the skip link comes first
    ids = [attributes["id"] for _, attributes, _ in tree.elements if "id" in attributes]
    assert len(ids) == len(set(ids))
    for attributes, _, _ in tree.all("section", "aside"):
        assert attributes["aria-labelledby"] in ids
    levels = [int(tag[1]) for tag, _, _ in tree.elements if re.fullmatch(r"h[1-6]", tag)]
    assert all(after - before <= 1 for before, after in pairwise(levels))


@pytest.mark.parametrize("name", NAMES)
def test_images_state_their_finding_and_have_captions(name: str, report: Report) -> None:
    tree = page_of(report(name))
    images = tree.all("img")
    assert images
    assert len(images) == len(tree.all("figure")) == len(tree.all("figcaption"))
    for attributes, inside, _ in images:
        assert attributes["src"].startswith("data:image/png;base64,")
        assert re.search(r"\d", attributes["alt"])
        assert "figure" in inside
        assert int(attributes["width"]) > 0


@pytest.mark.parametrize("name", NAMES)
def test_tables_have_captions_and_scopes(name: str, report: Report) -> None:
    tree = page_of(report(name))
    tables = tree.all("table")
    assert len(tables) == len(tree.all("caption"))
    assert {attributes["scope"] for attributes, _, _ in tree.all("th")} == {"col", "row"}
    for attributes, _, _ in tree.all("div"):
        if attributes.get("role") == "region":
            assert attributes["tabindex"] == "0"
            assert attributes["aria-label"]


@pytest.mark.parametrize("name", NAMES)
def test_nothing_comes_from_elsewhere(name: str, report: Report) -> None:
    folder = report(name)
    text = (folder / "report.html").read_text(encoding="utf-8")
    tree = page_of(folder)
    ids = {attributes["id"] for _, attributes, _ in tree.elements if "id" in attributes}
    assert not re.search(
        r"""(?:https?:)?//[a-z0-9]|url\(|@import|fetch\(|XMLHttp""", re.sub(r"base64,[^\"]+", "", text)
    )
    for _, attributes, _ in tree.elements:
        assert "style" not in attributes
        assert not [key for key in attributes if key.startswith("on")]
        link = attributes.get("href", "")
        if link.startswith("#"):
            assert link[1:] in ids
        elif link:
            assert (folder / link).is_file()
    assert len(text.encode()) < 2_000_000


@pytest.mark.parametrize("name", ["two-sided", "hostile"])
def test_the_policy_names_the_digests_of_style_and_script(name: str, report: Report) -> None:
    text = (report(name) / "report.html").read_text(encoding="utf-8")
    policy = Tree(text).all("meta")[1][0]["content"]
    found = {}
    for tag, directive in (("style", "style-src"), ("script", "script-src")):
        (content,) = re.findall(f"<{tag}>(.*?)</{tag}>", text, re.DOTALL)
        digest = base64.b64encode(hashlib.sha256(content.encode()).digest()).decode()
        found[directive] = f"'sha256-{digest}'"
    directives = dict(part.strip().split(" ", 1) for part in policy.split(";"))
    assert directives == {
        "default-src": "'none'",
        "img-src": "data:",
        "base-uri": "'none'",
        "form-action": "'none'",
        **found,
    }


def test_hostile_words_are_inert(report: Report) -> None:
    folder = report("hostile")
    tree = page_of(folder)
    data, script = tree.all("script")
    assert data[0] == {"type": "application/json", "id": "box-limits"}
    assert "<" not in data[2]
    assert script[0] == {}
    assert script[2].startswith('"use strict"')
    assert all(attributes["src"].startswith("data:") for attributes, _, _ in tree.all("img"))
    assert "bold" not in [words for _, _, words in tree.all("b")]
    assert tree.all("h1")[0][2].startswith("<script>alert(1)</script> </title> مرحبا 😀 xxx")
    assert "<img src=x onerror=alert(2)>" in tree.by_id("plan")
    assert "</style><b>bold</b>" in tree.by_id("plan")
    protocol = (folder / "protocol.md").read_text(encoding="utf-8")
    assert r"\<img src=x onerror=alert(2)> # not a heading" in protocol
    assert protocol.count("\n# ") == 0


@pytest.mark.parametrize(
    ("name", "said"),
    [
        ("two-sided", "Recommended Wilson score interval, n = 60"),
        ("upper", "Recommended Clopper–Pearson exact upper bound, n = 80"),
        ("none", "None recommended No method on the list meets the standard"),
        ("undecided", "Undecided Undecided: more simulated draws are needed"),
    ],
)
def test_the_answer_comes_first(name: str, said: str, report: Report) -> None:
    tree = page_of(report(name))
    assert tree.all("h2")[0][2] == said
    assert tree.by_id("h-verdict") == said
    assert finished(name).verdict.sentence.replace("\u202f", " ") in tree.by_id("verdict").replace("\u202f", " ")


@pytest.mark.parametrize("name", ["none", "undecided"])
def test_without_a_recommendation_the_closest_is_shown_as_not_recommended(name: str, report: Report) -> None:
    assert finished(name).verdict.closest is not None
    tree = page_of(report(name))
    assert "Closest, not recommended" in tree.by_id("verdict")
    compared = tree.by_id("t-instead")
    assert "closest, not recommended" in compared
    assert "recommended" not in compared.replace("not recommended", "")


@pytest.mark.parametrize("name", ["two-sided", "upper", "several"])
def test_the_first_screen_says_how_good_how_sure_at_what_price_and_what_else(name: str, report: Report) -> None:
    document = load(report(name)).document
    said = page_of(report(name)).by_id("verdict")
    verdict = document["verdict"]
    for method in (verdict["method"], "wald"):
        row, named = row_of(document, method, verdict["n"]), row_of(document, verdict["method"], verdict["n"])
        assert row is not None
        assert named is not None
        for figure in (
            percent(row["minimum_coverage"], "down", 1, fixed=True),
            percent(row["mean_coverage"], "down", 1, fixed=True),
            points_at(row["mean_width"], points_places(named["mean_width"])),
        ):
            assert figure in said
    assert "exact minimum, approached at p = " in said
    assert "Plus-or-minus (Wald) would have claimed 95 %" in said
    assert "runner-up" in said
    assert "conditional on the planned range" in said
    if verdict["holds_on"]:
        assert f"{share(verdict['holds_on'][0], 'up')} to {share(verdict['holds_on'][1], 'down')}" in said


def numbers_of(value: object) -> list[float]:
    """Every number inside a document."""
    if isinstance(value, dict):
        return [number for item in value.values() for number in numbers_of(item)]
    if isinstance(value, list):
        return [number for item in value for number in numbers_of(item)]
    return [float(value)] if isinstance(value, int | float) and not isinstance(value, bool) else []


def unexplained(text: str, known: list[float]) -> list[str]:
    """The percentages and points in a text that are no rounding, either way, of a known share."""
    odd = []
    for written in re.findall(r"(\d+(?:\.\d+)?) (?:%|points)", text):
        unit = 10.0 ** -len(written.partition(".")[2])
        if not any(abs(float(written) - 100 * value) < unit for value in known):
            odd.append(written)
    return odd


@pytest.mark.parametrize("name", NAMES)
def test_every_figure_of_the_verdict_is_found_in_audit_json(name: str, report: Report) -> None:
    document = load(report(name)).document
    alpha, standard, n = document["alpha"], document["standard"], document["verdict"]["n"]
    rows = [row for row in document["methods"] if row["n"] == n or len(document["by_n"]) > 1]
    main = row_of(document, chief(document), n)
    known = [*numbers_of(rows), *numbers_of(document["verdict"]), *numbers_of(document["plan"]), document["confidence"]]
    known += [alpha / 2, *(1 - alpha * standard[kind] for kind in ("worst_miss", "mean_miss")), alpha, 1 - 2 * alpha]
    known += [2 * row["simulated"]["standard_error"] for row in rows if row["simulated"]["standard_error"]]
    if main:
        widths = [row["mean_width"] for row in rows if row["mean_width"]]
        known += [abs(width / main["mean_width"] - 1) for width in widths]
    text = page_of(report(name)).by_id("verdict")
    assert unexplained(text, known) == []


def test_a_wrong_figure_in_the_verdict_would_be_noticed(report: Report) -> None:
    document = load(report("two-sided")).document
    known = numbers_of(document["verdict"])
    assert unexplained("coverage 12.34 % and 0.5 points", known) == ["12.34", "0.5"]


def test_one_sided_reports_speak_of_excess_and_print_the_first_bounds(report: Report) -> None:
    tree = page_of(report("upper"))
    words = tree.all("main")[0][2]
    assert "mean width" not in words.lower()
    assert "Mean excess of the bound over the true proportion" in words
    assert re.match(r"Upper bound at the most extreme outcomes Events Upper bound 0 3.\d %", tree.by_id("t-bounds"))
    assert "Lower" not in tree.by_id("intervals")


def test_several_sizes_get_a_verdict_each_and_a_figure(report: Report) -> None:
    tree = page_of(report("several"))
    rows = re.findall(r"(\d+) (Clopper–Pearson exact|Wilson score)", tree.by_id("t-by-n"))
    assert [int(n) for n, _ in rows] == [20, 30, 40, 50, 60]
    assert "n = 60" in tree.by_id("t-worst-by-n")
    assert any("over true proportion and n" in caption for _, _, caption in tree.all("figcaption"))


def test_a_route_left_out_is_said(report: Report) -> None:
    for name in ("simulated", "enumerated"):
        assert "No cross-check: the plan leaves out one of the two routes." in page_of(report(name)).by_id("simulation")
    assert "lowest simulated value (± 2 standard errors)" in page_of(report("simulated")).by_id("verdict")
    assert "No samples were drawn" in page_of(report("enumerated")).by_id("simulation")


def test_the_cross_check_is_a_finding(report: Report) -> None:
    check = finished("two-sided").cross_check
    assert check is not None
    said = page_of(report("two-sided")).by_id("simulation")
    assert f"the largest |z| is {check.largest_z:.2f}" in said
    assert f"chi-square p = {check.chi_square_p:.2g}" in said


def test_the_simulation_is_told_in_the_usual_order(report: Report) -> None:
    tree = page_of(report("two-sided"))
    said = tree.by_id("simulation")
    order = ["Aims", "Data-generating mechanisms", "Estimands", "Methods", "Performance measures"]
    assert [term for _, inside, term in tree.all("dt") if term in order and "article" not in inside] == order
    assert "Monte Carlo standard error" in said


def test_sections_follow_one_another_as_promised(report: Report) -> None:
    tree = page_of(report("two-sided"))
    found = [attributes["id"] for attributes, _, _ in tree.all("section")]
    assert found == (
        [
            "verdict",
            "plan",
            "coverage",
            "methods",
            "intervals",
            "protocol",
            "reviewer",
            "summary",
            "simulation",
            "cautions",
            "references",
            "provenance",
        ]
    )
    linked = [attributes["href"][1:] for attributes, inside, _ in tree.all("a") if "nav" in inside]
    assert linked == found


def test_the_method_table_holds_every_method_and_can_be_sorted(report: Report) -> None:
    tree, audit = page_of(report("hostile")), finished("hostile")
    table = tree.by_id("t-methods")
    for label in audit.methods["label"]:
        assert label in table
    assert "not applicable: one-sided only" in tree.by_id("m-second-order")
    sortable = [attributes for attributes, _, _ in tree.all("table") if attributes.get("class") == "sortable"]
    assert [attributes["id"] for attributes in sortable] == ["t-methods"]
    for name in audit.methods["method"]:
        assert tree.by_id(anchor(name))


def test_limits_are_rounded_outward_for_every_outcome(report: Report) -> None:
    saved = load(report("two-sided"))
    rows = re.findall(r"(\d+) ([\d.]+) % ([\d.]+) %", page_of(report("two-sided")).by_id("intervals"))
    assert [int(events) for events, _, _ in rows] == list(range(61))
    for (_, lower, upper), row in zip(rows, saved.table.to_dict("records"), strict=True):
        assert 0 <= row["lower"] - float(lower) / 100 < 1.000001e-3
        assert 0 <= float(upper) / 100 - row["upper"] < 1.000001e-3


def test_long_numbers_are_not_shown(report: Report) -> None:
    for name in ("two-sided", "several", "upper"):
        text = page_of(report(name)).all("main")[0][2]
        text = text.replace(load(report(name)).document["provenance"]["plan_sha256"], "")
        assert not re.findall(r"\d\.\d{7,}", text)


@pytest.mark.parametrize("name", ["two-sided", "several", "upper", "simulated"])
def test_image_files_are_of_print_quality_and_carry_no_date(name: str, report: Report) -> None:
    folder = report(name)
    for picture in PICTURES:
        if (folder / picture.file).exists():
            with Image.open(folder / picture.file) as image:
                assert round(image.info["dpi"][0]) == 300
                assert set(image.info) == {"dpi"}
    tree = page_of(folder)
    for attributes, _, _ in tree.all("img"):
        content = base64.b64decode(attributes["src"].removeprefix("data:image/png;base64,"))
        assert b"tEXt" not in content
        assert b"tIME" not in content
        (folder.parent / "embedded.png").write_bytes(content)
        with Image.open(folder.parent / "embedded.png") as image:
            assert image.mode == "P"
            colours = image.getcolors()
            assert colours is not None
            assert len(colours) <= COLOURS


def test_numbers_keep_their_signs_on_the_line() -> None:
    assert (
        together("at least 92.5 % at n = 250 and p = 0.5 %")
        == "at least 92.5\u00a0% at n\u00a0=\u00a0250 and p\u00a0=\u00a00.5\u00a0%"
    )
    assert together(3) == 3
