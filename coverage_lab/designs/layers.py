"""Layers between a unit and its record: tests that err, and units that are lost. They lie over any frame."""

from dataclasses import dataclass
from typing import ClassVar, Literal, Protocol, get_args

import numpy as np

from coverage_lab.checks import InputFault, expected, unknown
from coverage_lab.designs.frame import probable
from coverage_lab.probability import likely, point
from coverage_lab.records import Array, Columns, Counts, Outcomes

Treatment = Literal["excluded", "events", "non-events"]

_ESTIMATES = ("diseased_tested", "diseased_positive", "healthy_tested", "healthy_negative")
_PLUGGED = ("sensitivity", "specificity")


class Layer(Protocol):
    """One step between a unit and its record."""

    kind: ClassVar[str]

    @property
    def columns(self) -> tuple[str, ...]:
        """The columns that it adds."""

    @property
    def matrix(self) -> Array:
        """What it does to a unit: 3 × 3 probabilities, from (event, other, lost) to (event, other, lost)."""

    @property
    def treatment(self) -> Array:
        """What is done with lost units once all layers have acted, 3 × 3."""

    @property
    def constants(self) -> Columns:
        """Columns that no sample varies in."""

    def draw(self, size: int, rng: np.random.Generator) -> Columns:
        """Columns that it draws anew for every sample."""

    def law(self) -> Outcomes | None:
        """The law of what it draws; None when it draws nothing."""

    def view(self, needs: frozenset[str]) -> "Layer":
        """The same layer without the columns that nothing needs."""


@dataclass(frozen=True)
class Classification:
    """Every unit is seen through a test with this sensitivity and specificity, unit by unit independently.

    Known, or estimated from `diseased_tested` units that have the condition and `healthy_tested` that have not: then
    their counts are drawn anew in every sample, and what a method is told are the estimates.

    Args:
        planned_sensitivity, planned_specificity: what methods are told when the truth is another than they believe.

    Raises:
        InputFault: chances outside [0, 1] or no better than tossing a coin; validation counts below 1, or only one.

    Source: W. J. Rogan & B. Gladen 1978, Am. J. Epidemiol. 107:71.
    """

    sensitivity: float
    specificity: float
    diseased_tested: int | None = None
    healthy_tested: int | None = None
    planned_sensitivity: float | None = None
    planned_specificity: float | None = None

    kind: ClassVar[str] = "classification"

    def __post_init__(self) -> None:
        chances = {name: getattr(self, name) for name in (*_PLUGGED, "planned_sensitivity", "planned_specificity")}
        given = {name: chance for name, chance in chances.items() if chance is not None}
        faults = [
            expected("a number from 0 to 1", chance, f"[design.classification] {name}")
            for name, chance in given.items()
            if not 0 <= chance <= 1
        ]
        for both in (self._true, self._planned):
            if not faults and sum(both) <= 1:
                what = "more than 1: a test that errs more tells nothing"
                faults.append(expected(what, sum(both), "[design.classification] sensitivity + specificity"))
        if faults := [*faults, *self._count_faults()]:
            raise InputFault(*faults)

    def _count_faults(self) -> list[str]:
        """Validation counts that are no counts, or only one of the two."""
        counts = {"diseased_tested": self.diseased_tested, "healthy_tested": self.healthy_tested}
        if all(count is None for count in counts.values()):
            return []
        return [
            expected("a whole number of at least 1", count, f"[design.classification] {name}")
            for name, count in counts.items()
            if count is None or not (float(count).is_integer() and count >= 1)
        ]

    @property
    def _true(self) -> tuple[float, float]:
        return self.sensitivity, self.specificity

    @property
    def _planned(self) -> tuple[float, float]:
        """What methods are told when nothing is estimated."""
        planned = (self.planned_sensitivity, self.planned_specificity)
        told, other = (true if plan is None else plan for true, plan in zip(self._true, planned, strict=True))
        return told, other

    @property
    def estimated(self) -> bool:
        """Whether sensitivity and specificity are estimates."""
        return self.diseased_tested is not None

    @property
    def columns(self) -> tuple[str, ...]:
        """What it adds."""
        return (*_PLUGGED, *_ESTIMATES) if self.estimated else _PLUGGED

    @property
    def matrix(self) -> Array:
        """Test results."""
        se, sp = self._true
        return np.array([[se, 1 - se, 0.0], [1 - sp, sp, 0.0], [0.0, 0.0, 1.0]])

    @property
    def treatment(self) -> Array:
        """Nothing."""
        return np.eye(3)

    @property
    def constants(self) -> Columns:
        """Known chances."""
        if self.estimated:
            return {}
        return {name: np.array([chance]) for name, chance in zip(_PLUGGED, self._planned, strict=True)}

    @property
    def _tested(self) -> tuple[int, int]:
        """Validation counts."""
        return self.diseased_tested or 0, self.healthy_tested or 0

    def _with_estimates(self, positive: Counts, negative: Counts) -> Columns:
        """Validation counts and the estimates made of them."""
        diseased, healthy = self._tested
        counts = {"diseased_positive": positive, "healthy_negative": negative}
        tested = {"diseased_tested": np.array([diseased]), "healthy_tested": np.array([healthy])}
        return {**counts, **tested, "sensitivity": positive / diseased, "specificity": negative / healthy}

    def draw(self, size: int, rng: np.random.Generator) -> Columns:
        """Validation counts of every sample."""
        if not self.estimated:
            return {}
        counts = [rng.binomial(tested, chance, size) for tested, chance in zip(self._tested, self._true, strict=True)]
        return self._with_estimates(*counts)

    def law(self) -> Outcomes | None:
        """The product of two binomial windows."""
        if not self.estimated:
            return None
        counts, chances = [], []
        for tested, chance in zip(self._tested, self._true, strict=True):
            first, last = likely(tested, chance)
            counts.append(np.arange(first, last + 1))
            chances.append(point(counts[-1], tested, chance))
        positive, negative = (grid.ravel() for grid in np.meshgrid(*counts, indexing="ij"))
        return probable(self._with_estimates(positive, negative), np.outer(*chances).ravel())

    def view(self, needs: frozenset[str]) -> "Classification":
        """Where nothing needs the estimates, the same test with its chances known."""
        return self if needs & set(self.columns) else Classification(*self._true)


