"""One look for all figures: who is emphasised and how, the canvas, the coverage scale, labels kept apart."""

import textwrap
from collections.abc import Iterator, Mapping, Sequence
from contextlib import contextmanager
from dataclasses import dataclass
from functools import cache
from pathlib import Path

import matplotlib as mpl
import numpy as np
from matplotlib.axes import Axes
from matplotlib.axis import Axis
from matplotlib.figure import Figure
from matplotlib.font_manager import get_font
from matplotlib.ticker import FixedLocator, FuncFormatter, MaxNLocator, NullFormatter, NullLocator

from coverage_lab.records import Array
from coverage_lab.report.words import Document, label_of, row_of, sizes
from coverage_lab.rounding import percent

WIDTH = 6.0  # inches: with 9 pt letters still legible when a telephone shows it 340 pixels wide
INK, SOFT, RULE, WASH, GREY = "#17212b", "#55606c", "#c9d0d7", "#eef2f5", "#b9c1c9"
MOST_EMPHASISED = 5
OWN_FAMILY = "your own"  # how the catalogue files methods that are not its own
LABEL_LENGTH = 36
TICK_ROOM = {"x": 0.11, "y": 0.05}  # of an axis

# Okabe & Ito's colours that reach 3:1 on white, each with a dash pattern and a marker of its own, so that the lines
# can be told apart in black-and-white print too.
LOOKS: tuple[tuple[str, tuple[float, ...], str], ...] = (
    ("#000000", (), "o"),
    ("#0072b2", (6, 1.6), "s"),
    ("#009e73", (5, 1.4, 1.2, 1.4), "D"),
    ("#cc79a7", (1.2, 1.2), "v"),
    ("#d55e00", (3, 1.3), "^"),
)


@dataclass(frozen=True)
class Look:
    """How a method is drawn, everywhere in a report."""

    colour: str = GREY
    dashes: tuple[float, ...] = ()
    marker: str = "o"
    weight: float = 0.6
    emphasised: bool = False

    @property
    def line(self) -> tuple[float, tuple[float, ...] | None]:
        """The dash pattern as matplotlib takes it."""
        return (0.0, self.dashes or None)


@contextmanager
def house_style() -> Iterator[None]:
    """Draw and save with this look whatever the user's own matplotlib settings are."""
    with mpl.rc_context():
        mpl.rcdefaults()
        mpl.rc("font", family="DejaVu Sans", size=9.0)
        mpl.rc("axes", edgecolor=SOFT, labelcolor=INK, linewidth=0.7)
        mpl.rc("axes.spines", top=False, right=False)
        mpl.rc("text", color=INK)
        mpl.rc("xtick", color=SOFT, labelcolor=INK, labelsize=8.5)
        mpl.rc("ytick", color=SOFT, labelcolor=INK, labelsize=8.5)
        mpl.rc("hatch", linewidth=0.6)
        yield


def runner_up(document: Document) -> str | None:
    """The method that would have been named otherwise: the next of the preference list, else the first alternative."""
    verdict = document["verdict"]
    chosen = verdict["method"] or (verdict["closest"] or {}).get("method")
    listed = [name for name in verdict["prefer"] if name != chosen and _measured(document, name)]
    steady = [item["method"] for item in verdict["alternatives"] if "fails" not in item["against"]]
    others = [*steady, *(item["method"] for item in verdict["alternatives"])]
    return next(iter([*listed, *(name for name in others if name != chosen)]), None)


def chief(document: Document) -> str | None:
    """The method the report is about: the named one, else the closest."""
    verdict = document["verdict"]
    found = verdict["method"] or (verdict["closest"] or {}).get("method")
    return str(found) if found else None


def pair(document: Document) -> list[str]:
    """The chief method and plus-or-minus beside it; one of them, or none, where they were not measured."""
    return [name for name in dict.fromkeys((chief(document), "wald")) if name and _measured(document, name)]


def own(document: Document) -> list[str]:
    """The methods that are the user's own."""
    return list(dict.fromkeys(str(row["method"]) for row in document["methods"] if row["family"] == OWN_FAMILY))


