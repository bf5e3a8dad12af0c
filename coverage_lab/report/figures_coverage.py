"""Figures of interval coverage against the true proportion, and over true proportion and n."""

from collections.abc import Mapping, Sequence
from itertools import pairwise

import numpy as np
import pandas as pd
from matplotlib.axes import Axes
from matplotlib.colors import BoundaryNorm, ListedColormap
from matplotlib.figure import Figure
from matplotlib.patches import Patch

from coverage_lab.records import Array
from coverage_lab.report.folder import Saved
from coverage_lab.report.style import (
    GREY,
    INK,
    RULE,
    SOFT,
    WASH,
    WIDTH,
    Look,
    canvas,
    chief,
    label,
    looks,
    pair,
    percent_axis,
    scale_coverage,
    spread,
    wrapped,
)
from coverage_lab.report.words import Document, count, level, planned_range, row_of, share, sizes
from coverage_lab.rounding import percent

MOST_PANELS = 3
PANEL = 3.3  # inches
LABELS = 1.42  # inches to the right of a panel
LABEL_GAP = 0.43  # inches between the middles of two labels of up to three lines
SHADES = ("#08306b", "#2b6fb3", "#7fb2dc", "#c9dcee", "#f4f7fa")  # falling lightness = falling coverage; prints in grey
MOST_ROWS_LABELLED = 16

Mark = tuple[str, float, float, str, str]  # words, right end x and y, colour, weight


def panels(document: Document) -> list[int]:
    """The sizes that get a panel of their own: all, or the smallest, the verdict's and the largest."""
    listed = sizes(document)
    if len(listed) <= MOST_PANELS:
        return listed
    return sorted({listed[0], int(document["verdict"]["n"]), listed[-1]})


def coverage(saved: Saved) -> Figure:
    """Interval coverage against p: enumerated curves, simulated points, the nominal level, the planned range."""
    shown = panels(saved.document)
    height = 0.98 + PANEL * len(shown) + 0.12
    left = 0.3 + 0.075 * len(share(1 - saved.document["alpha"] / 2))
    margins = (left, LABELS, 0.5, 0.98)
    figure = canvas("Interval coverage against the true proportion", _about(saved, shown), height, margins)
    grid = figure.subplots(len(shown), 1, sharex=True, squeeze=False, gridspec_kw={"hspace": 0.2})
    for axes, n in zip(grid[:, 0], shown, strict=True):
        _coverage_panel(axes, saved, n)
        which = f", n = {count(n)}" if len(shown) > 1 else ""
        indent = (left - 0.12) / (WIDTH - left - LABELS)
        axes.set_title(f"interval coverage{which}", size=8.5, loc="left", pad=5, x=-indent)
    grid[-1, 0].set_xlabel("true proportion")
    percent_axis(grid[-1, 0].xaxis)
    return figure


def _about(saved: Saved, shown: list[int]) -> str:
    """n, confidence, side and routes."""
    document = saved.document
    routes = []
    if not saved.curve.empty:
        routes.append("curves enumerated")
    drawn = saved.cells.loc[saved.cells["route"] == "simulated", "draws"]
    if not drawn.empty:
        routes.append(f"points simulated, ± 2 standard errors, {count(int(drawn.max()))} draws each")
    n = ", ".join(count(size) for size in shown)
    return f"n = {n} · {level(document)} · planned range shaded\n{'; '.join(routes)}"


def _coverage_panel(axes: Axes, saved: Saved, n: int) -> None:
    """One n: the grey methods, then the emphasised ones with their points, worst points and labels."""
    document, styles = saved.document, looks(saved.document)
    lines = _lines(saved, n)
    alpha = document["alpha"]
    worst = {name: row_of(document, name, n) for name in styles}
    minima = [row["minimum_coverage"] for row in worst.values() if row and row["minimum_coverage"] is not None]
    scale_coverage(axes, "y", np.array([*(line["coverage"].min() for line in lines.values()), *minima]), alpha)
    _ground(axes, document)
    for name in sorted(lines, key=lambda name: (styles[name].emphasised, styles[name].weight)):
        look, line = styles[name], lines[name]
        order = 3.0 if look.emphasised else 2.0
        axes.plot(line["p"], line["coverage"], color=look.colour, lw=look.weight, ls=look.line, zorder=order)
        row = worst[name]
        if look.emphasised and row and row["minimum_at"] is not None:
            axes.plot(
                row["minimum_at"],
                row["minimum_coverage"],
                look.marker,
                ms=7,
                mew=1.2,
                mfc="white",
                mec=look.colour,
                zorder=5,
            )
    _points(axes, saved, n, styles)
    marks = [_line_mark(document, name, n, line) for name, line in lines.items() if styles[name].emphasised]
    label_lines(axes, document, marks, PANEL)


