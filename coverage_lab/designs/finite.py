"""A simple random sample without replacement from a finite population."""

import math
from dataclasses import dataclass, replace
from typing import ClassVar

import numpy as np

from coverage_lab.checks import InputFault, expected
from coverage_lab.designs.frame import LARGEST_LAW, SMALLEST, Frame, Units, compact, probable
from coverage_lab.designs.lens import Lens
from coverage_lab.designs.seen import recorded
from coverage_lab.designs.simple import RAREST_PART, Simple, evaluable
from coverage_lab.probability import likely, point
from coverage_lab.probability_finite import finite_point, reachable
from coverage_lab.records import Array, Columns, Counts, Outcomes, Part

LARGEST_POPULATION = 10_000_000
_TABLE_CELLS = 1 << 22  # of the tables that a mistaken record needs; 32 MB


@dataclass(frozen=True)
class Finite(Frame):
    """X events in n of N units, M of which are events: X ~ Hypergeometric(N, M, n), and the truth is M/N.

    M is the whole number nearest p·N, halves up. n = N is a census. An infinite population is the simple design.

    Raises:
        InputFault: the population is not a whole number from 1 to 10 million, nor infinite.

    Source: Cochran 1977, Sampling Techniques, ch. 3.
    """

    population: float

    kind: ClassVar[str] = "finite"

    def __post_init__(self) -> None:
        size = self.population
        if not (size == math.inf or (1 <= size <= LARGEST_POPULATION and float(size).is_integer())):
            raise InputFault(
                expected(f"a whole number from 1 to {LARGEST_POPULATION}, or inf", size, "[design] population")
            )

    @property
    def columns(self) -> tuple[str, ...]:
        """What every sample has."""
        return ("events", "trials", "population")

    @property
    def endless(self) -> bool:
        """Whether the population is infinite."""
        return self.population == math.inf

    @property
    def constants(self) -> Columns:
        """The columns that no sample varies in."""
        return {"population": np.array([self.population])}

    def marked(self, p: float) -> int:
        """The number of events in the population at truth p."""
        return math.floor(p * self.population + 0.5)

    def faults(self, n: int) -> tuple[str, ...]:
        """A sample larger than the population."""
        if n <= self.population:
            return ()
        return (expected(f"at most the population of {self.population:.0f}", n, "[sample] n"),)

    def settle(self, p: float, n: int) -> tuple[float, int]:
        """The nearest M/N."""
        return (p if self.endless else self.marked(p) / self.population), n

    def points(self, low: float, high: float, n: int) -> Array | None:
        """Every M/N in [low, high]; every p of an infinite population."""
        if self.endless:
            return None
        return reachable(int(self.population), low, high)

    def units(self, p: float, n: int, size: int, rng: np.random.Generator) -> Units:
        """`size` hypergeometric counts, one group."""
        if self.endless:
            return Simple().units(p, n, size, rng)
        marked = self.marked(p)
        events = rng.hypergeometric(marked, int(self.population) - marked, n, size)[:, None]
        return events, n - events

    def gather(self, events: Counts, others: Counts) -> Columns:
        """Events, evaluable units, and the population."""
        x = events.sum(axis=1)
        return {"events": x, "trials": compact(x + others.sum(axis=1)), **self.constants}

    def mixed(self, n: int, lens: Lens) -> tuple[Part, ...] | None:
        """Hypergeometric parts, one for every evaluable number, when units are lost alike and never mistaken."""
        if self.endless:
            parts = Simple().mixed(n, lens)
            return parts and tuple(replace(part, constants=self.constants) for part in parts)
        if lens.kept is None or lens.mixes or n > self.population:
            return None
        population = int(self.population)
        sizes, weight = evaluable(n, lens.kept, RAREST_PART)
        return tuple(
            Part(int(m), float(w), population=population, constants=self.constants)
            for m, w in zip(sizes, weight, strict=True)
        )

    def listed(self, p: float, n: int, lens: Lens) -> Outcomes | None:
        """Hypergeometric given the evaluable number, seen through known mistakes; outcome-dependent losses as pairs.

        None where mistakes come with outcome-dependent losses, and beyond the tables' size.
        """
        if n > self.population:
            return None
        found = Simple().listed(p, n, lens) if self.endless else self._listed(p, n, lens)
        return found and Outcomes({**found.columns, **self.constants}, found.weight)

    def _listed(self, p: float, n: int, lens: Lens) -> Outcomes | None:
        if lens.kept is None:
            return None if lens.mixes else self._pairs(p, n, lens)
        sizes, weight = evaluable(n, lens.kept, SMALLEST)
        if lens.mixes and ((sizes + 1.0) ** 2).sum() > _TABLE_CELLS:
            return None
        true, chances = self._true_events(p, sizes)
        events, chances = self._recorded(true, chances, sizes, lens) if lens.mixes else (true, chances)
        if chances.size > 10 * LARGEST_LAW:
            return None
        x, m = np.tile(events, len(sizes)), np.repeat(sizes, len(events)) if len(sizes) > 1 else sizes
        return probable({"events": x, "trials": m}, (chances * weight[:, None]).ravel())

    def _true_events(self, p: float, sizes: Counts) -> tuple[Counts, Array]:
        """True events among the units drawn and their probabilities, array (sizes, events)."""
        marked, population = self.marked(p), int(self.population)
        events = np.arange(likely(int(sizes[0]), p)[0], likely(int(sizes[-1]), p)[1] + 1)
        return events, finite_point(events[None, :], sizes[:, None], population, marked)

    @staticmethod
    def _recorded(true: Counts, chances: Array, sizes: Counts, lens: Lens) -> tuple[Counts, Array]:
        """Recorded events and their probabilities, array (sizes, events), through a test that errs."""
        seen = np.zeros((len(sizes), int(sizes[-1]) + 1))
        for row, m in enumerate(sizes.tolist()):
            table = recorded(m, lens.chance(1.0), lens.chance(0.0))
            possible = true <= m
            seen[row, : m + 1] = chances[row, possible] @ table[true[possible]]
        return np.arange(seen.shape[1]), seen

    def _pairs(self, p: float, n: int, lens: Lens) -> Outcomes | None:
        """Recorded events and others when the loss of a unit depends on what it is."""
        true, chances = self._true_events(p, np.array([n]))
        kept_events, kept_others = np.arange(true[-1] + 1), np.arange(n - true[0] + 1)
        if len(kept_events) * len(kept_others) > 10 * LARGEST_LAW:
            return None
        of_events = point(kept_events[None, :], true[:, None], lens.event[0])
        of_others = point(kept_others[None, :], n - true[:, None], lens.other[1])
        x, y = (grid.ravel() for grid in np.meshgrid(kept_events, kept_others, indexing="ij"))
        joint = (of_events * chances.T).T @ of_others
        return probable({"events": x, "trials": x + y}, joint.ravel())
