"""Figures that compare the methods at the verdict's n, and the two routes: one function a figure."""

from collections.abc import Mapping, Sequence

import numpy as np
import pandas as pd
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from scipy.special import ndtri

from coverage_lab.records import Array
from coverage_lab.report.folder import Saved
from coverage_lab.report.style import (
    GREY,
    INK,
    RULE,
    SOFT,
    Look,
    canvas,
    chief,
    label,
    looks,
    percent_axis,
    scale_coverage,
)
from coverage_lab.report.words import SHORT_WIDTHS, Document, Row, count, level, tail
from coverage_lab.rounding import percent

ROW = 0.225  # inches a method
LEFT, RIGHT, BOTTOM, TOP = 2.3, 0.3, 0.55, 0.92


def measured(document: Document) -> list[Row]:
    """The methods with figures at the verdict's n, in catalogue order."""
    n = document["verdict"]["n"]
    return [row for row in document["methods"] if row["n"] == n and row["mean_width"] is not None]


def extremes(saved: Saved) -> Figure:
    """From worst to mean interval coverage over the planned range, and the worst over all proportions, per method."""
    document = saved.document
    rows = measured(document)
    figure, axes, styles = _by_method(document, rows, "Worst and mean interval coverage", _legend_words(rows))
    everywhere = [row["everywhere"]["minimum_coverage"] for row in rows]
    values = [row["minimum_coverage"] for row in rows] + [value for value in everywhere if value is not None]
    scale_coverage(axes, "x", np.array(values, dtype=float), document["alpha"])
    for k, row in enumerate(rows):
        look = styles[row["method"]]
        colour = look.colour if look.emphasised else SOFT
        axes.plot([row["minimum_coverage"], row["mean_coverage"]], [k, k], color=colour, lw=2.2, solid_capstyle="butt")
        axes.plot(row["mean_coverage"], k, "|", color=colour, ms=9, mew=1.6)
        _dot(axes, row["minimum_coverage"], k, row, look)
        if everywhere[k] is not None:
            axes.plot(everywhere[k], k, "x", color=colour, ms=4, mew=0.9)
    _levels(axes, document)
    axes.set_xlabel("interval coverage")
    return figure


def _legend_words(rows: Sequence[Row]) -> str:
    """How to read the marks."""
    words = "worst in the planned range (filled: meets the standard) to mean (bar)"
    return (
        f"{words}; ×: worst over (0, 1)"
        if any(row["everywhere"]["minimum_coverage"] is not None for row in rows)
        else words
    )


def _levels(axes: Axes, document: Document) -> None:
    """The nominal level, and what the standard asks everywhere."""
    alpha = document["alpha"]
    axes.axvline(1 - alpha, color=INK, lw=0.8, zorder=1)
    axes.axvline(1 - alpha * document["standard"]["worst_miss"], color=INK, lw=0.8, ls=(0, (1, 2)), zorder=1)


def width(saved: Saved) -> Figure:
    """The price in width: mean width of every method, the chief one's as a line to compare with."""
    document = saved.document
    rows = measured(document)
    words = SHORT_WIDTHS[document["side"]]
    about = f"{words} over the planned range, percentage points · filled: meets the standard, open: does not"
    figure, axes, styles = _by_method(document, rows, "The price in width", about)
    reference = next((row["mean_width"] for row in rows if row["method"] == chief(document)), None)
    start = min(0.0, *(row["mean_width"] for row in rows))
    for k, row in enumerate(rows):
        look = styles[row["method"]]
        axes.plot([start, row["mean_width"]], [k, k], color=look.colour if look.emphasised else RULE, lw=0.9, zorder=2)
        _dot(axes, row["mean_width"], k, row, look)
        if reference:
            axes.annotate(
                f"{row['mean_width'] / reference:.2f}", (1.0, k), xycoords=("axes fraction", "data"), ha="right",
                va="center", size=7.5, color=SOFT, xytext=(24, 0), textcoords="offset points",
            )  # fmt: skip
    if reference:
        axes.axvline(reference, color=INK, lw=0.8, zorder=1)
        axes.text(1.0, 1.012, "relative", transform=axes.transAxes, ha="center", va="bottom", size=7.5, color=SOFT)
    axes.set_xlim(start, max(row["mean_width"] for row in rows) * 1.06)
    axes.set_xlabel(words)
    percent_axis(axes.xaxis)
    return figure


def misses(saved: Saved) -> Figure:
    """Mean misses on each side of the truth, per method: interval too low to the left, too high to the right."""
    document = saved.document
    rows = measured(document)
    about = f"mean share of samples over the planned range · dotted: α per side, {percent(tail(document))}"
    figure, axes, styles = _by_method(document, rows, "Misses on each side", about)
    for k, row in enumerate(rows):
        look = styles[row["method"]]
        colour = look.colour if look.emphasised else GREY
        axes.barh(k, -row["missed_below"], height=0.62, color=colour, lw=0)
        axes.barh(k, row["missed_above"], height=0.62, color="white", edgecolor=colour, hatch="////", lw=0.9)
    most = max(max(row["missed_below"], row["missed_above"]) for row in rows)
    reach = 1.08 * max(most, tail(document))
    below = 0.0 if document["side"] == "lower" else reach
    above = 0.0 if document["side"] == "upper" else reach
    for side, shown in ((-tail(document), below), (tail(document), above)):
        if shown:
            axes.axvline(side, color=INK, lw=0.8, ls=(0, (1, 2)), zorder=3)
    axes.set_xlim(-below, above)
    axes.axvline(0, color=INK, lw=0.8)
    percent_axis(axes.xaxis)
    axes.xaxis.set_major_formatter(lambda value, _: percent(abs(round(value, 12))))
    zero = below / (below + above)
    for words, shown, x, align in (
        ("← interval too low", below, -0.02, "right"),
        ("interval too high →", above, 0.02, "left"),
    ):
        if shown:
            axes.text(zero + x, -0.36 / (ROW * len(rows)), words, transform=axes.transAxes, ha=align, va="top")
    return figure


