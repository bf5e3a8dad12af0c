"""Everything that is measured at one planned n: each method evaluated once on the union of all distinct samples."""

from collections.abc import Iterable, Iterator, Mapping, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from coverage_lab.engine import search
from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.exact import Listed, figures, minimum_of, possible
from coverage_lab.engine.means import Range
from coverage_lab.engine.measures import ERRORS, MEASURES, Stack, measure, stack
from coverage_lab.engine.search import grid_size
from coverage_lab.engine.tally import union
from coverage_lab.engine.work import Cell
from coverage_lab.records import Columns, Counts, Design, Method, Outcomes, Part, Plan, Route

CURVE_POINTS = 401
EVERYWHERE_UP_TO = 5000  # beyond this n the minimum over all of (0, 1) costs more than the rest of the audit
EVERYWHERE_WORK = 200_000  # parts times their samples: beyond, the same holds of a mixture
LARGEST_MIXTURE = 500_000  # parts times their samples: beyond, a mixture's minimum is searched
BLOCK_BYTES = 1 << 26

Table = dict[str, list[Any]]


@dataclass(frozen=True)
class Weighed:
    """Outcomes at one true proportion, and where their samples stand in the union."""

    p: float
    route: Route
    outcomes: Outcomes
    samples: Counts


@dataclass(frozen=True)
class Support:
    """All distinct samples of one n, and who uses which of them."""

    columns: Columns
    cells: list[Weighed]
    curve: list[Weighed]
    planned: list[tuple[Part, Counts, Counts]]  # part, its events, where they stand
    everywhere: list[tuple[Part, Counts, Counts]]

    @property
    def size(self) -> int:
        """How many distinct samples."""
        return max(len(values) for values in self.columns.values())


def curve_points(low: float, high: float, design: Design, n: int) -> list[float]:
    """Evenly spaced truths over the planned range and a quarter of its width on either side, settled.

    Fewer where every truth has a long list of samples.
    """
    margin = (high - low) / 4 or min(low, 1 - low) / 2
    ends = max(low - margin, 0.0), min(high + margin, 1.0)
    law = design.law(design.settle((low + high) / 2, n)[0], n)
    count = search.FEWEST if law is None else min(CURVE_POINTS, 2 * grid_size(len(law.weight)))
    return list(dict.fromkeys(design.settle(float(p), n)[0] for p in np.linspace(*ends, count)))


def support(plan: Plan, n: int, cells: Sequence[Cell], tallies: Mapping[Cell, Outcomes]) -> Support:
    """The samples of all cells, of the curve, of the planned range and, for moderate n, of the whole of (0, 1)."""
    low, high = plan.outcome.low, plan.outcome.high
    lawful: list[tuple[float, Route, Outcomes]] = []
    curve: list[tuple[float, Route, Outcomes]] = []
    parts: Sequence[Part] = ()
    if "enumerated" in plan.simulation.routes:
        lawful = [(c.p, "enumerated", law) for c in cells if (law := plan.design.law(c.p, n)) is not None]
        points = curve_points(low, high, plan.design, n)
        curve = [(p, "enumerated", law) for p in points if (law := plan.design.law(p, n)) is not None]
        parts = manageable(plan.design, n, low, high)
    drawn: list[tuple[float, Route, Outcomes]] = [(c.p, "simulated", tallies[c]) for c in cells if c in tallies]
    planned = [(part, possible(part, low, high)) for part in parts]
    whole = n <= EVERYWHERE_UP_TO and len(parts) * sum(part.trials for part in parts) <= EVERYWHERE_WORK
    everywhere = [(part, np.arange(part.trials + 1)) for part in parts if whole]
    lists = [outcomes.columns for _, _, outcomes in (*lawful, *drawn, *curve)]
    lists += [part.columns(events) for part, events in (*planned, *everywhere)]
    columns, places = union(lists)
    place = iter(places)
    return Support(
        columns,
        [Weighed(*item, next(place)) for item in (*lawful, *drawn)],
        [Weighed(*item, next(place)) for item in curve],
        [(*item, next(place)) for item in planned],
        [(*item, next(place)) for item in everywhere],
    )


def manageable(design: Design, n: int, low: float, high: float) -> tuple[Part, ...]:
    """The design's parts at n, unless their end points over the range are too many to be looked at; none then."""
    parts = design.parts(n) or ()
    samples = sum(len(possible(part, low, high)) for part in parts)
    return parts if len(parts) * samples <= LARGEST_MIXTURE else ()


