"""The frozen records of choosing n: what was found for each target, and the whole answer with its tables."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass
from typing import TYPE_CHECKING, Any, Literal

from coverage_lab.records import Plan

if TYPE_CHECKING:
    import pandas as pd

FORMAT = "coverage-lab/sample-size/1"

TARGETS = ("expected_width", "assurance", "coverage")


@dataclass(frozen=True)
class Found:
    """Where a target is met: the first n, and the n from which every larger one meets it; None where none was found.

    `checked` says in words which n were looked at: all of them, or a bracket with its neighbourhood.
    """

    first_n: int | None
    safe_n: int | None
    checked: str

    def document(self) -> dict[str, Any]:
        """As `sample-size --json` prints it."""
        return {"first_n": self.first_n, "safe_n": self.safe_n, "checked": self.checked}


@dataclass(frozen=True)
class Inflation:
    """What the sample has to make up for, in this order: design effect, finite population, losses, whole clusters."""

    design_effect: float = 1.0
    population: int | None = None
    loss: float = 0.0
    cluster_size: int | None = None


@dataclass(frozen=True)
class Rung:
    """One step of the ladder: its value unrounded, and the ceiling that is printed."""

    name: str  # base, design_effect, finite, loss, units
    value: float
    ceiling: int


@dataclass(frozen=True)
class Ladder:
    """The rungs from the base n to units; `census` where the whole population is needed."""

    rungs: tuple[Rung, ...]
    clusters: int | None
    census: bool

    @property
    def units(self) -> int:
        """The last rung."""
        return self.rungs[-1].ceiling

    def document(self) -> dict[str, Any]:
        """Every rung's printed number; `whole_clusters` counts clusters, None without any."""
        printed: dict[str, Any] = {rung.name: rung.ceiling for rung in self.rungs}
        return {**printed, "whole_clusters": self.clusters, "census": self.census}


@dataclass(frozen=True)
class Baseline:
    """The margin-of-error formula z²p(1-p)/d², unrounded, at p = ½ and at the value of the planned range nearest ½."""

    half_width: float
    worst_case: float
    guess: float
    guess_at: float
    worst_case_n: int
    guess_n: int
    delivers: pd.DataFrame  # n, method, minimum_coverage, mean_coverage, half_width, assurance

    def document(self) -> dict[str, Any]:
        """The two sizes, and what they really deliver."""
        sizes = {"worst_case": self.worst_case_n, "guess": self.guess_n, "guess_at": self.guess_at}
        return {**sizes, "delivers": rows_of(self.delivers)}


@dataclass(frozen=True)
class Seen:
    """The n that sees at least `events` events at `rate`, with the probability that it gives."""

    events: int
    rate: float
    n: int
    probability: float
    census: bool

    def document(self) -> dict[str, Any]:
        """As `sample-size --json` prints it."""
        return {"events": self.events, "rate": self.rate, "n": self.n, "probability": self.probability}


@dataclass(frozen=True)
class Decided:
    """A claim about a goal by the exact test, at the n from which its power holds.

    critical: the claim is made at that many events or more (`claim` "above"), or that many or fewer ("below").
    by_method: the same claim made when each method's limit clears the goal: critical, worst_size, power.
    """

    claim: Literal["above", "below"]
    found: Found
    n: int | None
    critical: int | None
    size: float | None
    power: float | None
    by_method: pd.DataFrame
    by_n: pd.DataFrame  # n, critical, size, power

    def document(self) -> dict[str, Any]:
        """As `sample-size --json` prints it."""
        figures = {"claim": self.claim, "n": self.n, "critical": self.critical, "size": self.size, "power": self.power}
        return {**self.found.document(), **figures, "by_method": rows_of(self.by_method)}


@dataclass(frozen=True)
class SizingVerdict:
    """Method and n together, with everything that the sentence says.

    n meets every target; units is the last rung of the ladder. `needs` maps each target to the n that it asks for.
    """

    status: Literal["recommended", "none"]
    method: str | None
    n: int | None
    units: int | None
    sentence: str
    prefer: tuple[str, ...]
    needs: Mapping[str, int]
    alternatives: tuple[Mapping[str, Any], ...]
    best: Mapping[str, Any] | None  # without a recommendation: the closest that was found

    def document(self) -> dict[str, Any]:
        """As `sample-size --json` prints it."""
        return {
            "status": self.status,
            "method": self.method,
            "n": self.n,
            "units": self.units,
            "sentence": self.sentence,
            "prefer": list(self.prefer),
            "needs": dict(self.needs),
            "alternatives": [dict(item) for item in self.alternatives],
            "best": dict(self.best) if self.best is not None else None,
        }


@dataclass(frozen=True)
class Sizing:
    """The whole answer to "how many?".

    by_method: method -> target -> Found, or None where the target is not set or the method is not scanned for it.
    methods: one row a method: method, label, first_n, safe_n, and <target>_first_n, <target>_safe_n.
    scan: n, method, minimum_coverage, minimum_at, mean_coverage, half_width, assurance (proportions).
    rare: events, n, bound, probability_at_hoped_for, census. characteristic: events, n, p, probability of success.
    """

    plan: Plan
    horizon: int | None
    by_method: Mapping[str, Mapping[str, Found | None]]
    methods: pd.DataFrame
    scan: pd.DataFrame
    rare: pd.DataFrame
    characteristic: pd.DataFrame
    formula: Baseline | None
    zero_events: str | None  # what seeing no event would allow to say, in words
    seen: Seen | None
    decision: Decided | None
    inflated: Ladder | None
    verdict: SizingVerdict
    cautions: tuple[str, ...]

    def document(self) -> dict[str, Any]:
        """The dictionary that `sample-size --json` prints; no NaN, None for what the plan does not ask."""
        return {
            "format": FORMAT,
            "plan": dict(self.plan.document),
            "horizon": self.horizon,
            "methods": [self._method_document(row) for row in rows_of(self.methods)],
            "formula": self.formula.document() if self.formula else None,
            "rare": rows_of(self.rare),
            "zero_events": self.zero_events,
            "seen": self.seen.document() if self.seen else None,
            "decision": self.decision.document() if self.decision else None,
            "inflated": self.inflated.document() if self.inflated else None,
            "verdict": self.verdict.document(),
            "cautions": list(self.cautions),
        }

    def _method_document(self, row: Mapping[str, Any]) -> dict[str, Any]:
        """One method with its targets."""
        name = str(row["method"])
        by = {target: found.document() if found else None for target, found in self.by_method[name].items()}
        return {"method": name, "first_n": row["first_n"], "safe_n": row["safe_n"], "by": by}


def rows_of(frame: pd.DataFrame) -> list[dict[str, Any]]:
    """The rows of a frame with None where it has nothing, and plain Python numbers."""
    return [
        {str(key): None if value != value else value for key, value in row.items()}
        for row in frame.astype(object).where(frame.notna(), None).to_dict("records")
    ]
