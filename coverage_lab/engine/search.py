"""Figures over a range for designs that only list their samples at one truth at a time: a search, or every truth.

Where the truths are finitely many and few enough, each is looked at and the minimum is certified. Otherwise coverage is
computed on a dense grid, at the intervals' end points, where it jumps, and finer and finer around the worst place: a
searched minimum, never called certified.
"""

from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.exact import thinned
from coverage_lab.engine.means import Range
from coverage_lab.engine.measures import MEASURES, Stack, measure, stack
from coverage_lab.engine.tally import union
from coverage_lab.records import Array, Columns, Counts, Design, Limits, Method, Outcomes, Side

SAMPLES = 1_000_000  # listed in one search, all truths together: it sets how dense the grid is
FEWEST, MOST = 25, 201  # truths on the grid
EVERY = 20_000  # truths up to which every one is looked at
_ASIDE = 1e-12  # relative step to either side of an end point
_ROUNDS, _ZOOM = 3, 9

LIMITS = ("raw_lower", "raw_upper", "lower", "upper")

Figures = list[dict[str, float]]


@dataclass(frozen=True)
class Question:
    """What is asked of a design."""

    design: Design
    n: int
    over: Range
    side: Side
    tail: float

    def laws(self, truths: Array) -> list[Outcomes] | None:
        """The law at every truth; None where one cannot be listed."""
        laws = [self.design.law(p, self.n) for p in truths.tolist()]
        listed = [law for law in laws if law is not None]
        return listed if len(listed) == len(laws) else None

    def limits(self, method: Method, columns: Columns) -> Limits:
        """The method's limits for some samples."""
        return evaluate(method, columns, self.side, self.tail)


@dataclass(frozen=True)
class Known:
    """Samples whose limits are known for every method; a later look evaluates only what is new."""

    columns: Columns
    limits: list[Limits]  # of every method
    size: int

    def with_new(self, asked: Question, method: Method, k: int, columns: Columns, old: Counts) -> Stack:
        """Method k's limits for samples of which the known ones stand at `old`."""
        count = max(len(values) for values in columns.values())
        new = np.setdiff1d(np.arange(count), old)
        parts = [self.limits[k]]
        if len(new):
            parts.append(asked.limits(method, {name: v[new] if len(v) > 1 else v for name, v in columns.items()}))
        places = np.argsort(np.concatenate([old, new]), kind="stable")
        joined = (np.concatenate([getattr(part, name) for part in parts])[places] for name in LIMITS)
        return stack([Limits(*joined)])


def figures(
    design: Design, methods: Sequence[Method], n: int, over: Range, side: Side, tail: float
) -> tuple[Figures, bool] | None:
    """For every method its worst miss rate with the place and its means, and whether every truth was looked at.

    None where the design cannot list its samples.
    """
    asked = Question(design, n, over, side, tail)
    size = law_size(design, over, n)
    truths, every = _truths(asked, size) if size is not None else (np.empty(0), False)
    laws = asked.laws(truths)
    if size is None or laws is None:
        return None
    columns, places = union([law.columns for law in laws])
    limits = [asked.limits(method, columns) for method in methods]
    values = _measured(laws, places, truths, stack(limits), side)
    miss = values["missed_below"] + values["missed_above"]
    known = Known(columns, limits, size)
    rows = []
    for k, method in enumerate(methods):
        worst = Worst(truths, miss[:, k])
        if not every:
            worst = _refined(asked, known, method, k, worst)
        means = {name: float(over.masses(truths) @ values[name][:, k]) for name in MEASURES}
        mean_miss = means["missed_below"] + means["missed_above"]
        place = {"minimum_coverage": 1.0 - worst.miss, "minimum_at": worst.at, "worst_miss": worst.miss}
        rows.append({**place, "mean_coverage": 1.0 - mean_miss, "mean_miss": mean_miss, **means})
    return rows, every


