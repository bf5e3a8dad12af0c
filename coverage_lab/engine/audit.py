"""The order of a measurement: list cells, draw, measure every n, look at the neighbours of n, compare the routes."""

from collections.abc import Mapping, Sequence, Set
from dataclasses import replace
from pathlib import Path

import pandas as pd

from coverage_lab.engine import size, work
from coverage_lab.engine.bounds import inapplicable
from coverage_lab.engine.cross import cross_check, goodness_of_fit
from coverage_lab.engine.exact import figures, listed
from coverage_lab.engine.means import Range
from coverage_lab.engine.measures import MEASURES
from coverage_lab.engine.size import Support, Table
from coverage_lab.engine.tally import restricted
from coverage_lab.records import Design, Measurements, Method, Outcomes, Plan

NEIGHBOURS = 3  # the number evaluated is never exactly the number planned
ALL_STEADY_UP_TO = 500  # beyond this n only the preferred methods are looked at beside n itself
PLAIN = "wald"  # the formula that everybody knows
WIDE = 25  # how far on either side of n the worst coverage is shown, but never further than a third of n …
WIDE_UP_TO = 2000  # … up to this n; beyond it `NEIGHBOURS`, since every n costs more

WORDS = ("label", "family", "source", "formula", "ends", "faults")
WHOLE = {"simulated_replicates": "Int64"}
FIGURES = (
    *("minimum_coverage", "minimum_at", "minimum_is", "worst_miss", "mean_coverage", "mean_miss", *MEASURES),
    *("simulated_coverage_min", "simulated_coverage_min_at", "simulated_coverage_mean"),
    *("simulated_replicates", "simulated_standard_error"),
    *("everywhere_minimum_coverage", "everywhere_minimum_at"),
)


def measure(
    plan: Plan, workers: int = 1, progress: work.Progress | None = None, keep: Path | None = None
) -> Measurements:
    """Measure every method of the plan that applies, at every n, by the plan's routes."""
    listed_cells = work.cells(plan)
    tallies: Mapping[work.Cell, Outcomes] = {}
    if "simulated" in plan.simulation.routes:
        tallies = work.simulate(plan, listed_cells, workers, progress, keep)
    tables: tuple[list[Table], list[Table], list[Table]] = ([], [], [])
    fits: list[tuple[float, int]] = []
    for k, n in enumerate(plan.sizes):
        cells = [cell for cell in listed_cells if cell.n == n]
        of_view: dict[int, list[tuple[float, int]]] = {}
        for seen, methods in views(plan, applying(plan, n)):
            found = size.support(seen, n, cells, projected(tallies, seen.design.columns))
            for block in size.method_blocks(methods, found.size):
                for table, rows in zip(tables, size.measure_block(seen, n, found, block), strict=True):
                    table.append(rows)
            of_view[len(seen.design.columns)] = _fits(found)
        fits += next((found for _, found in sorted(of_view.items(), reverse=True) if found), [])
        if progress is not None:
            progress("measuring", (k + 1) / len(plan.sizes))
    cells_frame, curve = _frame(tables[1]), _frame(tables[2])
    check = cross_check(cells_frame, fits) if len(plan.simulation.routes) > 1 else None
    return Measurements(plan, _described(plan, tables[0]), cells_frame, curve, steady(plan), check)


def applying(plan: Plan, n: int) -> list[Method]:
    """The plan's methods that can answer for its design, its side and this n."""
    return [m for m in plan.methods if inapplicable(m, plan.design.columns, n, plan.side) is None]


def views(plan: Plan, methods: Sequence[Method]) -> list[tuple[Plan, list[Method]]]:
    """The plan with its design as each group of methods needs to see it: fewer columns may be known more exactly."""
    groups: dict[Design, list[Method]] = {}
    for method in methods:
        groups.setdefault(plan.design.view(frozenset(method.needs)), []).append(method)
    return [(replace(plan, design=design), group) for design, group in groups.items()]


def projected(tallies: Mapping[work.Cell, Outcomes], columns: Sequence[str]) -> dict[work.Cell, Outcomes]:
    """The same draws, told apart by these columns only."""
    return {cell: restricted(outcomes, columns) for cell, outcomes in tallies.items()}