def method_blocks(methods: Sequence[Method], samples: int) -> Iterator[Sequence[Method]]:
    """The methods in blocks whose limits take about 64 MB, so that memory stays flat however large n is."""
    step = max(1, BLOCK_BYTES // (64 * samples))
    for start in range(0, len(methods), step):
        yield methods[start : start + step]


def measure_block(plan: Plan, n: int, found: Support, methods: Sequence[Method]) -> tuple[Table, Table, Table]:
    """Rows of the method, cell and curve tables for some methods."""
    limits = stack([evaluate(method, found.columns, plan.side, plan.tail) for method in methods])
    names = [method.name for method in methods]
    cells = _cell_rows(n, names, found.cells, limits, plan)
    curve = _cell_rows(n, names, found.curve, limits, plan)
    exact = _method_rows(plan, n, methods, found, limits)
    rows = {**_simulated_summary(cells, names), **exact}
    return rows, cells, {key: curve[key] for key in ("n", "p", "method", "coverage", "mean_width") if key in curve}


def _cell_rows(n: int, names: list[str], weighed: Sequence[Weighed], limits: Stack, plan: Plan) -> Table:
    """One row per true proportion, route and method."""
    table: Table = {}
    for item in weighed:
        values = measure(item.outcomes, limits.at(item.samples), item.p, plan.side)
        k = len(names)
        keys: dict[str, Iterable[Any]] = {"n": [n] * k, "p": [item.p] * k, "method": names, "route": [item.route] * k}
        errors = {name: values.get(name, np.full(k, np.nan)) for name in ERRORS}
        draws = [item.outcomes.draws] * k
        columns: dict[str, Iterable[Any]] = {**keys, **values, **errors, "draws": draws}
        for column, cells in columns.items():
            table.setdefault(column, []).extend(cells)
    return table


def _method_rows(plan: Plan, n: int, methods: Sequence[Method], found: Support, limits: Stack) -> Table:
    """What is known exactly, or by a search, over the planned range and everywhere."""
    names = [method.name for method in methods]
    table: Table = {"n": [n] * len(names), "method": names}
    rows, kind = _over_range(plan, n, methods, found, limits)
    if rows:
        table |= {column: [row[column] for row in rows] for column in rows[0]}
        table["minimum_is"] = [kind] * len(names)
    if found.everywhere:
        parts = [Listed(part, events, limits.at(place)) for part, events, place in found.everywhere]
        least = [minimum_of(parts, k, 0.0, 1.0) for k in range(len(names))]
        table["everywhere_minimum_coverage"] = [item.coverage for item in least]
        table["everywhere_minimum_at"] = [item.at for item in least]
    return table


def _over_range(
    plan: Plan, n: int, methods: Sequence[Method], found: Support, limits: Stack
) -> tuple[Sequence[dict[str, float]], str]:
    """Every method's figures over the planned range and what they are; no rows where only simulation is left."""
    over = Range(plan.outcome.low, plan.outcome.high, plan.outcome.prior)
    if found.planned:
        parts = [Listed(part, events, limits.at(place)) for part, events, place in found.planned]
        return figures(parts, over, plan.side), "certified"
    if "enumerated" not in plan.simulation.routes:
        return (), ""
    searched = search.figures(plan.design, methods, n, over, plan.side, plan.tail)
    return (searched[0], "certified" if searched[1] else "searched") if searched else ((), "")


def _simulated_summary(cells: Table, names: list[str]) -> Table:
    """For every method the smallest and the mean simulated coverage over the grid, with the largest standard error.

    They stand in for the figures over the range as well, unless exact ones replace them.
    """
    drawn = np.array([route == "simulated" for route in cells.get("route", [])], dtype=bool)
    if not drawn.any():
        return {}
    k = len(names)
    coverage = np.asarray(cells["coverage"])[drawn].reshape(-1, k)
    p = np.asarray(cells["p"])[drawn].reshape(-1, k)
    error = np.asarray(cells["standard_error"])[drawn].reshape(-1, k)
    least = np.argmin(coverage, axis=0)
    columns = np.arange(k)
    means = {name: list(np.asarray(cells[name])[drawn].reshape(-1, k).mean(axis=0)) for name in MEASURES}
    lowest, average = coverage[least, columns], coverage.mean(axis=0)
    stands_in: Table = {
        "minimum_coverage": list(lowest),
        "minimum_at": list(p[least, columns]),
        "minimum_is": ["simulated"] * k,
        "worst_miss": list(1.0 - lowest),
        "mean_coverage": list(average),
        "mean_miss": list(1.0 - average),
    }
    return (
        stands_in
        | means
        | {
            "simulated_coverage_min": list(lowest),
            "simulated_coverage_min_at": list(p[least, columns]),
            "simulated_coverage_mean": list(average),
            "simulated_replicates": [cells["draws"][-1]] * k,
            "simulated_standard_error": list(error.max(axis=0)),
        }
    )
