"""A simple random sample from a population so large that its units count as independent."""

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from coverage_lab.designs.frame import LARGEST_LAW, SMALLEST, Frame, Units, compact, probable
from coverage_lab.designs.lens import Lens
from coverage_lab.probability import likely, point
from coverage_lab.records import Array, Columns, Counts, Outcomes, Part

RAREST_PART = 1e-14  # a rarer number of evaluable units is no part: far below what branch-and-bound resolves


@dataclass(frozen=True)
class Simple(Frame):
    """X events in n units: X ~ Binomial(n, p). Every p is reachable, every n is kept.

    Source: Cochran 1977, Sampling Techniques, ch. 3.
    """

    kind: ClassVar[str] = "simple"

    @property
    def columns(self) -> tuple[str, ...]:
        """What every sample has."""
        return ("events", "trials")

    def units(self, p: float, n: int, size: int, rng: np.random.Generator) -> Units:
        """`size` binomial counts, one group."""
        events = rng.binomial(n, p, size)[:, None]
        return events, n - events

    def gather(self, events: Counts, others: Counts) -> Columns:
        """Events and evaluable units."""
        x = events.sum(axis=1)
        return {"events": x, "trials": compact(x + others.sum(axis=1))}

    def listed(self, p: float, n: int, lens: Lens) -> Outcomes | None:
        """Trinomial in general: evaluable units binomial, and given these the events; binomial without losses."""
        sizes, weight = evaluable(n, lens.kept_at(p), SMALLEST)
        chance = lens.chance(p)
        events = np.arange(likely(int(sizes[0]), chance)[0], likely(int(sizes[-1]), chance)[1] + 1)
        if len(sizes) * len(events) > 10 * LARGEST_LAW:
            return None
        if len(sizes) == 1:
            return probable({"events": events, "trials": sizes}, point(events, n, chance))
        m, x = np.repeat(sizes, len(events)), np.tile(events, len(sizes))
        return probable({"events": x, "trials": m}, np.repeat(weight, len(events)) * point(x, m, chance))

    def mixed(self, n: int, lens: Lens) -> tuple[Part, ...] | None:
        """One binomial part for every evaluable number when losses do not depend on the outcome."""
        if lens.kept is None:
            return None
        at_zero, at_one = lens.other[0] / lens.kept, lens.event[0] / lens.kept
        sizes, weight = evaluable(n, lens.kept, RAREST_PART)
        return tuple(Part(int(m), float(w), at_zero, at_one) for m, w in zip(sizes, weight, strict=True))


def evaluable(n: int, kept: float, floor: float) -> tuple[Counts, Array]:
    """The numbers of units kept of n with their probabilities, those above `floor`."""
    if kept == 1:
        return np.array([n]), np.ones(1)
    first, last = likely(n, kept, floor)
    sizes = np.arange(first, last + 1)
    weight = point(sizes, n, kept)
    real = weight > floor
    return sizes[real], weight[real]
