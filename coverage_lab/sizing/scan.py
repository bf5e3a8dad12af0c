"""The exact scan: for every n of a list and every method, the figures that the targets are judged by."""

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property

import numpy as np
import pandas as pd
from scipy.special import ndtri

from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.means import Range
from coverage_lab.engine.work import Progress
from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Array, Counts, Limits, Method, Plan, Side
from coverage_lab.sizing.formula import nearest_half
from coverage_lab.sizing.many import Prior, worst
from coverage_lab.sizing.pool import Interrupted, run
from coverage_lab.sizing.rows import WIDE, Rows, blocks, joined, rows
from coverage_lab.sizing.widths import Chances, assurance, expected, half_widths, largest_expected, peaks_at

EVENTS = 40_000  # of one block and method: large enough to hide the calls, small enough for the progress line
NARROW = 0.8  # standard errors beyond a limit's own reach within which events can still cover in the range
COVERAGE_COLUMNS = ("worst_miss", "minimum_at", "mean_miss")
COLUMNS = (*COVERAGE_COLUMNS, "half_width", "assurance")

Table = dict[str, Array | Counts]


@dataclass(frozen=True)
class Asked:
    """What is asked of every n: the figures named in `columns`; the widths among them need a `half_width`."""

    low: float
    high: float
    prior: tuple[float, float]
    expected: float
    half_width: float | None
    side: Side
    tail: float
    columns: tuple[str, ...] = COLUMNS

    @property
    def over(self) -> Range:
        """The range with its prior."""
        return Range(self.low, self.high, self.prior)

    @property
    def middle(self) -> float:
        """The value of the range nearest ½."""
        return nearest_half(self.low, self.high)


@dataclass(frozen=True)
class Scanned:
    """A method to be scanned, and whether its coverage is; `steady`: its limits are known not to turn back."""

    method: Method
    coverage: bool
    steady: bool


def asked(plan: Plan) -> Asked:
    """The plan's question."""
    outcome = plan.outcome
    d = plan.precision.half_width if plan.precision else None
    columns = COLUMNS if plan.precision else COVERAGE_COLUMNS
    return Asked(outcome.low, outcome.high, outcome.prior, outcome.expected, d, plan.side, plan.tail, columns)


def scanned(method: Method, coverage: bool) -> Scanned:
    """The method as the scan takes it; only what the catalogue vouches for counts as steady."""
    steady = CATALOGUE.get(method.name) == method and "monotone" not in method.exemptions
    return Scanned(method, coverage, steady)


class _Block:
    """The windows of one block of n, and what all methods share on them."""

    def __init__(self, question: Asked, n: Counts) -> None:
        self.question, self.n = question, n

    @cached_property
    def widths(self) -> Rows:
        """The events that the expected and the worst p can produce."""
        q = self.question
        worst_p = q.middle if "half_width" in q.columns else q.expected
        return rows(self.n, min(worst_p, q.expected), max(worst_p, q.expected))

    @cached_property
    def narrow(self) -> Rows:
        """The events whose intervals can meet the range, with those of `widths` when widths are asked for."""
        q = self.question
        z = max(float(-ndtri(q.tail)), 0.0)
        near = rows(self.n, q.low, q.high, min((z + NARROW) ** 2 / 2, WIDE))
        return joined(near, self.widths) if "half_width" in q.columns or "assurance" in q.columns else near

    @cached_property
    def full(self) -> Rows:
        """All events that the range can produce."""
        q = self.question
        return rows(self.n, min(q.low, q.expected), max(q.high, q.expected))

    @cached_property
    def prior(self) -> Prior:
        """For the mean over the range, on all its events."""
        return Prior.on(self.full, self.question.over)

    @cached_property
    def shared(self) -> dict[int, tuple[Chances, Prior | None]]:
        """By the identity of the rows; filled as needed."""
        return {}

    def on(self, where: Rows, prior: bool) -> tuple[Chances, Prior | None]:
        """The shared figures on these rows."""
        chances, found = self.shared.get(id(where), (Chances(where), None))
        if prior and found is None:
            found = self.prior.within(where)
        self.shared[id(where)] = chances, found
        return chances, found


def limits_on(where: Rows, method: Method, question: Asked) -> Limits:
    """The method's limits for all events of the rows."""
    return evaluate(method, {"events": where.events, "trials": where.trials}, question.side, question.tail)


