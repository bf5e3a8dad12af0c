"""The saw of worst interval coverage against n around the planned one."""

import numpy as np
import pandas as pd
from matplotlib.axes import Axes
from matplotlib.figure import Figure
from matplotlib.ticker import MaxNLocator

from coverage_lab.report.figures_coverage import label_lines, level_lines, panels
from coverage_lab.report.folder import Saved
from coverage_lab.report.style import GREY, INK, WIDTH, canvas, chief, label, looks, scale_coverage, wrapped
from coverage_lab.report.words import Document, count, level, planned_range, range_words, share

PANEL = 2.3  # inches
LABELS = 1.42


def sizes_beside(saved: Saved) -> list[int]:
    """The planned sizes that have neighbours to show, at most three."""
    known = set(saved.steady["planned"])
    return [n for n in panels(saved.document) if n in known]


def saw(saved: Saved) -> Figure:
    """Worst interval coverage over the planned range at every n around the planned: the list and plus-or-minus."""
    document, shown = saved.document, sizes_beside(saved)
    height = 0.98 + PANEL * len(shown) + 0.25 * (len(shown) - 1) + 0.12
    left = 0.3 + 0.075 * len(share(1 - document["alpha"] / 2))
    n = ", ".join(count(size) for size in shown)
    about = f"n = {n} and neighbours · {level(document)} · enumerated\n"
    about += f"planned range {range_words(*planned_range(document))} · vertical line: planned n"
    figure = canvas("Worst interval coverage against n", about, height, (left, LABELS, 0.5, 0.98))
    grid = figure.subplots(len(shown), 1, squeeze=False, gridspec_kw={"hspace": 0.35})
    for axes, planned in zip(grid[:, 0], shown, strict=True):
        _panel(axes, document, planned, saved.steady[saved.steady["planned"] == planned])
        indent = (left - 0.12) / (WIDTH - left - LABELS)
        axes.set_title("worst interval coverage", size=8.5, loc="left", pad=5, x=-indent)
    grid[-1, 0].set_xlabel("n")
    return figure


def _panel(axes: Axes, document: Document, planned: int, beside: pd.DataFrame) -> None:
    """One planned n: a line a method, the planned n marked."""
    styles = looks(document)
    scale_coverage(axes, "y", 1 - beside["worst_miss"].to_numpy(float), document["alpha"])
    for (_, value), dashes in zip(level_lines(document), ((), (1, 2)), strict=False):
        axes.axhline(value, color=INK, lw=0.8, ls=(0, dashes or None), zorder=1)
    axes.axvline(planned, color=GREY, lw=2.5, zorder=0)
    marks = []
    for name, rows in beside.groupby("method", sort=False):
        method, look = str(name), styles[str(name)]
        coverage = 1 - rows["worst_miss"].to_numpy(float)
        axes.plot(
            rows["n"], coverage, color=look.colour, lw=look.weight, ls=look.line, marker=look.marker, ms=3.2,
            mfc=look.colour, mec="white", mew=0.3, zorder=3 if look.emphasised else 2,
        )  # fmt: skip
        if look.emphasised:
            lowest = f"lowest {share(float(np.min(coverage)), 'down')}"
            weight = "bold" if method == chief(document) else "normal"
            words = f"{wrapped(label(document, method), 17)}\n{lowest}"
            marks.append((words, float(rows["n"].iloc[-1]), float(coverage[-1]), look.colour, weight))
    axes.xaxis.set_major_locator(MaxNLocator(6, integer=True))
    axes.xaxis.set_major_formatter(lambda value, _: count(round(value)))
    label_lines(axes, document, marks, PANEL)