def _by_method(
    document: Document, rows: Sequence[Row], title: str, about: str
) -> tuple[Figure, Axes, Mapping[str, Look]]:
    """A canvas with one row per method, the first on top, and what the figure is about."""
    height = TOP + BOTTOM + ROW * len(rows)
    routes = sorted({"simulated" if row["minimum_is"] == "simulated" else "enumerated" for row in rows})
    head = f"n = {count(document['verdict']['n'])} · {level(document)} · {' and '.join(routes)}"
    figure = canvas(title, f"{head}\n{about}", height, (LEFT, RIGHT + 0.15, BOTTOM, TOP))
    axes = figure.subplots()
    styles = looks(document)
    axes.set_ylim(len(rows) - 0.4, -0.6)
    axes.set_yticks(range(len(rows)), [label(document, row["method"]) for row in rows])
    axes.tick_params(axis="y", length=0)
    axes.spines["left"].set_visible(False)
    for text, row in zip(axes.get_yticklabels(), rows, strict=True):
        look = styles[row["method"]]
        text.set_color(look.colour if look.emphasised else INK)
        text.set_fontweight("bold" if row["method"] == chief(document) else "normal")
        text.set_fontsize(8)
    return figure, axes, styles


def _dot(axes: Axes, x: float, k: int, row: Row, look: Look) -> None:
    """A method's marker: filled when it meets the standard."""
    colour = look.colour if look.emphasised else SOFT
    face = colour if row["passes"] is True else "white"
    axes.plot(x, k, look.marker, ms=5.5, mfc=face, mec=colour, mew=1.2, zorder=4, clip_on=False)


def cross_check(saved: Saved) -> Figure:
    """The standardised difference of the two routes in every cell, with limits that chance passes once in 20."""
    document = saved.document
    both = paired(saved.cells)
    cells = len(both)
    bound = float(-ndtri(0.025 / cells))
    n = ", ".join(count(int(size)) for size in sorted(both["n"].unique()))
    about = f"n = {n} · {level(document)} · simulated against enumerated, {count(cells)} cells\n"
    about += f"z = (simulated − enumerated) / √(C(1 − C)/R) · dotted: ± {bound:.1f}, passed by chance in 1 of 20 audits"
    figure = canvas("Cross-check of the two routes", about, 3.6, (0.72, 0.25, 0.55, 0.85))
    axes = figure.subplots()
    styles = looks(document)
    finite = both[np.isfinite(both["z"])]
    for name, rows in sorted(finite.groupby("method", sort=False), key=lambda item: styles[str(item[0])].emphasised):
        look = styles[str(name)]
        axes.plot(
            rows["p"], rows["z"], look.marker, ms=4 if look.emphasised else 3, mfc=look.colour, mec="white", mew=0.4
        )
    for value in (-bound, bound):
        axes.axhline(value, color=INK, lw=0.8, ls=(0, (1, 2)))
    axes.axhline(0, color=INK, lw=0.8)
    reach = max(1.15 * bound, 1.1 * float(finite["z"].abs().max()) if len(finite) else 0.0)
    axes.set_ylim(-reach, reach)
    axes.set_ylabel("z")
    axes.set_xlabel("true proportion of the cell")
    percent_axis(axes.xaxis)
    return figure


def paired(cells: pd.DataFrame) -> pd.DataFrame:
    """One row a cell that both routes know: n, p, method, both coverages, draws and z."""
    keys = ["n", "p", "method"]
    sides = [cells.loc[cells["route"] == route, [*keys, "coverage", "draws"]] for route in ("enumerated", "simulated")]
    both = sides[0].drop(columns="draws").merge(sides[1], on=keys, suffixes=("_enumerated", "_simulated"))
    exact, drawn = both["coverage_enumerated"].to_numpy(float), both["coverage_simulated"].to_numpy(float)
    return both.assign(z=z_scores(exact, drawn, both["draws"].to_numpy(float)))


def z_scores(exact: Array, drawn: Array, draws: Array) -> Array:
    """Standardised differences; where the exact coverage is 0 or 1, 0 for equality and infinity for anything else."""
    error = np.sqrt(np.maximum(exact * (1 - exact), 0.0) / draws)
    certain = error * np.sqrt(draws) < 1e-8
    scaled = (drawn - exact) / np.where(certain, 1.0, error)
    return np.where(certain, np.where(np.abs(drawn - exact) <= 1e-12, 0.0, np.inf), scaled)
