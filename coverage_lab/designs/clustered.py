"""Clusters of units that are more alike than units from different clusters."""

import math
from collections import Counter
from dataclasses import dataclass, field, replace
from typing import ClassVar

import numpy as np

from coverage_lab.checks import InputFault, expected
from coverage_lab.designs import guide
from coverage_lab.designs.cluster_law import (
    NEVER,
    RandomSizes,
    cluster_counts,
    cluster_pairs,
    joint_law,
    total_law,
)
from coverage_lab.designs.frame import LARGEST_LAW, Frame, Units, compact
from coverage_lab.designs.lens import Lens
from coverage_lab.designs.simple import Simple
from coverage_lab.records import Array, Columns, Counts, Outcomes, Part

_VARYING = ("events", "events_squared", "events_by_size")
_SIZES = ("trials", "clusters", "sizes_squared")
_SUMS = (*_VARYING, *_SIZES)
_TOTALS = frozenset({"events", "trials", "sizes_squared", "planned_icc"})
_DRAWN_AT_A_TIME = 1 << 18  # clusters: their arrays stay in the processor's cache
_LARGEST_PAIRS = 500  # units in a cluster: beyond, the law of its record takes too long to make
_LARGEST_ENTANGLED = 40  # the same where mistakes and losses cannot be taken apart
_LONGEST_TOTAL = 20_000  # units: beyond, the convolution of clusters takes longer than it is worth