def _measured(
    laws: Sequence[Outcomes], places: Sequence[Counts], truths: Array, limits: Stack, side: Side
) -> dict[str, Array]:
    """Every measure at every truth, arrays (truths, methods)."""
    rows = [
        measure(law, limits.at(place), p, side) for law, place, p in zip(laws, places, truths.tolist(), strict=True)
    ]
    return {name: np.stack([row[name] for row in rows]) for name in MEASURES}


def law_size(design: Design, over: Range, n: int) -> int | None:
    """The most samples that a law lists at the ends and in the middle of the range; None where one cannot be listed."""
    laws = [design.law(design.settle(p, n)[0], n) for p in (over.low, (over.low + over.high) / 2, over.high)]
    sizes = [len(law.weight) for law in laws if law is not None]
    return max(sizes) if len(sizes) == len(laws) else None


def grid_size(samples: int) -> int:
    """How many truths a grid may have when each lists so many samples."""
    return int(np.clip(SAMPLES // max(samples, 1), FEWEST, MOST))


def _truths(asked: Question, size: int) -> tuple[Array, bool]:
    """The truths to look at first, and whether they are all there are."""
    over = asked.over
    points = asked.design.points(over.low, over.high, asked.n)
    if points is None:
        return np.unique(np.linspace(over.low, over.high, grid_size(size))), over.low == over.high
    if len(points) <= EVERY and len(points) * size <= 8 * SAMPLES:
        return points, True
    return thinned(points, grid_size(size)), False


@dataclass(frozen=True)
class Worst:
    """Truths looked at, ascending, with a method's miss rate there."""

    truths: Array
    rates: Array

    @property
    def place(self) -> int:
        """Where the largest rate is."""
        return int(np.argmax(self.rates))

    @property
    def miss(self) -> float:
        """The largest rate."""
        return float(self.rates[self.place])

    @property
    def at(self) -> float:
        """Its truth."""
        return float(self.truths[self.place])

    @property
    def near(self) -> tuple[float, float]:
        """The truths next to the worst."""
        k = self.place
        return float(self.truths[max(k - 1, 0)]), float(self.truths[min(k + 1, len(self.truths) - 1)])

    def with_more(self, truths: Array, rates: Array) -> "Worst":
        """With more truths looked at."""
        both, first = np.unique(np.concatenate([self.truths, truths]), return_index=True)
        return Worst(both, np.concatenate([self.rates, rates])[first])


def _refined(asked: Question, known: Known, method: Method, k: int, worst: Worst) -> Worst:
    """The worst place after a look at both sides of end points, then closer and closer ones around it.

    All end points when they are few, else those next to the worst place so far.
    """
    budget = int(np.clip(SAMPLES // (4 * known.size), 8, MOST))
    ends = np.unique(np.concatenate([known.limits[k].lower, known.limits[k].upper]))
    ends = ends[(ends > asked.over.low) & (ends < asked.over.high)]
    if len(ends) > budget:
        low, high = worst.near
        ends = thinned(ends[(ends > low) & (ends < high)], budget)
    looks = [np.concatenate([ends * (1 - _ASIDE), ends * (1 + _ASIDE)])]
    for truths in (*looks, *[None] * _ROUNDS):
        worst = _looked_at(
            asked, known, method, k, worst, np.linspace(*worst.near, min(_ZOOM, budget)) if truths is None else truths
        )
    return worst


def _looked_at(asked: Question, known: Known, method: Method, k: int, worst: Worst, truths: Array) -> Worst:
    """The worst place after a look at these truths too, as far as they are reachable and new."""
    over = asked.over
    settled = [asked.design.settle(float(p), asked.n)[0] for p in truths]
    new = np.setdiff1d(np.array([p for p in settled if over.low <= p <= over.high]), worst.truths)
    laws = asked.laws(new)
    if laws is None or not laws:
        return worst
    columns, places = union([known.columns, *(law.columns for law in laws)])
    limits = known.with_new(asked, method, k, columns, places[0])
    values = _measured(laws, places[1:], new, limits, asked.side)
    return worst.with_more(new, (values["missed_below"] + values["missed_above"])[:, 0])