def emphasised(document: Document) -> list[str]:
    """At most five methods that a report draws in colour, in catalogue order."""
    per_n = [verdict["method"] or (verdict["closest"] or {}).get("method") for verdict in document["by_n"]]
    wanted = [chief(document), "wald", runner_up(document), *own(document), *per_n, *document["verdict"]["prefer"]]
    listed = list(dict.fromkeys(name for name in wanted if name and _measured(document, name)))[:MOST_EMPHASISED]
    return [name for name in catalogue_order(document) if name in listed]


def catalogue_order(document: Document) -> list[str]:
    """All methods of the report, in the order in which the catalogue lists them."""
    return list(dict.fromkeys(str(row["method"]) for row in document["methods"]))


def looks(document: Document) -> Mapping[str, Look]:
    """The look of every method: the emphasised take the looks in catalogue order, wald the last, the rest are grey."""
    found = {name: Look() for name in catalogue_order(document)}
    free = list(LOOKS)
    for name in emphasised(document):
        colour, dashes, marker = LOOKS[-1] if name == "wald" else free.pop(0)
        weight = 1.6 if name == chief(document) else 1.1
        found[name] = Look(colour, dashes, marker, weight, emphasised=True)
    return found


def _measured(document: Document, name: str) -> bool:
    """Whether the report holds figures of the method."""
    rows = [row_of(document, name, n) for n in sizes(document)]
    return any(row is not None and row["applies"] for row in rows)


def label(document: Document, name: str, length: int = LABEL_LENGTH) -> str:
    """The method's label as a figure can show it."""
    return drawable(label_of(document, name), length)


def drawable(text: str, length: int = LABEL_LENGTH) -> str:
    """Somebody's words cut to length, without formulas and with a box for what the font lacks."""
    words = " ".join(text.split())
    short = words if len(words) <= length else f"{words[: length - 1]}…"
    return "".join(letter if ord(letter) in _letters() else "□" for letter in short).replace("$", r"\$")


@cache
def _letters() -> frozenset[int]:
    """What the font of the figures, which comes with matplotlib, can show."""
    path = Path(mpl.get_data_path()) / "fonts" / "ttf" / "DejaVuSans.ttf"
    return frozenset(get_font(str(path)).get_charmap())


def canvas(title: str, about: str, height: float, margins: tuple[float, float, float, float]) -> Figure:
    """A figure with its title and, inside the image, what it is about: n, confidence, side and route.

    margins: left, right, bottom, top in inches.
    """
    figure = Figure(figsize=(WIDTH, height), facecolor="white")
    left, right, bottom, top = margins
    figure.subplots_adjust(left / WIDTH, bottom / height, 1 - right / WIDTH, 1 - top / height)
    figure.text(0.12 / WIDTH, 1 - 0.10 / height, title, size=11, weight="bold", va="top")
    figure.text(0.12 / WIDTH, 1 - 0.33 / height, about, size=8, color=SOFT, va="top", linespacing=1.35)
    return figure


def percent_axis(axis: Axis, values: Sequence[float] | None = None) -> None:
    """An axis labelled in percent, with ticks at the given shares or at round ones."""
    axis.set_major_locator(MaxNLocator(6, steps=[1, 2, 2.5, 5, 10]) if values is None else FixedLocator(list(values)))
    axis.set_major_formatter(FuncFormatter(lambda value, _: percent(round(value, 12))))
    axis.set_minor_locator(NullLocator())
    axis.set_minor_formatter(NullFormatter())


def stretched(coverage: Array | float, alpha: float) -> Array:
    """Coverage on a scale that gives room around the nominal level and still reaches 0 and 100 %.

    The logarithm of the miss rate, softened by alpha / 4; straight above 100 %, where only an axis margin lies.
    """
    miss = 1 - np.asarray(coverage, float)
    soft = alpha / 4
    return np.asarray(-np.log(soft + np.maximum(miss, 0.0)) + np.maximum(-miss, 0.0) / soft)


