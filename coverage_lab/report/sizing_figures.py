"""The figures of a sample size: what each n delivers, the first n that meets a target, and where it holds from."""

from collections.abc import Callable, Mapping, Sequence

import pandas as pd
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from coverage_lab.report.figures_coverage import Mark, label_ends, label_lines, level_lines
from coverage_lab.report.sizing_folder import SavedSizing
from coverage_lab.report.sizing_words import as_audit, chance, chief_of, goal, half_words, risk
from coverage_lab.report.style import (
    GREY,
    INK,
    LOOKS,
    SOFT,
    WIDTH,
    Look,
    canvas,
    label,
    looks,
    percent_axis,
    scale_coverage,
    wrapped,
)
from coverage_lab.report.words import Document, Row, count, level, place, planned_range, range_words
from coverage_lab.rounding import percent

PANEL = 2.5  # inches
LABELS, LEFT, BOTTOM, TOP, BETWEEN = 1.42, 0.72, 0.5, 0.98, 0.45
REACH = 1.6  # how far beyond the largest n of interest the figures go
LEAST_REACH = 60
DOTS_UP_TO = 150  # n in view up to which every one gets a dot
FEW_RATES = 40  # of a small population: each gets a dot, since nothing lies between them
HOW_MARKED = "open mark: first n · filled: holds from n on"


def axis_of_n(axes: Axes, top: int) -> None:
    """The axis of n from 1 on, in whole numbers."""
    axes.set_xlim(1, top)
    axes.xaxis.set_major_locator(MaxNLocator(6, integer=True))
    axes.xaxis.set_major_formatter(lambda value, _: count(round(value)))


def panels(title: str, about: str, number: int) -> tuple[Figure, Sequence[Axes]]:
    """A canvas with panels below one another that share n."""
    height = TOP + BOTTOM + PANEL * number + BETWEEN * (number - 1)
    figure = canvas(title, about, height, (LEFT, LABELS, BOTTOM, TOP))
    grid = figure.subplots(number, 1, sharex=True, squeeze=False, gridspec_kw={"hspace": BETWEEN / PANEL})
    grid[-1, 0].set_xlabel("n")
    return figure, list(grid[:, 0])


def heading(axes: Axes, words: str) -> None:
    """What the height stands for, above the axis."""
    axes.set_title(words, size=8.5, loc="left", pad=5, x=-(LEFT - 0.12) / (WIDTH * axes.get_position().width))


def found_at(document: Document, method: str, target: str) -> tuple[int | None, int | None]:
    """First n and safe n of a method for one target."""
    row = next((row for row in document["methods"] if row["method"] == method), None)
    item = row["by"][target] if row is not None else None
    return (None, None) if item is None else (item["first_n"], item["safe_n"])


def in_view(saved: SavedSizing, styles: Mapping[str, Look], targets: Sequence[str]) -> int:
    """The largest n that a figure of the scan shows: all that is of interest for the targets, and a little more."""
    document = saved.document
    horizon = int(saved.scan["n"].max())
    names = [name for name, look in styles.items() if look.emphasised]
    listed = [found_at(document, name, target)[1] for name in names for target in targets]
    listed += [row["n"] for row in document["at_n"]]
    largest = max((n for n in listed if n is not None), default=horizon)
    return min(horizon, max(LEAST_REACH, round(REACH * largest)))


def mark_found(axes: Axes, line: pd.DataFrame, column: str, found: tuple[int | None, int | None], look: Look) -> None:
    """An open mark at the first n, a filled one at the n from which the target holds."""
    for n, face, order in ((found[0], "white", 5), (found[1], look.colour, 6)):
        here = line[line["n"] == n]
        if n is not None and not here.empty:
            axes.plot(n, here[column].iloc[0], look.marker, ms=6.5, mew=1.2, mfc=face, mec=look.colour, zorder=order)


def draw_lines(
    axes: Axes, saved: SavedSizing, column: str, target: str, styles: Mapping[str, Look], top: int
) -> list[Mark]:
    """A line a method with its two marks; the labels of the emphasised ones."""
    marks = []
    shown = saved.scan[(saved.scan["n"] <= top) & saved.scan[column].notna()]
    for name, line in shown.groupby("method", sort=False):
        look = styles[str(name)]
        axes.plot(
            line["n"], line[column], color=look.colour, lw=look.weight, ls=look.line, zorder=3 if look.emphasised else 2
        )
        if look.emphasised:
            found = found_at(saved.document, str(name), target)
            mark_found(axes, line, column, found, look)
            weight = "bold" if name == chief_of(saved.document) else "normal"
            n, value = (float(end) for end in line[["n", column]].iloc[-1])
            low, high = axes.get_ylim()
            words = _held(saved.document, str(name), found[1])
            marks.append((words, n, min(max(value, low), high), look.colour, weight))
    return marks


def _held(document: Document, name: str, safe: int | None) -> str:
    """'Wilson score / holds from 380'."""
    held = f"not up to {count(document['horizon'])}" if safe is None else f"holds from {count(safe)}"
    return f"{wrapped(label(as_audit(document), name), 17)}\n{held}"