def _lines(saved: Saved, n: int) -> Mapping[str, pd.DataFrame]:
    """The curve of every method at n; without enumeration the simulated points are joined."""
    frame = saved.curve if not saved.curve.empty else saved.cells
    here = frame[frame["n"] == n]
    return {str(name): rows.sort_values("p") for name, rows in here.groupby("method", sort=False)}


def _ground(axes: Axes, document: Document) -> None:
    """The planned range, the nominal level and the level that the standard asks everywhere."""
    low, high = planned_range(document)
    if low < high:
        axes.axvspan(low, high, color=WASH, lw=0, zorder=0)
    else:
        axes.axvline(low, color=RULE, lw=4, zorder=0)
    for (_, value), dashes in zip(level_lines(document), ((), (1, 2)), strict=False):
        axes.axhline(value, color=INK, lw=0.8, ls=(0, dashes or None), zorder=1)


def _points(axes: Axes, saved: Saved, n: int, styles: Mapping[str, Look]) -> None:
    """Simulated coverage of the emphasised methods with two standard errors on either side."""
    cells = saved.cells[(saved.cells["route"] == "simulated") & (saved.cells["n"] == n)]
    for name, rows in cells.groupby("method", sort=False):
        look = styles[str(name)]
        if look.emphasised:
            shares, errors = rows["coverage"].to_numpy(float), 2 * rows["standard_error"].to_numpy(float)
            bars = np.minimum(errors, [shares, 1 - shares])  # a share lies between 0 and 1
            axes.errorbar(
                rows["p"], shares, bars, fmt=look.marker, ms=4, mfc=look.colour, mec="white", mew=0.5,
                ecolor=look.colour, elinewidth=1.1, zorder=4,
            )  # fmt: skip


def label_lines(axes: Axes, document: Document, marks: Sequence[Mark], panel: float) -> None:
    """What each line and each level is, beside its right end, no label over another; `panel` is the height, inches."""
    right = float(axes.get_xlim()[1])
    levels = ((words, right, value, SOFT, "normal") for words, value in level_lines(document))
    label_ends(axes, [*marks, *levels], panel)


def label_ends(axes: Axes, listed: Sequence[Mark], panel: float) -> None:
    """Words beside the right ends of lines, no label over another; `panel` is the height in inches."""
    heights = [axes.transAxes.inverted().transform(axes.transData.transform((x, y)))[1] for _, x, y, _, _ in listed]
    places = spread(heights, LABEL_GAP / panel, 0.05, 0.96)
    for (words, x, y, colour, weight), height in zip(listed, places, strict=True):
        axes.annotate(
            words, xy=(x, y), xytext=(1.07, height), textcoords="axes fraction", color=colour, size=7.6, va="center",
            linespacing=1.1, annotation_clip=False, weight=weight,
            arrowprops={"arrowstyle": "-", "lw": 0.6, "color": colour, "shrinkA": 2, "shrinkB": 1, "relpos": (0, 0.5)},
        )  # fmt: skip


def _line_mark(document: Document, name: str, n: int, line: pd.DataFrame) -> Mark:
    """Label, right end, colour and weight of one line: 'Wilson score / worst 92.7 %'."""
    row = row_of(document, name, n)
    words = wrapped(label(document, name), 17)
    if row is not None and row["minimum_coverage"] is not None:
        words = f"{words}\nworst {share(row['minimum_coverage'], 'down')}"
    end = line.iloc[-1]
    weight = "bold" if name == chief(document) else "normal"
    return words, float(end["p"]), float(end["coverage"]), looks(document)[name].colour, weight