def unstretched(height: Array, alpha: float) -> Array:
    """The inverse of `stretched`."""
    soft = alpha / 4
    above = np.asarray(height, float) + np.log(soft)  # over the height of 100 %
    return np.asarray(np.where(above > 0, 1 + soft * above, 1 + soft - soft * np.exp(-np.minimum(above, 0.0))))


def coverage_ticks(alpha: float, lowest: float) -> list[float]:
    """Ticks for a coverage axis that goes down to `lowest`."""
    near = [0.0, alpha / 2, alpha, 2 * alpha, 4 * alpha]
    decades = [10.0**power for power in range(-12, 0) if 10.0**power > 5 * alpha]
    misses = [*near, *decades, 0.5, 1.0]
    return sorted({round(1 - miss, 14) for miss in misses if 0 <= 1 - miss <= 1 and lowest - 1e-12 <= 1 - miss})


def coverage_limits(values: Array, alpha: float) -> tuple[float, float]:
    """Axis limits that hold all coverages, the nominal level and a little air."""
    lowest = min(float(np.nanmin(values)), 1 - 1.9 * alpha)
    ends = stretched(np.array([lowest, 1.0]), alpha)
    bottom = unstretched(ends - 0.04 * (ends[1] - ends[0]), alpha)[0]
    return float(bottom), float(unstretched(ends + 0.02 * (ends[1] - ends[0]), alpha)[1])


def scale_coverage(axes: Axes, direction: str, values: Array, alpha: float) -> None:
    """Give the x or y axis of a figure the stretched coverage scale, with ticks in percent."""
    functions = (lambda c: stretched(c, alpha), lambda h: unstretched(h, alpha))
    limits = coverage_limits(values, alpha)
    if direction == "y":
        axes.set_yscale("function", functions=functions)
        axes.set_ylim(*limits)
    else:
        axes.set_xscale("function", functions=functions)
        axes.set_xlim(*limits)
    ticks = _thinned(coverage_ticks(alpha, limits[0]), limits, alpha, TICK_ROOM[direction])
    percent_axis(getattr(axes, f"{direction}axis"), ticks)


def _thinned(ticks: Sequence[float], limits: tuple[float, float], alpha: float, room: float) -> list[float]:
    """The ticks that leave each other room; the nominal level goes first, then the others from the ends inwards."""
    span = float(np.ptp(stretched(np.array(limits), alpha)))
    kept: list[float] = []
    for tick in sorted(ticks, key=lambda tick: (abs(tick - (1 - alpha)) > 1e-9, -abs(tick - (1 - alpha)))):
        distances = (
            np.abs(stretched(np.array(kept), alpha) - stretched(np.array(tick), alpha)) if kept else np.array([span])
        )
        if distances.min() >= room * span:
            kept.append(tick)
    return kept


def spread(wanted: Sequence[float], gap: float, low: float, high: float) -> list[float]:
    """Positions nearest to the wanted ones (least squares) that are at least `gap` apart, within [low, high], in order.

    Less a step of `gap` per place this is an isotonic regression, solved by pooling neighbours that violate the order.
    """
    gap = min(gap, (high - low) / max(1, len(wanted) - 1))
    order = sorted(range(len(wanted)), key=lambda k: (wanted[k], k))
    pools: list[tuple[float, int]] = []  # mean, members
    for k, index in enumerate(order):
        pools.append((wanted[index] - k * gap, 1))
        while len(pools) > 1 and pools[-2][0] >= pools[-1][0]:
            (mean, size), (last, one) = pools[-2], pools.pop()
            pools[-1] = ((mean * size + last * one) / (size + one), size + one)
    flat = [mean for mean, size in pools for _ in range(size)]
    top = high - gap * (len(wanted) - 1)
    placed = [0.0] * len(wanted)
    for k, index in enumerate(order):
        placed[index] = min(max(flat[k], low), top) + k * gap
    return placed


def wrapped(text: str, length: int) -> str:
    """Words broken into lines of about `length` letters."""
    return "\n".join(textwrap.wrap(text, length, break_on_hyphens=False)) or text