@dataclass(frozen=True)
class Loss:
    """Every unit is lost with a probability that may depend on what it is; what is done with it is the analysis.

    Args:
        rate_events, rate_others: chances in [0, 1) that a true event and a true non-event are lost.
        treat_as: lost units are excluded, counted as events, or counted as non-events.

    Raises:
        InputFault: rates outside [0, 1), or an unknown treatment.

    Source: R. J. A. Little & D. B. Rubin 2019, Statistical Analysis with Missing Data.
    """

    rate_events: float
    rate_others: float
    treat_as: Treatment = "excluded"

    kind: ClassVar[str] = "loss"
    columns: ClassVar[tuple[str, ...]] = ()

    def __post_init__(self) -> None:
        rates = {"rate_events": self.rate_events, "rate_others": self.rate_others}
        faults = [
            expected("a number of at least 0 and below 1", rate, f"[design.loss] {name}")
            for name, rate in rates.items()
            if not 0 <= rate < 1
        ]
        if self.treat_as not in get_args(Treatment):
            faults.append("[design.loss] " + unknown("treat_as", self.treat_as, get_args(Treatment)))
        if faults:
            raise InputFault(*faults)

    @property
    def matrix(self) -> Array:
        """Losses."""
        events, others = self.rate_events, self.rate_others
        return np.array([[1 - events, 0.0, events], [0.0, 1 - others, others], [0.0, 0.0, 1.0]])

    @property
    def treatment(self) -> Array:
        """Where lost units go."""
        place = {"events": 0, "non-events": 1, "excluded": 2}[self.treat_as]
        return np.vstack([np.eye(3)[:2], np.eye(3)[place]])

    @property
    def constants(self) -> Columns:
        """None."""
        return {}

    def draw(self, size: int, rng: np.random.Generator) -> Columns:
        """Nothing of its own."""
        return {}

    def law(self) -> Outcomes | None:
        """Nothing of its own."""
        return None

    def view(self, needs: frozenset[str]) -> "Loss":
        """The layer itself."""
        return self