def _covering(block: _Block, item: Scanned) -> tuple[Rows, Limits]:
    """Rows with every event that covers somewhere in the range, and the limits there.

    With limits that never turn back, events beyond one whose interval lies clear of the range lie clear of it too.
    """
    q = block.question
    if item.steady and q.side == "two-sided":
        where = block.narrow
        limits = limits_on(where, item.method, q)
        left_clear = (where.first == 0) | (limits.upper[where.start] < q.low)
        right_clear = (where.last == where.n) | (limits.lower[where.start + where.size - 1] > q.high)
        if left_clear.all() and right_clear.all():
            return where, limits
    return block.full, limits_on(block.full, item.method, q)


def measure(question: Asked, items: Sequence[Scanned], n: Counts) -> list[Table]:
    """For every method its figures at each n that it is computed for; arrays (n,), absent where not asked for."""
    block = _Block(question, n)
    tables = []
    for item in items:
        top = item.method.largest_n
        inside = n if top is None else n[n <= top]
        here = block if len(inside) == len(n) else _Block(question, inside)
        tables.append({"n": inside, **_figures(here, item)} if len(inside) else {})
    return tables


def _figures(block: _Block, item: Scanned) -> Table:
    """One method's figures."""
    q = block.question
    if item.coverage:
        where, limits = _covering(block, item)
    else:
        where, limits = block.widths, limits_on(block.widths, item.method, q)
    chances, prior = block.on(where, item.coverage and "mean_miss" in q.columns and q.low < q.high)
    table: Table = {}
    if item.coverage:
        table["worst_miss"], table["minimum_at"] = worst(where, limits.lower, limits.upper, q.low, q.high)
        table["mean_miss"] = prior.mean_miss(limits.lower, limits.upper) if prior else table["worst_miss"]
    if "half_width" in q.columns:
        table["half_width"] = _half_width(block, item.method, chances, limits)
    if "assurance" in q.columns and q.half_width is not None:
        table["assurance"] = assurance(chances, limits.lower, limits.upper, q.side, q.half_width, q.expected)
    return table


def _half_width(block: _Block, method: Method, chances: Chances, limits: Limits) -> Array:
    """Expected half-width at the worst p: the value nearest ½ where the slope says so, else sought over the range."""
    q, where = block.question, chances.rows
    values = half_widths(where, limits.lower, limits.upper, q.side)
    found = expected(chances, values, q.middle)
    rest = np.flatnonzero(~peaks_at(chances, values, q.middle, q.low, q.high))
    if len(rest):
        wide = rows(block.n[rest], q.low, q.high)
        again = limits_on(wide, method, q)
        found[rest] = largest_expected(wide, half_widths(wide, again.lower, again.upper, q.side), q.low, q.high)
    return found


def cost(question: Asked, n: Counts) -> Array:
    """How many events each n brings; (n,)."""
    q = question
    ends = (q.low, q.high) if "worst_miss" in q.columns else (q.middle, q.middle)
    return rows(n, min(*ends, q.expected), max(*ends, q.expected), WIDE / 2).size.astype(float)


def scan(
    question: Asked,
    items: Sequence[Scanned],
    n: Counts,
    workers: int = 1,
    progress: Progress | None = None,
) -> pd.DataFrame:
    """One row per method and n, in this order: n, method, worst_miss, minimum_at, mean_miss, half_width, assurance.

    What is not asked for is NaN; a method that is computed only up to some n has no rows beyond it.

    Raises:
        Interrupted: on Ctrl-C, with the n that were finished.
    """
    parts = list(blocks(n, cost(question, n), EVENTS))
    weights = [float(cost(question, part).sum()) for part in parts]
    try:
        found = run(measure, [(question, items, part) for part in parts], weights, workers, progress, "scanning n")
    except Interrupted as stop:
        done = int(parts[stop.finished - 1][-1]) if stop.finished else 0
        raise Interrupted(stop.finished, f"finished the scan up to n = {done} of {int(n[-1])}") from None
    frames = []
    for k, item in enumerate(items):
        tables = [pd.DataFrame({"method": item.method.name, **tables[k]}) for tables in found if tables[k]]
        frames += [table.reindex(columns=["n", "method", *COLUMNS]) for table in tables]
    return pd.concat(frames, ignore_index=True) if frames else pd.DataFrame(columns=["n", "method", *COLUMNS])
