"""What frames share. A frame alone is a design, seen through a clear lens; a stack of layers gives it another lens."""

from abc import ABC, abstractmethod
from typing import ClassVar

import numpy as np

from coverage_lab.designs.lens import CLEAR, Lens
from coverage_lab.records import Array, Columns, Counts, Outcomes, Part

SMALLEST = 1e-18  # a sample less likely than this adds nothing that a double can hold
LARGEST_LAW = 100_000  # distinct samples: a longer list is not made, simulation is quicker

Units = tuple[Counts, Counts]


class Frame(ABC):
    """How units come into the sample: (true events, true others) by group, and the columns made of what is recorded."""

    kind: ClassVar[str]

    @property
    @abstractmethod
    def columns(self) -> tuple[str, ...]:
        """The columns that every sample has."""

    @abstractmethod
    def units(self, p: float, n: int, size: int, rng: np.random.Generator) -> Units:
        """`size` literal samples as true events and true others, arrays (size, groups)."""

    @abstractmethod
    def gather(self, events: Counts, others: Counts) -> Columns:
        """The columns of what was recorded, from arrays (size, groups)."""

    @abstractmethod
    def listed(self, p: float, n: int, lens: Lens) -> Outcomes | None:
        """The distinct samples through a lens, or None when they cannot be listed."""

    def mixed(self, n: int, lens: Lens) -> tuple[Part, ...] | None:
        """The fixed mixture through a lens, or None."""
        return None

    def drawn(self, p: float, n: int, size: int, rng: np.random.Generator, lens: Lens) -> Columns:
        """`size` literal samples through a lens."""
        return self.gather(*lens.seen(*self.units(p, n, size, rng), rng))

    def settle(self, p: float, n: int) -> tuple[float, int]:
        """The truth and the size as they are."""
        return p, n

    def points(self, low: float, high: float, n: int) -> Array | None:
        """None: every p in [low, high] is reachable."""
        return None

    def view(self, needs: frozenset[str]) -> "Frame":
        """The frame itself."""
        return self

    def faults(self, n: int) -> tuple[str, ...]:
        """Why this frame cannot be drawn at size n, one line each."""
        return ()

    def draw(self, p: float, n: int, size: int, rng: np.random.Generator) -> Columns:
        """`size` literal samples."""
        return self.drawn(p, n, size, rng, CLEAR)

    def law(self, p: float, n: int) -> Outcomes | None:
        """The distinct samples with their exact probabilities, or None when they cannot be listed."""
        return self.listed(p, n, CLEAR)

    def parts(self, n: int) -> tuple[Part, ...] | None:
        """The fixed mixture behind the samples, or None."""
        return self.mixed(n, CLEAR)


def compact(values: Counts) -> Counts:
    """A column that is the same in every sample, as a constant of length 1."""
    return values[:1] if (values == values[0]).all() else values


def probable(columns: Columns, weight: Array) -> Outcomes | None:
    """The samples that are not too rare to be listed; None when there are too many of them."""
    rows = np.flatnonzero(weight > SMALLEST)
    if rows.size > LARGEST_LAW:
        return None
    return Outcomes({name: v[rows] if len(v) > 1 else v for name, v in columns.items()}, weight[rows])