def level_lines(document: Document) -> list[tuple[str, float]]:
    """The levels drawn as lines across the panel."""
    alpha = document["alpha"]
    nominal, floor = 1 - alpha, 1 - alpha * document["standard"]["worst_miss"]
    levels = [(f"nominal {percent(nominal)}", nominal)]
    return [*levels, (f"standard {percent(floor)}", floor)] if floor < nominal - 1e-6 else levels


def coverage_by_n(saved: Saved) -> Figure:
    """Interval coverage over true proportion and n: the chief method beside plus-or-minus, in five shades."""
    document = saved.document
    names = pair(document)
    rows = sizes(document)
    height = 1.75 + max(1.4, min(0.24 * len(rows), 4.2))
    about = f"n = {count(rows[0])} to {count(rows[-1])} · {level(document)} · enumerated"
    if saved.curve.empty:
        about = about.replace("enumerated", "simulated")
    figure = canvas("Interval coverage over true proportion and n", about, height, (0.72, 0.2, 1.05, 0.85))
    grid = figure.subplots(1, len(names), sharey=True, squeeze=False, gridspec_kw={"wspace": 0.12})
    edges = shade_edges(document)
    shades, norm = ListedColormap(SHADES), BoundaryNorm(edges, len(SHADES))
    for axes, name in zip(grid[0], names, strict=True):
        p, values = surface(saved, name, rows)
        axes.pcolormesh(p, np.arange(len(rows) + 1), values, cmap=shades, norm=norm, rasterized=True)
        axes.set_title(label(document, name), size=9, loc="left", pad=4)
        axes.set_xlabel("true proportion")
        percent_axis(axes.xaxis)
        axes.spines[["top", "right"]].set_visible(True)
        for edge in planned_range(document):
            axes.axvline(edge, color=INK, lw=0.8, ls=(0, (4, 2)))
    step = max(1, -(-len(rows) // MOST_ROWS_LABELLED))
    grid[0, 0].set_yticks(np.arange(0, len(rows), step) + 0.5, [count(n) for n in rows[::step]])
    grid[0, 0].set_ylabel("n")
    _shade_legend(figure, edges, height)
    return figure


def shade_edges(document: Document) -> list[float]:
    """Class limits of coverage: nominal, what the standard asks everywhere, and 2 and 6 times the nominal miss rate."""
    alpha = document["alpha"]
    floor = min(document["standard"]["worst_miss"] * alpha, 1.9 * alpha)
    misses = [1.0, min(6 * alpha, 0.9), 2 * alpha, max(floor, 1.05 * alpha), alpha]
    return [*(1 - miss for miss in misses), 1.0 + 1e-9]


def surface(saved: Saved, name: str, rows: list[int]) -> tuple[Array, Array]:
    """Edges in p (k + 1) and coverage (rows, k): each n's curve read at the nearest of its proportions."""
    frame = saved.curve if not saved.curve.empty else saved.cells[saved.cells["route"] == "simulated"]
    here = frame[frame["method"] == name]
    p = np.unique(here["p"].to_numpy())
    middle = (p[1:] + p[:-1]) / 2
    edges = np.concatenate([p[:1], middle, p[-1:]]) if len(p) > 1 else np.array([p[0] * 0.9, p[0] * 1.1])
    values = np.full((len(rows), len(p)), np.nan)
    for k, n in enumerate(rows):
        line = here[here["n"] == n].sort_values("p")
        if not line.empty:
            known = line["p"].to_numpy()
            nearest = np.abs(known[None, :] - p[:, None]).argmin(axis=1)
            values[k] = line["coverage"].to_numpy()[nearest]
    return edges, values


def _shade_legend(figure: Figure, edges: list[float], height: float) -> None:
    """The five classes in words below the panels."""
    names = [f"below {percent(edges[1])}"]
    names += [f"{percent(a)} to {percent(b)}" for a, b in pairwise(edges[1:-1])]
    names.append(f"{percent(edges[-2])} or more")
    patches = [Patch(facecolor=shade, edgecolor=GREY, label=words) for shade, words in zip(SHADES, names, strict=True)]
    figure.legend(
        handles=patches, loc="lower left", bbox_to_anchor=(0.1, 0.04 / height), ncols=3, frameon=False, fontsize=8,
        handlelength=1.4, columnspacing=1.4, title="interval coverage", title_fontsize=8, alignment="left",
    )  # fmt: skip
