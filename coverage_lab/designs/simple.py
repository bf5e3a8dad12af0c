"""A simple random sample from a population so large that its units count as independent."""

from dataclasses import dataclass
from typing import ClassVar

import numpy as np

from coverage_lab.probability import likely, point
from coverage_lab.records import Array, Columns, Outcomes, Part

FLOOR = 1e-18  # a count less likely than this adds nothing that a double can hold


@dataclass(frozen=True)
class Simple:
    """X events in n units: X ~ Binomial(n, p). Every p is reachable, every n is kept.

    Source: Cochran 1977, Sampling Techniques, ch. 3.
    """

    kind: ClassVar[str] = "simple"
    columns: ClassVar[tuple[str, ...]] = ("events", "trials")

    def settle(self, p: float, n: int) -> tuple[float, int]:
        """The truth and the size as they are."""
        return p, n

    def draw(self, p: float, n: int, size: int, rng: np.random.Generator) -> Columns:
        """`size` binomial counts."""
        return {"events": rng.binomial(n, p, size), "trials": np.array([n])}

    def law(self, p: float, n: int) -> Outcomes:
        """The counts whose probability exceeds 1e-18, with their binomial probabilities."""
        first, last = likely(n, p)
        events = np.arange(first, last + 1)
        weight = point(events, n, p)
        probable = weight > FLOOR
        return Outcomes({"events": events[probable], "trials": np.array([n])}, weight[probable])

    def parts(self, n: int) -> tuple[Part, ...]:
        """One binomial part: all n units are evaluated."""
        return (Part(trials=n, weight=1.0),)

    def points(self, low: float, high: float, n: int) -> Array | None:
        """None: every p in [low, high] is reachable."""
        return None
