"""Figures: who is emphasised and how, what stands inside the image, labels that keep apart, the coverage scale."""

import json
from collections.abc import Callable
from functools import cache
from itertools import combinations, pairwise
from pathlib import Path

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.text import Annotation, Text

from coverage_lab.report import figures, figures_coverage, load
from coverage_lab.report.captions import Words
from coverage_lab.report.page import PICTURES, Picture, images
from coverage_lab.report.style import (
    LOOKS,
    MOST_EMPHASISED,
    chief,
    coverage_ticks,
    drawable,
    emphasised,
    house_style,
    looks,
    pair,
    runner_up,
    spread,
    stretched,
    unstretched,
)

Report = Callable[[str], Path]
Drawn = Callable[[str, Picture], Figure]
SHOWN = ["two-sided", "several", "upper", "simulated", "hostile"]
ALPHAS = [0.2, 0.05, 0.01, 1e-5]


@pytest.fixture(scope="module")
def drawn(report: Report) -> Callable[[str, Picture], Figure]:
    """The figure of a plan's report, laid out once."""

    @cache
    def found(name: str, picture: Picture) -> Figure:
        with house_style():
            figure = picture.draw(load(report(name)))
            FigureCanvasAgg(figure).draw()
        return figure

    return found


def words_of(figure: Figure) -> str:
    """All text of a figure."""
    return "\n".join(text.get_text() for text in figure.findobj(Text))


@pytest.mark.parametrize("picture", PICTURES, ids=lambda picture: picture.name)
@pytest.mark.parametrize("name", SHOWN)
def test_a_figure_says_what_it_is_about(name: str, picture: Picture, report: Report, drawn: Drawn) -> None:
    saved = load(report(name))
    if not picture.wanted(saved):
        assert picture.file not in (report(name) / "report.html").read_text(encoding="utf-8")
        return
    said = words_of(drawn(name, picture))
    assert f"n = {20 if name == 'several' else saved.document['verdict']['n']}" in said
    assert ("95 % one-sided upper bound" if name == "upper" else "95 % two-sided interval") in said
    assert ("simulated" if name == "simulated" else "enumerated") in said
    caption, alt = picture.words(saved)
    assert caption.endswith(".")
    assert alt.endswith(".")


@pytest.mark.parametrize("name", ["two-sided", "hostile", "several"])
def test_at_most_five_methods_are_emphasised_and_none_looks_like_another(name: str, report: Report) -> None:
    document = load(report(name)).document
    listed = emphasised(document)
    assert {chief(document), runner_up(document), "wald"} <= set(listed)
    assert len(listed) <= MOST_EMPHASISED
    shown = [looks(document)[method] for method in listed]
    for attribute in ("colour", "dashes", "marker"):
        assert len({getattr(look, attribute) for look in shown}) == len(shown)
    others = {look.colour for method, look in looks(document).items() if method not in listed}
    assert len(others) <= 1  # grey


def test_a_look_does_not_change_with_what_else_is_shown(report: Report) -> None:
    for name in ("two-sided", "upper", "simulated", "enumerated", "hostile"):
        styles = looks(load(report(name)).document)
        assert [styles[method].colour for method in ("wilson", "clopper-pearson", "wald")] == [
            LOOKS[0][0],
            LOOKS[1][0],
            LOOKS[-1][0],
        ]


def contrast_on_white(colour: str) -> float:
    """WCAG 2 contrast ratio."""
    channels = [int(colour[k : k + 2], 16) / 255 for k in (1, 3, 5)]
    linear = [c / 12.92 if c <= 0.04045 else ((c + 0.055) / 1.055) ** 2.4 for c in channels]
    return 1.05 / (0.2126 * linear[0] + 0.7152 * linear[1] + 0.0722 * linear[2] + 0.05)


def test_every_emphasised_colour_stands_out_on_white() -> None:
    assert contrast_on_white("#ffffff") == pytest.approx(1)
    assert contrast_on_white("#f0e442") < 3  # a negative control: the palette's yellow would fail
    assert min(contrast_on_white(colour) for colour, _, _ in LOOKS) >= 3 - 0.06


@pytest.mark.parametrize("name", SHOWN)
def test_labels_at_the_lines_do_not_overlap(name: str, drawn: Drawn) -> None:
    figure = drawn(name, PICTURES[0])
    for axes in figure.axes:
        labels = [item for item in axes.findobj(Annotation) if item.get_text()]
        assert len(labels) >= 3
        boxes = [Text.get_window_extent(item) for item in labels]
        assert not [1 for one, other in combinations(boxes, 2) if one.overlaps(other)]


def test_labels_that_overlap_would_be_noticed(drawn: Drawn) -> None:
    boxes = [Text.get_window_extent(item) for item in drawn("two-sided", PICTURES[0]).axes[0].findobj(Annotation)]
    assert boxes[0].overlaps(boxes[0])


@pytest.mark.parametrize("picture", PICTURES, ids=lambda picture: picture.name)
@pytest.mark.parametrize("name", SHOWN)
def test_nothing_leaves_the_image(name: str, picture: Picture, report: Report, drawn: Drawn) -> None:
    if picture.wanted(load(report(name))):
        figure = drawn(name, picture)
        box, (width, height) = figure.get_tightbbox(), figure.get_size_inches()
        assert box.x0 >= -0.01
        assert box.y0 >= -0.01
        assert box.x1 <= width + 0.01
        assert box.y1 <= height + 0.01


def test_the_same_figure_has_the_same_bytes(report: Report) -> None:
    saved = load(report("two-sided"))
    assert images(figures.width, saved) == images(figures.width, saved)


