"""What a stack of layers does to a unit: recorded as an event, as a non-event, or lost."""

from collections.abc import Iterable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coverage_lab.records import Array, Counts

Row = tuple[float, float, float]

_ROUNDING = 1e-14  # of products of chances


@dataclass(frozen=True)
class Lens:
    """Probabilities of (recorded as event, recorded as other, lost): for a true event and for a true non-event."""

    event: Row = (1.0, 0.0, 0.0)
    other: Row = (0.0, 1.0, 0.0)

    @property
    def clear(self) -> bool:
        """Whether every unit is recorded as what it is."""
        return self.event == (1.0, 0.0, 0.0) and self.other == (0.0, 1.0, 0.0)

    @property
    def loses(self) -> bool:
        """Whether any unit can be lost."""
        return self.event[2] > 0 or self.other[2] > 0

    @property
    def mixes(self) -> bool:
        """Whether any unit can be recorded as what it is not."""
        return self.event[1] > 0 or self.other[0] > 0

    @property
    def kept(self) -> float | None:
        """The chance that a unit is kept where it does not depend on what the unit is, else None."""
        return 1 - self.event[2] if abs(self.event[2] - self.other[2]) <= _ROUNDING else None

    def kept_at(self, p: float) -> float:
        """The chance that a unit is kept when a share p of units are events."""
        return 1 - (p * self.event[2] + (1 - p) * self.other[2]) if self.kept is None else self.kept

    def chance(self, p: float) -> float:
        """The chance that a kept unit is recorded as an event when a share p of units are events."""
        kept = self.kept_at(p)
        return (self.other[0] / kept) * (1 - p) + (self.event[0] / kept) * p

    def seen(self, events: Counts, others: Counts, rng: np.random.Generator) -> tuple[Counts, Counts]:
        """What is recorded of true events and non-events, unit by unit: (events, others), of the same shape."""
        if self.clear:
            return events, others
        true_events, true_others = _split(events, self.event, rng), _split(others, self.other, rng)
        return true_events[0] + true_others[0], true_events[1] + true_others[1]


CLEAR = Lens()


def stacked(matrices: Iterable[Array]) -> Lens:
    """The lens of several 3 × 3 stochastic matrices over (event, other, lost), in the order in which they act."""
    product = np.eye(3)
    for matrix in matrices:
        product = product @ matrix
    event, other = ((float(row[0]), float(row[1]), float(row[2])) for row in product[:2])
    return Lens(event, other)


def _split(units: Counts, row: Row, rng: np.random.Generator) -> tuple[Counts, Counts]:
    """Units of one kind, recorded as (events, others); a chance of 0 or 1 costs no random number."""
    as_event, as_other, lost = row
    kept = _thinned(units, as_event + as_other if lost > 0 else 1.0, rng)
    events = _thinned(kept, as_event / (as_event + as_other), rng)
    return events, kept - events


def _thinned(units: Counts, chance: float, rng: np.random.Generator) -> NDArray[np.int64]:
    """How many of the units stay when each stays with `chance`."""
    if chance in (0.0, 1.0):
        return units * int(chance)
    return rng.binomial(units, chance)