def steady(plan: Plan) -> pd.DataFrame:
    """What the standard is judged by at n-3 … n+3, for every planned n: exact, or no rows.

    The preferred methods always; all others too while that is quick.
    """
    rows: list[dict[str, object]] = []
    for planned in plan.sizes:
        names = {m.name for m in (plan.methods if planned <= ALL_STEADY_UP_TO else plan.prefer)}
        rows += _beside(plan, planned, NEIGHBOURS, names)
    return pd.DataFrame(rows, columns=["planned", "n", "method", "worst_miss", "mean_miss", "mean_width"])


def saw(plan: Plan) -> pd.DataFrame:
    """How worst and mean miss move with n around every planned n, for the preferred methods and plus-or-minus."""
    names = {PLAIN, *(method.name for method in plan.prefer)}
    rows: list[dict[str, object]] = []
    for planned in plan.sizes:
        reach = min(WIDE, planned // 3) if planned <= WIDE_UP_TO else 0
        rows += _beside(plan, planned, max(reach, NEIGHBOURS), names)
    return pd.DataFrame(rows, columns=["planned", "n", "method", "worst_miss", "mean_miss"])


def _beside(plan: Plan, planned: int, reach: int, names: Set[str]) -> list[dict[str, object]]:
    """Exact figures of the named methods at every n within `reach` of the planned one; none without enumeration."""
    if "enumerated" not in plan.simulation.routes:
        return []
    over = Range(plan.outcome.low, plan.outcome.high, plan.outcome.prior)
    rows: list[dict[str, object]] = []
    for n in range(max(1, planned - reach), planned + reach + 1):
        if n != planned and plan.design.faults(n):
            continue
        for seen, group in views(plan, applying(plan, n)):
            parts = size.manageable(seen.design, n, over.low, over.high)
            quick = len(parts) == 1  # a mixture takes its time: only who may be named, and only nearby
            if not parts or not (quick or abs(n - planned) <= NEIGHBOURS):
                continue
            methods = [m for m in group if m.name in names and (quick or m in plan.prefer)]
            exact = listed(seen.design, methods, n, (over.low, over.high), plan.side, plan.tail) if methods else []
            found = figures(exact, over, plan.side) if methods else []
            rows += [
                {"planned": planned, "n": n, "method": m.name, **row} for m, row in zip(methods, found, strict=True)
            ]
    return rows


def _fits(found: Support) -> list[tuple[float, int]]:
    """Goodness of fit of every cell that was both enumerated and drawn."""
    laws = {item.p: item for item in found.cells if item.route == "enumerated"}
    return [
        goodness_of_fit(laws[item.p].outcomes, item.outcomes, (laws[item.p].samples, item.samples))
        for item in found.cells
        if item.route == "simulated" and item.p in laws
    ]


def _frame(tables: list[Table]) -> pd.DataFrame:
    """Blocks of rows as one frame; draws are whole numbers, absent on the enumerated route."""
    if not any(tables):
        return pd.DataFrame()
    frame = pd.concat([pd.DataFrame(table) for table in tables if table], ignore_index=True)
    return frame.astype({"draws": "Int64"}) if "draws" in frame else frame


def _described(plan: Plan, tables: list[Table]) -> pd.DataFrame:
    """One row per n and method, in the plan's order: what the method is, whether it applies, its figures."""
    measured = {
        (n, name): {column: values[k] for column, values in table.items()}
        for table in tables
        for k, (n, name) in enumerate(zip(table["n"], table["method"], strict=True))
    }
    rows = []
    for n in plan.sizes:
        for method in plan.methods:
            words = {name: getattr(method, name) for name in WORDS}
            reason = inapplicable(method, plan.design.columns, n, plan.side)
            row = {"n": n, "method": method.name, **words, "applies": reason is None, "reason": reason}
            rows.append(row | measured.get((n, method.name), {}))
    return pd.DataFrame(rows, columns=["n", "method", *WORDS, "applies", "reason", *FIGURES]).astype(WHOLE)
