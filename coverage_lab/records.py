"""The frozen records that travel along the line plan -> audit -> verdict -> report.

No behaviour lives here beyond small properties. `Columns` map a name to an array whose axis 0 runs over distinct
samples; an array of length 1 is a constant that broadcasts.
"""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass, field
from decimal import Decimal
from typing import TYPE_CHECKING, Any, Literal, Protocol

import numpy as np
from numpy.typing import NDArray

if TYPE_CHECKING:
    import pandas as pd

Array = NDArray[np.float64]
Counts = NDArray[np.int64]
Columns = Mapping[str, NDArray[Any]]
Bounds = tuple[Array, Array]
Side = Literal["two-sided", "upper", "lower"]
Route = Literal["enumerated", "simulated"]

SIDES: tuple[Side, ...] = ("two-sided", "upper", "lower")
ROUTES: tuple[Route, ...] = ("enumerated", "simulated")


def alpha_of(confidence: float) -> float:
    """1 - confidence as the decimal that was written: 0.95 gives 0.05, not 0.050000000000000044."""
    return float(1 - Decimal(repr(float(confidence))))


def tail_of(confidence: float, side: Side) -> float:
    """Error probability per side: alpha/2 for a two-sided interval, alpha for a one-sided bound."""
    alpha = alpha_of(confidence)
    return alpha / 2 if side == "two-sided" else alpha


@dataclass(frozen=True)
class Method:
    """One interval method of the catalogue, or of the user.

    `function(*columns named by needs, tail)` returns (lower, upper) as its formula gives them: pure, broadcasting,
    never clipped. The engine truncates, picks the side and decides what applies.
    """

    name: str
    function: Callable[..., Bounds]
    label: str
    family: str
    source: str
    formula: str = ""
    ends: str = ""  # behaviour at 0 and n events, in words
    faults: str = ""  # known faults, in words
    sides: tuple[Side, ...] = SIDES
    needs: tuple[str, ...] = ("events", "trials")
    largest_n: int | None = None
    exemptions: Mapping[str, str] = field(default_factory=dict)  # law -> why the law does not hold here
    slow: bool = False  # each limit takes a search of its own: scanned over many n only when the plan names it


@dataclass(frozen=True)
class Outcomes:
    """Distinct samples with weights that sum to 1; `draws` is None when they were enumerated."""

    columns: Columns
    weight: Array
    draws: int | None = None


@dataclass(frozen=True)
class Part:
    """One component of a fixed mixture: with `weight`, `trials` units are counted, each an event with `chance(p)`.

    The count is binomial; where a `population` is given it is hypergeometric, p·population of its units being events.
    `constants` are the columns that no sample varies in.
    """

    trials: int
    weight: float
    at_zero: float = 0.0
    at_one: float = 1.0
    population: int | None = None
    constants: Columns = field(default_factory=dict)

    def chance(self, p: Array) -> Array:
        """The chance that a counted unit is recorded as an event: a straight line in the truth p."""
        return self.at_zero * (1 - p) + self.at_one * p

    def columns(self, events: Counts) -> Columns:
        """The samples with these events."""
        return {"events": events, "trials": np.array([self.trials]), **self.constants}


class Design(Protocol):
    """How the sample arises from the truth p at planned size n.

    Columns that a design may give: events, trials · population · clusters, events_squared (sum of x² over clusters),
    events_by_size (of x·m), sizes_squared (of m²), planned_icc · stratum_events, stratum_trials, stratum_weights (axis
    1 runs over strata) · sensitivity, specificity · diseased_tested, diseased_positive, healthy_tested,
    healthy_negative.
    """

    @property
    def kind(self) -> str:
        """The catalogue name."""

    @property
    def columns(self) -> tuple[str, ...]:
        """The columns that every sample has: what a method may need."""

    def settle(self, p: float, n: int) -> tuple[float, int]:
        """The reachable truth and size nearest the planned ones."""

    def draw(self, p: float, n: int, size: int, rng: np.random.Generator) -> Columns:
        """`size` literal samples: arrays of length `size` (or 1 for a constant)."""

    def law(self, p: float, n: int) -> Outcomes | None:
        """The distinct samples with their exact probabilities, or None when they cannot be listed."""

    def parts(self, n: int) -> tuple[Part, ...] | None:
        """The fixed mixture behind the samples, or None."""

    def points(self, low: float, high: float, n: int) -> Array | None:
        """The finite set of reachable truths in [low, high], or None when every p is reachable."""

    def faults(self, n: int) -> tuple[str, ...]:
        """Why it cannot be drawn at size n, one line each."""

    def view(self, needs: frozenset[str]) -> Design:
        """The same design for methods that need no more than these columns: it may know more about fewer columns."""


@dataclass(frozen=True)
class Study:
    """The user's words for the protocol; None is printed as a marked blank."""

    population: str | None = None
    unit: str | None = None
    target: Literal["population", "process"] | None = None
    range_basis: str | None = None