def at_recommended(axes: Axes, document: Document) -> None:
    """The recommended n, or the closest, as a line."""
    for row in document["at_n"][:1]:
        axes.axvline(row["n"], color=GREY, lw=2.5, zorder=0)


def _about(document: Document) -> str:
    """Range, confidence, side and route."""
    low, high = planned_range(as_audit(document))
    n = "".join(f" · vertical line: n = {count(row['n'])}" for row in document["at_n"][:1])
    return f"{level(document)} · planned range {range_words(low, high)} · enumerated\n{HOW_MARKED}{n}"


def worst_coverage(saved: SavedSizing) -> Figure:
    """Worst interval coverage over the planned range at every n: the list, plus-or-minus and the methods asked for."""
    document = saved.document
    alike = as_audit(document)
    styles = looks(alike)
    top = in_view(saved, styles, ("coverage",))
    figure, (axes,) = panels("Worst interval coverage against n", _about(document), 1)
    values = saved.scan.loc[saved.scan["n"] <= top, "minimum_coverage"].dropna().to_numpy(float)
    scale_coverage(axes, "y", values, document["alpha"])
    axis_of_n(axes, top)
    at_recommended(axes, document)
    for (_, value), dashes in zip(level_lines(alike), ((), (1, 2)), strict=False):
        axes.axhline(value, color=INK, lw=0.8, ls=(0, dashes or None), zorder=1)
    marks = draw_lines(axes, saved, "minimum_coverage", "coverage", styles, top)
    heading(axes, "worst interval coverage")
    label_lines(axes, alike, marks, PANEL)
    return figure


def precision(saved: SavedSizing) -> Figure:
    """Expected half-width and assurance at every n."""
    document = saved.document
    styles = looks(as_audit(document))
    top = in_view(saved, styles, ("expected_width", "assurance"))
    asked = document["targets"]["precision"]
    number = 1 if asked["assurance"] is None else 2
    about = _about(document)
    what = "Half-width" if document["side"] == "two-sided" else "Distance of the bound"
    figure, grid = panels(f"{what}{' and assurance' if number > 1 else ''} against n", about, number)
    _half_width(grid[0], saved, styles, top)
    if number > 1:
        _assurance(grid[1], saved, styles, top)
    return figure


def _half_width(axes: Axes, saved: SavedSizing, styles: Mapping[str, Look], top: int) -> None:
    """The expected half-width at the worst proportion of the range."""
    limit = float(saved.document["targets"]["precision"]["half_width"])
    axis_of_n(axes, top)
    reached = saved.scan.loc[saved.scan["n"] == top, "half_width"].dropna()
    axes.set_ylim(0, max(3 * limit, 1.2 * float(reached.max())))
    axes.yaxis.set_major_formatter(lambda value, _: f"{100 * value:g}")
    at_recommended(axes, saved.document)
    axes.axhline(limit, color=INK, lw=0.8, ls=(0, (1, 2)), zorder=1)
    marks = draw_lines(axes, saved, "half_width", "expected_width", styles, top)
    heading(axes, f"expected {half_words(saved.document)}, percentage points")
    label_ends(axes, [*marks, (f"asked {goal(limit)}", float(top), limit, SOFT, "normal")], PANEL)


def _assurance(axes: Axes, saved: SavedSizing, styles: Mapping[str, Look], top: int) -> None:
    """The probability of a half-width within the limit, at the expected proportion."""
    document = saved.document
    asked = float(document["targets"]["precision"]["assurance"])
    axis_of_n(axes, top)
    axes.set_ylim(0, 1.02)
    percent_axis(axes.yaxis)
    at_recommended(axes, document)
    axes.axhline(asked, color=INK, lw=0.8, ls=(0, (1, 2)), zorder=1)
    marks = draw_lines(axes, saved, "assurance", "assurance", styles, top)
    limit = goal(document["targets"]["precision"]["half_width"])
    heading(
        axes,
        f"probability that it is at most {limit}, at a true proportion of {place(document['outcome']['expected'])}",
    )
    label_ends(axes, [*marks, (f"asked {percent(asked)}", float(top), asked, SOFT, "normal")], PANEL)


def operating(saved: SavedSizing) -> Figure:
    """Operating characteristics: the chance of no more than the allowed events, by the true rate."""
    document = saved.document
    target, alpha = document["targets"]["rare"], document["alpha"]
    level_ = f"{percent(document['confidence'])} confidence, one-sided"
    about = f"{level_} · computed exactly\neach line: events allowed and its n"
    figure = canvas("Chance to rule the rate out", about, TOP + BOTTOM + 3.0, (LEFT, 0.35, BOTTOM, TOP))
    axes = figure.subplots()
    for k, (allowed, line) in enumerate(saved.characteristic.groupby("events", sort=True)):
        colour, dashes, marker = LOOKS[k] if k < len(LOOKS) else (GREY, (), "o")
        row = next(row for row in document["rare"] if row["events"] == allowed)
        words, look = _operating_words(row, target), Look(colour, dashes)
        axes.plot(line["p"], line["probability"], color=colour, ls=look.line, lw=1.4, label=words, zorder=3)
        if len(line) <= FEW_RATES:
            axes.plot(line["p"], line["probability"], ".", color=colour, ms=5, zorder=3)
        if target["hoped_for"] is not None:
            at = row["probability_at_hoped_for"]
            axes.plot(target["hoped_for"], at, marker, ms=6, mew=1, mfc=colour, mec="white", zorder=4, clip_on=False)
    _ground(axes, target, alpha)
    axes.legend(loc="upper right", frameon=False, fontsize=8, handlelength=3.2, borderaxespad=0)
    heading(axes, "probability of no more than the allowed events")
    return figure