def test_the_users_own_settings_change_nothing(report: Report) -> None:
    import matplotlib as mpl

    saved = load(report("two-sided"))
    before = images(figures.misses, saved)
    with mpl.rc_context({"axes.facecolor": "red", "font.size": 30, "savefig.facecolor": "green"}):
        assert images(figures.misses, saved) == before
        assert mpl.rcParams["font.size"] == 30


@given(
    wanted=st.lists(st.floats(0, 1), min_size=1, max_size=9),
    gap=st.floats(0.001, 0.4),
)
def test_labels_are_spread_in_order_and_within_the_panel(wanted: list[float], gap: float) -> None:
    placed = spread(wanted, gap, 0.05, 0.95)
    fits = min(gap, 0.9 / max(1, len(wanted) - 1))
    assert all(0.05 - 1e-9 <= place <= 0.95 + 1e-9 for place in placed)
    assert all(after - before >= fits - 1e-9 for before, after in pairwise(sorted(placed)))
    order = sorted(range(len(wanted)), key=lambda k: (wanted[k], k))
    assert [placed[k] for k in order] == sorted(placed)


def test_labels_with_room_stay_where_they_belong() -> None:
    assert spread([0.2, 0.8, 0.5], 0.1, 0, 1) == pytest.approx([0.2, 0.8, 0.5])
    assert spread([0.5, 0.5], 0.2, 0, 1) == pytest.approx([0.4, 0.6])


@pytest.mark.parametrize("alpha", ALPHAS)
def test_the_coverage_scale_rises_reaches_both_ends_and_can_be_undone(alpha: float) -> None:
    shares = np.unique([0.0, 0.3, 1 - 2 * alpha, 1 - alpha, 1 - alpha / 2, 1 - 1e-9, 1.0, 1 + alpha / 8, 1 + alpha])
    heights = stretched(shares, alpha)
    assert np.isfinite(heights).all()
    assert (np.diff(heights) > 0).all()
    assert unstretched(heights, alpha) == pytest.approx(shares, abs=1e-12)


@pytest.mark.parametrize("alpha", ALPHAS)
def test_the_coverage_axis_names_the_nominal_level_and_both_ends(alpha: float) -> None:
    ticks = coverage_ticks(alpha, 0.0)
    assert {0.0, 1.0, round(1 - alpha, 14)} <= set(ticks)
    assert ticks == sorted(ticks)
    assert min(coverage_ticks(alpha, 1 - 2 * alpha)) == pytest.approx(1 - 2 * alpha)


@pytest.mark.parametrize(
    ("words", "shown"),
    [
        ("Wilson score", "Wilson score"),
        ("cost $x_1$", r"cost \$x_1\$"),
        ("rule 漢", "rule □"),
        ("two\n lines", "two lines"),
        ("x" * 50, "x" * 35 + "…"),
    ],
)
def test_anybodys_words_can_be_drawn(words: str, shown: str) -> None:
    assert drawable(words) == shown


def test_z_scores_demand_equality_where_the_exact_coverage_is_certain() -> None:
    exact, simulated = np.array([0.95, 1.0, 1.0, 0.0]), np.array([0.94, 1.0, 0.99, 0.0])
    found = figures.z_scores(exact, simulated, np.full(4, 1e4))
    assert found[0] == pytest.approx(-0.01 / np.sqrt(0.95 * 0.05 / 1e4))
    assert list(found[1:]) == [0.0, np.inf, 0.0]


def test_the_heat_map_reads_the_curve(report: Report) -> None:
    saved = load(report("several"))
    edges, values = figures_coverage.surface(saved, "wald", [20, 60])
    assert values.shape == (2, len(edges) - 1)
    assert (np.diff(edges) > 0).all()
    line = saved.curve[(saved.curve["n"] == 20) & (saved.curve["method"] == "wald")]
    assert np.isin(values[0], line["coverage"]).all()
    classes = figures_coverage.shade_edges(saved.document)
    assert classes == sorted(classes)
    assert classes[-2] == pytest.approx(0.95)
    assert classes[-3] == pytest.approx(0.925)


@pytest.mark.parametrize(("name", "reach"), [("two-sided", 20), ("several", 6)])
def test_the_saw_passes_through_the_planned_n(name: str, reach: int, report: Report) -> None:
    saved = load(report(name))
    n = saved.document["verdict"]["n"]
    beside = saved.steady[saved.steady["planned"] == n]
    assert sorted(set(beside["n"])) == list(range(n - reach, n + reach + 1))
    here = beside[beside["n"] == n].set_index("method")
    assert {"wald", *saved.document["verdict"]["prefer"]} == set(here.index)
    for row in saved.document["methods"]:
        if row["n"] == n and row["method"] in here.index:
            assert here.loc[row["method"], "worst_miss"] == pytest.approx(1 - row["minimum_coverage"], abs=1e-12)


def test_without_enumeration_there_is_no_saw(report: Report) -> None:
    assert load(report("simulated")).steady.empty
    assert not (report("simulated") / "figures/worst-by-n.png").exists()


def test_the_alternative_text_states_the_finding(report: Report) -> None:
    saved = load(report("two-sided"))
    texts: dict[str, Words] = {picture.name: picture.words(saved) for picture in PICTURES if picture.wanted(saved)}
    document = json.loads((report("two-sided") / "audit.json").read_text(encoding="utf-8"))
    assert pair(document) == ["wilson", "wald"]
    row = next(row for row in document["methods"] if row["method"] == "wald")
    assert f"plus-or-minus (Wald) falls to {100 * row['minimum_coverage']:.1f} %"[:-4] in texts["coverage"][1]
    assert texts["extremes"][1].startswith("The standard is met by Wilson score, ")
    assert "largest |z| is" in texts["cross-check"][1]