@dataclass(frozen=True)
class Outcome:
    """What is counted, and where its true proportion should lie: [low, high], weighted by Beta(prior)."""

    name: str
    expected: float
    low: float
    high: float
    prior: tuple[float, float] = (1.0, 1.0)


@dataclass(frozen=True)
class Standard:
    """What is good enough: worst and mean miss rate over the range, as multiples of alpha."""

    kind: Literal["bradley", "guaranteed", "custom"]
    worst_miss: float
    mean_miss: float


@dataclass(frozen=True)
class Simulation:
    """Monte Carlo settings; `replicates` draws per cell at the true proportions of `grid`."""

    replicates: int
    seed: int
    grid: tuple[float, ...]
    routes: tuple[Route, ...] = ROUTES


@dataclass(frozen=True)
class Precision:
    """Target: expected half-width at most `half_width` at the worst p; with `assurance` also P(half-width <= it)."""

    half_width: float
    assurance: float | None = None


@dataclass(frozen=True)
class Rare:
    """Targets for rare outcomes, one-sided: rule out the rate `limit` with each number of `events` allowed.

    see_at_least, at_rate, with_probability: the n that sees that many events at that rate with that probability.
    """

    limit: float | None = None
    events: tuple[int, ...] = (0,)
    hoped_for: float | None = None
    see_at_least: int | None = None
    at_rate: float | None = None
    with_probability: float = 0.95


@dataclass(frozen=True)
class Decision:
    """Target: claim that the proportion is on the believed side of a goal, with one-sided error `alpha` and `power`."""

    goal: float
    believed: float
    alpha: float
    power: float


@dataclass(frozen=True)
class Plan:
    """A planned study. `document` is the normalised plan with the file's own keys, as saved and hashed."""

    title: str
    confidence: float
    side: Side
    study: Study
    outcome: Outcome
    sizes: tuple[int, ...]
    standard: Standard
    design: Design
    simulation: Simulation
    methods: tuple[Method, ...]
    prefer: tuple[Method, ...]
    document: Mapping[str, Any]
    precision: Precision | None = None
    rare: Rare | None = None
    decision: Decision | None = None
    horizon: int | None = None  # how far "every larger n" is checked; None: from the targets

    @property
    def alpha(self) -> float:
        """The total error probability."""
        return alpha_of(self.confidence)

    @property
    def tail(self) -> float:
        """The error probability per side."""
        return tail_of(self.confidence, self.side)


@dataclass(frozen=True)
class Limits:
    """Bounds of one method on a list of samples: as the formula gave them, and truncated to [0, 1] for use."""

    raw_lower: Array
    raw_upper: Array
    lower: Array
    upper: Array


@dataclass(frozen=True)
class Interval:
    """One interval for data in hand, truncated to [0, 1]; unpacks as (lower, upper)."""

    lower: float
    upper: float
    raw_lower: float
    raw_upper: float

    def __iter__(self) -> Iterator[float]:
        return iter((self.lower, self.upper))


@dataclass(frozen=True)
class Minimum:
    """Smallest coverage over a range and the p where it is approached; `miss` = 1 - coverage at full relative accuracy.

    `certified` is True only where the value is proven: no grid took part.
    """

    coverage: float
    at: float
    certified: bool
    miss: float


@dataclass(frozen=True)
class CrossCheck:
    """How well the two routes agree, over all cells and methods."""

    cells: int
    largest_z: float
    p_value: float
    chi_square_p: float


@dataclass(frozen=True)
class Measurements:
    """What the engine measured for a plan; the verdict reads it and adds nothing to it.

    methods: one row per n x method; cells, curve: as CONTRACT names them; steady: one row per neighbour n x preferred
    method with worst_miss and mean_miss.
    """

    plan: Plan
    methods: pd.DataFrame
    cells: pd.DataFrame
    curve: pd.DataFrame
    steady: pd.DataFrame
    cross_check: CrossCheck | None


@dataclass(frozen=True)
class Verdict:
    """The recommendation for one n, with everything that its sentence says.

    precision: what the named method gives of the plan's [precision], and whether it meets it; None where none is asked.
    """

    n: int
    status: Literal["recommended", "none", "undecided"]
    method: str | None
    sentence: str
    prefer: tuple[str, ...]
    steady: tuple[Mapping[str, Any], ...]
    alternatives: tuple[Mapping[str, Any], ...]
    closest: Mapping[str, Any] | None
    too_small: Mapping[str, Any] | None
    holds_on: tuple[float, float] | None
    balance: str | None
    bounds_at: tuple[Mapping[str, Any], ...]
    precision: Mapping[str, Any] | None = None


@dataclass(frozen=True)
class Audit:
    """A finished audit: the measurements, the verdicts and where they came from.

    table: the interval for every outcome; steady: worst and mean miss of a few methods at every n around the planned.
    """

    plan: Plan
    methods: pd.DataFrame
    cells: pd.DataFrame
    curve: pd.DataFrame
    table: pd.DataFrame
    steady: pd.DataFrame
    verdict: Verdict
    by_n: tuple[Verdict, ...]
    cross_check: CrossCheck | None
    cautions: tuple[str, ...]
    provenance: Mapping[str, Any]