def _operating_words(row: Row, target: Row) -> str:
    """'at most 1 event in 473: 91.7 % at 0.1 %'."""
    allowed = "no event" if row["events"] == 0 else f"at most {count(row['events'])}"
    said = f"{allowed} in {count(row['n'])}"
    if row["probability_at_hoped_for"] is None:
        return said
    return f"{said}: {chance(row['probability_at_hoped_for'])} at {place(target['hoped_for'])}"


def _ground(axes: Axes, target: Row, alpha: float) -> None:
    """The rate to be ruled out, the hoped-for one, and the chance of ruling out wrongly."""
    axes.set_xlim(0, min(2 * target["limit"], 1.0))
    axes.set_ylim(0, 1.02)
    percent_axis(axes.xaxis)
    percent_axis(axes.yaxis)
    axes.set_xlabel("true rate")
    axes.axhline(alpha, color=INK, lw=0.8, ls=(0, (1, 2)), zorder=1)
    axes.axvline(target["limit"], color=INK, lw=0.8, zorder=1)
    _beside(axes, f"to be ruled out:\n{place(target['limit'])}", (target["limit"], 0.42), (5, 0), "left")
    _beside(axes, f"α = {percent(alpha)}", (axes.get_xlim()[1], alpha), (0, 3), "right")


def _beside(axes: Axes, words: str, at: tuple[float, float], by: tuple[float, float], align: str) -> None:
    """Words a few points beside a place."""
    axes.annotate(words, at, xytext=by, textcoords="offset points", size=8, color=SOFT, ha=align)


def power(saved: SavedSizing) -> Figure:
    """Power and attained size of the exact test at every n: the saw, with the first and the safe n."""
    document = saved.document
    found, target = document["decision"], document["targets"]["decision"]
    last = int(saved.decision["n"].max())
    top = min(last, max(LEAST_REACH, round(REACH * (found["safe_n"] or last))))
    side = "lower" if found["claim"] == "above" else "upper"
    values = f"goal {place(target['goal'])}, believed {place(target['believed'])}"
    about = f"exact binomial test, one-sided ({side} limit) · {values}"
    figure, (upper, lower) = panels("Power and attained size against n", f"{about} · computed exactly\n{HOW_MARKED}", 2)
    shown = saved.decision[saved.decision["n"] <= top]
    _saw(upper, shown, "power", (target["power"], f"asked {place(target['power'])}"), found, chance)
    _saw(lower, shown, "size", (target["alpha"], f"α {place(target['alpha'])}"), found, risk)
    axis_of_n(upper, top)
    upper.set_ylim(0, 1.02)
    lower.set_ylim(0, 1.25 * max(target["alpha"], float(shown["size"].max())))
    heading(upper, f"power: claimed rightly, if the proportion is {place(target['believed'])}")
    heading(lower, f"attained size: claimed wrongly, if the proportion is {place(target['goal'])}")
    return figure


def _saw(
    axes: Axes,
    shown: pd.DataFrame,
    column: str,
    asked: tuple[float, str],
    found: Row,
    written: Callable[[float], str],
) -> None:
    """One saw with its target, its two marks and what they are."""
    look = Look(*LOOKS[1], weight=0.9, emphasised=True)
    dot = "." if len(shown) <= DOTS_UP_TO else ""
    axes.plot(shown["n"], shown[column], color=look.colour, lw=look.weight, marker=dot, ms=3, zorder=3)
    percent_axis(axes.yaxis)
    axes.axhline(asked[0], color=INK, lw=0.8, ls=(0, (1, 2)), zorder=1)
    axes.plot([], [], color=INK, lw=0.8, ls=(0, (1, 2)), label=asked[1])
    mark_found(axes, shown, column, (found["first_n"], found["safe_n"]), look)
    for n, words, face in ((found["first_n"], "first n", "white"), (found["safe_n"], "holds from n", look.colour)):
        here = shown[shown["n"] == n]
        if not here.empty:
            told = f"{words} = {count(n)}:\n{written(float(here[column].iloc[0]))}"
            axes.plot([], [], look.marker, ms=6.5, mew=1.2, mfc=face, mec=look.colour, label=told)
    axes.legend(loc="upper left", bbox_to_anchor=(1.0, 1.0), frameon=False, fontsize=7.6, handlelength=1.2)