@dataclass(frozen=True)
class Clustered(Frame):
    """k clusters of m units; cluster c has its own proportion P ~ Beta(p(1-ρ)/ρ, (1-p)(1-ρ)/ρ), X ~ Binomial(m, P).

    ρ is the intraclass correlation; ρ = 0 is the simple design. A sample of n units is ⌈n/m⌉ whole clusters.

    Args:
        size: units in every cluster, or one size a cluster; with `cv`, the mean of random sizes.
        icc: ρ in [0, 1).
        cv: coefficient of variation of the sizes: a gamma number, rounded, at least 1.
        planned_icc: what the methods with a planned design effect are told; the true one if nothing is said.

    Raises:
        InputFault: sizes, cv or correlations out of range, or a correlation among clusters of one unit.

    Source: W. G. Cochran 1977, Sampling Techniques, ch. 9-10; beta-binomial clusters: J. G. Skellam 1948, J. R. Stat.
    Soc. B 10:257.
    """

    size: int | tuple[int, ...]
    icc: float
    cv: float = 0.0
    planned_icc: float | None = None
    population: int | None = field(default=None, repr=False)  # for the choice of n only: the draws ignore it

    kind: ClassVar[str] = "clustered"

    def __post_init__(self) -> None:
        faults = [*self._size_faults(), *_icc_faults(self.icc, "icc")]
        if self.planned_icc is not None:
            faults += _icc_faults(self.planned_icc, "planned_icc")
        if not faults and self.icc > 0 and self.largest == 1 and self.cv == 0:
            faults.append(expected("0, since clusters of one unit leave nothing to be alike", self.icc, "[design] icc"))
        if faults:
            raise InputFault(*faults)

    def _size_faults(self) -> list[str]:
        """Faults of the sizes and their variation."""
        sizes = self.size if isinstance(self.size, tuple) else (self.size,)
        faults = []
        if not sizes or not all(float(m).is_integer() and m >= 1 for m in sizes):
            faults.append(expected("whole numbers of at least 1", self.size, "[design] cluster_size"))
        if not (math.isfinite(self.cv) and self.cv >= 0):
            faults.append(expected("a number of at least 0", self.cv, "[design] cluster_cv"))
        if self.cv > 0 and isinstance(self.size, tuple):
            faults.append(expected("none beside a list of sizes", self.cv, "[design] cluster_cv"))
        return faults

    @property
    def columns(self) -> tuple[str, ...]:
        """What every sample has."""
        return (*_SUMS, "planned_icc")

    @property
    def largest(self) -> int:
        """The largest planned size."""
        return max(self.size) if isinstance(self.size, tuple) else self.size

    @property
    def constants(self) -> Columns:
        """The columns that no sample varies in."""
        return {"planned_icc": np.array([self.icc if self.planned_icc is None else self.planned_icc])}

    def sizes(self, n: int) -> tuple[int, ...]:
        """Planned sizes of the clusters that make up n units."""
        return self.size if isinstance(self.size, tuple) else (self.size,) * math.ceil(n / self.size)

    def faults(self, n: int) -> tuple[str, ...]:
        """A single cluster; listed sizes with another sum; a sample larger than the population."""
        found = []
        if isinstance(self.size, tuple) and sum(self.size) != n:
            found.append(expected(f"{sum(self.size)}, the sum of the listed cluster sizes", n, "[sample] n"))
        elif len(self.sizes(n)) < 2:
            found.append(expected("at least 2 clusters: one alone shows no variance between clusters", n, "[sample] n"))
        if self.population is not None and n > self.population:
            found.append(expected(f"at most the population of {self.population}", n, "[sample] n"))
        return tuple(found)

    def settle(self, p: float, n: int) -> tuple[float, int]:
        """Every p is reachable; n is filled up to whole clusters."""
        return p, sum(self.sizes(n))

    def units(self, p: float, n: int, size: int, rng: np.random.Generator) -> Units:
        """`size` literal samples: sizes, then a proportion for every cluster, then its events."""
        planned = self.sizes(n)
        shape = (size, len(planned))
        random = self.random_sizes
        sizes = np.broadcast_to(np.array(planned), shape) if random is None else random.draw(shape, rng)
        if self.icc == 0 or p in (0.0, 1.0):
            events = rng.binomial(sizes, p)
        else:
            strength = (1 - self.icc) / self.icc
            events = rng.binomial(sizes, rng.beta(p * strength, (1 - p) * strength, shape))
        return events, sizes - events

    @property
    def random_sizes(self) -> RandomSizes | None:
        """The law of the sizes where they vary from sample to sample."""
        return RandomSizes(self.largest, self.cv) if self.cv > 0 else None

    def gather(self, events: Counts, others: Counts) -> Columns:
        """Sufficient statistics; a cluster of which nothing is recorded is no cluster."""
        m = events + others
        squares = (np.einsum("ij,ij->i", *pair) for pair in ((events, events), (events, m), (m, m)))
        xx, xm, mm = squares
        sums = (events.sum(axis=1), xx, xm, m.sum(axis=1), np.count_nonzero(m, axis=1), mm)
        return {**{name: compact(values) for name, values in zip(_SUMS, sums, strict=True)}, **self.constants}

    def drawn(self, p: float, n: int, size: int, rng: np.random.Generator, lens: Lens) -> Columns:
        """Each cluster from the exact law of one cluster, by table, where that has few outcomes; else unit by unit."""
        sizes = Counter(self.sizes(n))
        groups = self._groups(sizes, p, lens)
        if groups is not None:
            return {**self._named(guide.draw_sums(groups, size, rng), sizes), **self.constants}
        step = max(1, _DRAWN_AT_A_TIME // sizes.total())
        lengths = [min(step, size - start) for start in range(0, size, step)]
        shares = [self.gather(*lens.seen(*self.units(p, n, length, rng), rng)) for length in lengths]
        whole = {
            name: np.concatenate([np.broadcast_to(s[name], k) for s, k in zip(shares, lengths, strict=True)])
            for name in _SUMS
        }
        return {**{name: compact(values) for name, values in whole.items()}, **self.constants}

    def _groups(self, sizes: Counter[int], p: float, lens: Lens) -> list[guide.Group] | None:
        """The clusters by size, with the outcomes of one and their chances; None where these are too many."""
        random = self.random_sizes
        largest = self.largest if random is None else random.largest
        entangled = lens.mixes and lens.loses and lens.kept is None
        if largest > (_LARGEST_ENTANGLED if entangled else _LARGEST_PAIRS):
            return None
        if random is None and not lens.loses:
            return [_group_of_counts(m, cluster_counts(m, p, self.icc, lens), count) for m, count in sizes.items()]
        drawn = sizes.items() if random is None else [(random, sizes.total())]
        groups = [_group_of_pairs(cluster_pairs(size, p, self.icc, lens), count) for size, count in drawn]
        return groups if all(len(group.chances) <= guide.LARGEST_LAW for group in groups) else None

    @staticmethod
    def _named(sums: Counts, sizes: Counter[int]) -> Columns:
        """The columns behind the sums over clusters."""
        if len(sums) == len(_SUMS):
            return dict(zip(_SUMS, map(compact, sums), strict=True))
        return {**dict(zip(_VARYING, map(compact, sums), strict=True)), **_size_sums(sizes)}

    def listed(self, p: float, n: int, lens: Lens) -> Outcomes | None:
        """Equal clusters without losses: the joint law of the events and their squares, while it is small enough."""
        sizes = Counter(self.sizes(n))
        if self.cv > 0 or lens.loses or len(sizes) > 1:
            return None
        ((m, k),) = sizes.items()
        found = joint_law(cluster_counts(m, p, self.icc, lens), k)
        if found is None or len(found[0]) > LARGEST_LAW:
            return None
        events, squares, chance = found
        columns = {"events": events, "events_squared": squares, "events_by_size": m * events}
        return Outcomes({**columns, **_size_sums(sizes), **self.constants}, chance)

    def view(self, needs: frozenset[str]) -> Frame:
        """For methods that need totals only, a frame that knows their law."""
        return ClusterTotals(self, "sizes_squared" in needs) if needs <= _TOTALS else self


@dataclass(frozen=True)
class ClusterTotals(Frame):
    """Clustered samples of which only totals are looked at, with or without the sum of squared sizes."""

    frame: Clustered
    squares: bool

    kind: ClassVar[str] = "clustered"

    @property
    def columns(self) -> tuple[str, ...]:
        """What every sample has."""
        return ("events", "trials", *(("sizes_squared",) if self.squares else ()), "planned_icc")

    def settle(self, p: float, n: int) -> tuple[float, int]:
        """As the clusters themselves."""
        return self.frame.settle(p, n)

    def units(self, p: float, n: int, size: int, rng: np.random.Generator) -> Units:
        """As the clusters themselves."""
        return self.frame.units(p, n, size, rng)

    def gather(self, events: Counts, others: Counts) -> Columns:
        """The totals."""
        return self._restricted(self.frame.gather(events, others))

    def drawn(self, p: float, n: int, size: int, rng: np.random.Generator, lens: Lens) -> Columns:
        """The totals of clustered draws."""
        return self._restricted(self.frame.drawn(p, n, size, rng, lens))

    def _restricted(self, columns: Columns) -> Columns:
        return {name: columns[name] for name in self.columns}

    def _independent(self, lens: Lens) -> bool:
        """Whether the totals are those of a simple sample: no correlation, and nothing else that would vary."""
        return self.frame.icc == 0 and self.frame.cv == 0 and not (lens.loses and self.squares)

    def _fixed(self, n: int) -> Columns:
        """The columns that no sample varies in."""
        squares = {"sizes_squared": _size_sums(Counter(self.frame.sizes(n)))["sizes_squared"]} if self.squares else {}
        return {**squares, **self.frame.constants}

    def listed(self, p: float, n: int, lens: Lens) -> Outcomes | None:
        """The simple law without correlation; else, without losses, the convolution of the clusters' laws."""
        sizes = Counter(self.frame.sizes(n))
        if self._independent(lens):
            found = Simple().listed(p, self.settle(p, n)[1], lens)
            return found and Outcomes({**found.columns, **self._fixed(n)}, found.weight)
        if self.frame.cv > 0 or lens.loses or sum(self.frame.sizes(n)) > _LONGEST_TOTAL:
            return None
        events, chance = total_law([(cluster_counts(m, p, self.frame.icc, lens), k) for m, k in sizes.items()])
        return Outcomes({"events": events, "trials": _size_sums(sizes)["trials"], **self._fixed(n)}, chance)

    def mixed(self, n: int, lens: Lens) -> tuple[Part, ...] | None:
        """The simple design's parts without correlation."""
        if not self._independent(lens):
            return None
        parts = Simple().mixed(self.settle(0.5, n)[1], lens)
        return parts and tuple(replace(part, constants=self._fixed(n)) for part in parts)


def _size_sums(sizes: Counter[int]) -> Columns:
    """What clusters of fixed sizes have in common in every sample: units, clusters, sum of squared sizes."""
    sums = (sum(m * k for m, k in sizes.items()), sizes.total(), sum(m * m * k for m, k in sizes.items()))
    return {name: np.array([value]) for name, value in zip(_SIZES, sums, strict=True)}


def _group_of_counts(m: int, law: Array, count: int) -> guide.Group:
    """`count` clusters of m units, all recorded: what is counted of them, x, x² and x·m."""
    x = np.arange(m + 1)
    return guide.Group(law, np.stack([x, x * x, x * m], axis=1), count)


def _group_of_pairs(law: Array, count: int) -> guide.Group:
    """`count` clusters with the law of (events, others) recorded: what is counted of them, sizes included."""
    x, y = np.nonzero(law > NEVER)
    m = x + y
    return guide.Group(law[x, y], np.stack([x, x * x, x * m, m, np.minimum(m, 1), m * m], axis=1), count)


def _icc_faults(icc: float, key: str) -> list[str]:
    """A correlation outside [0, 1)."""
    return [] if 0 <= icc < 1 else [expected("a number of at least 0 and below 1", icc, f"[design] {key}")]
