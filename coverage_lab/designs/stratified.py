"""Strata: parts of the population that are sampled separately, each with its own proportion."""

import math
from dataclasses import dataclass
from typing import ClassVar

import numpy as np
from scipy import special
from scipy.optimize import brentq

from coverage_lab.checks import InputFault, expected
from coverage_lab.designs.frame import LARGEST_LAW, SMALLEST, Frame, Units, compact, probable
from coverage_lab.designs.lens import Lens
from coverage_lab.designs.simple import Simple
from coverage_lab.records import Array, Columns, Counts, Outcomes

SMALLEST_STRATUM = 2
_WEIGHTS_SUM_WITHIN = 1e-9
_LARGEST_PRODUCT = 1_000_000  # samples formed before the rare ones are dropped
_TOTALS = frozenset({"events", "trials"})


@dataclass(frozen=True)
class Stratum:
    """A share `weight` of the population, `size` units drawn from it; its odds are `odds_ratio` times a reference's."""

    name: str
    weight: float
    size: int
    odds_ratio: float = 1.0


@dataclass(frozen=True)
class Stratified(Frame):
    """Independent binomial samples from strata whose proportions average to p with the population's weights.

    The odds of the strata are in the stated ratios; their common factor is solved so that the weighted mean is p. At
    another total size than the listed one every stratum's size changes in proportion, by largest remainders.

    Raises:
        InputFault: no stratum, weights that do not sum to 1, sizes below 2, ratios that are not positive.

    Source: Cochran 1977, Sampling Techniques, ch. 5.
    """

    strata: tuple[Stratum, ...]

    kind: ClassVar[str] = "stratified"

    def __post_init__(self) -> None:
        faults = []
        for stratum in self.strata:
            where = f"[design.strata] {stratum.name}"
            if not (float(stratum.size).is_integer() and stratum.size >= SMALLEST_STRATUM):
                faults.append(expected(f"at least {SMALLEST_STRATUM} units", stratum.size, f"{where}: n"))
            if not 0 < stratum.weight <= 1:
                faults.append(expected("a number above 0 and at most 1", stratum.weight, f"{where}: weight"))
            if not 0 < stratum.odds_ratio < math.inf:
                faults.append(expected("a positive number", stratum.odds_ratio, f"{where}: odds_ratio"))
        total = math.fsum(stratum.weight for stratum in self.strata)
        if not faults and abs(total - 1) > _WEIGHTS_SUM_WITHIN:
            faults.append(expected("1", total, "[design.strata] sum of the weights"))
        if faults:
            raise InputFault(*faults)

    @property
    def columns(self) -> tuple[str, ...]:
        """What every sample has."""
        return ("events", "trials", "stratum_events", "stratum_trials", "stratum_weights")

    @property
    def weights(self) -> Array:
        """Shares of the population."""
        return np.array([stratum.weight for stratum in self.strata])

    def sizes(self, n: int) -> Counts:
        """Units drawn from every stratum when n are drawn in all."""
        listed = np.array([stratum.size for stratum in self.strata])
        share = n * listed / listed.sum()
        sizes: Counts = np.floor(share + 1e-9).astype(np.int64)
        order = np.argsort(-(share - sizes), kind="stable")
        sizes[order[: n - sizes.sum()]] += 1
        return sizes

    def proportions(self, p: float) -> Array:
        """The strata's proportions at truth p."""
        ratios = np.log([stratum.odds_ratio for stratum in self.strata])
        if p in (0.0, 1.0) or (ratios == ratios[0]).all():
            return np.full(len(ratios), p)

        def excess(level: float) -> float:
            return float(np.log(self.weights @ special.expit(ratios + level) / p))

        middle = float(special.logit(p))
        level = float(brentq(excess, middle - ratios.max() - 1, middle - ratios.min() + 1, xtol=1e-15, rtol=1e-15))
        return np.asarray(special.expit(ratios + level))

    def faults(self, n: int) -> tuple[str, ...]:
        """Strata that get fewer than two of n units."""
        return tuple(
            expected(f"at least {SMALLEST_STRATUM} units", int(size), f"[design.strata] {stratum.name}: n of {n}")
            for stratum, size in zip(self.strata, self.sizes(n), strict=True)
            if size < SMALLEST_STRATUM
        )

    def units(self, p: float, n: int, size: int, rng: np.random.Generator) -> Units:
        """`size` literal samples, a group for every stratum."""
        sizes = self.sizes(n)
        events = rng.binomial(sizes, self.proportions(p), (size, len(sizes)))
        return events, sizes - events

    def gather(self, events: Counts, others: Counts) -> Columns:
        """Totals, and the strata's own counts."""
        trials = events + others
        fixed = trials[:1] if (trials == trials[0]).all() else trials
        own = {"stratum_events": events, "stratum_trials": fixed, "stratum_weights": self.weights[None, :]}
        return {"events": events.sum(axis=1), "trials": compact(trials.sum(axis=1)), **own}

    def listed(self, p: float, n: int, lens: Lens) -> Outcomes | None:
        """The product of the strata's laws while there are not too many samples."""
        events, trials, chance = np.zeros((1, 0), np.int64), np.zeros((1, 0), np.int64), np.ones(1)
        for size, share in zip(self.sizes(n), self.proportions(p), strict=True):
            law = Simple().listed(float(share), int(size), lens)
            if law is None or len(chance) * len(law.weight) > _LARGEST_PRODUCT:
                return None
            both = np.outer(chance, law.weight)
            left, right = np.nonzero(both > SMALLEST)
            own = [np.broadcast_to(law.columns[name], law.weight.shape)[right] for name in ("events", "trials")]
            events, trials = (np.column_stack([old[left], new]) for old, new in zip((events, trials), own, strict=True))
            chance = both[left, right]
        return probable(self.gather(events, trials - events), chance) if len(chance) <= LARGEST_LAW else None

    def view(self, needs: frozenset[str]) -> Frame:
        """For methods that need totals only, a frame that knows their law."""
        return StratumTotals(self) if needs <= _TOTALS else self


@dataclass(frozen=True)
class StratumTotals(Frame):
    """Stratified samples of which only the totals are looked at."""

    frame: Stratified

    kind: ClassVar[str] = "stratified"

    @property
    def columns(self) -> tuple[str, ...]:
        """What every sample has."""
        return ("events", "trials")

    def units(self, p: float, n: int, size: int, rng: np.random.Generator) -> Units:
        """As the strata themselves."""
        return self.frame.units(p, n, size, rng)

    def gather(self, events: Counts, others: Counts) -> Columns:
        """The totals."""
        return Simple().gather(events, others)

    def listed(self, p: float, n: int, lens: Lens) -> Outcomes | None:
        """Without losses, the convolution of the strata's laws."""
        if lens.loses:
            return None
        total, first = np.ones(1), 0
        for size, share in zip(self.frame.sizes(n), self.frame.proportions(p), strict=True):
            law = Simple().listed(float(share), int(size), lens)
            if law is None:
                return None
            total, first = np.convolve(total, law.weight), first + int(law.columns["events"][0])
        return probable({"events": np.arange(len(total)) + first, "trials": np.array([n])}, total)
