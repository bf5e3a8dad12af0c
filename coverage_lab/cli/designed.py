"""Columns of data in hand that tell of its design: clusters, strata, a population, a test that errs."""

import math
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import Any

from coverage_lab.checks import InputFault, expected
from coverage_lab.plan import of_option

WEIGHTS_SUM_WITHIN = 1e-9

Row = Mapping[str, str]  # a row of the file by its headings; events and trials are known to be counts


def columns_of_rows(path: Path, rows: Sequence[Row]) -> dict[str, Any]:
    """What methods for clusters or strata need, from the rows of a file; nothing for a simple sample.

    Raises:
        InputFault: clusters and strata at once, one cluster, weights that are none or do not sum to 1.
    """
    headings = set(rows[0]) if rows else set()
    if {"cluster", "stratum"} <= headings:
        raise InputFault(
            f"{path}:1: expected a column cluster or a column stratum, not both: no method here takes both"
        )
    if ("stratum" in headings) != ("weight" in headings):
        raise InputFault(f"{path}:1: expected the columns stratum and weight together")
    if "cluster" in headings:
        return _of_clusters(path, rows)
    return _of_strata(path, rows) if "stratum" in headings else {}


def _grouped(rows: Sequence[Row], key: str) -> dict[str, tuple[int, int]]:
    """Events and trials of every group, in the order of the file."""
    found: dict[str, tuple[int, int]] = {}
    for row in rows:
        x, n = found.get(row[key], (0, 0))
        found[row[key]] = x + int(row["events"]), n + int(row["trials"])
    return found


def _of_clusters(path: Path, rows: Sequence[Row]) -> dict[str, Any]:
    """Sums over the clusters; one of which nothing is recorded is none."""
    import numpy as np

    groups = [(x, n) for x, n in _grouped(rows, "cluster").values() if n]
    if len(groups) < 2:
        raise InputFault(f"{path}: {expected('at least 2 clusters with trials', len(groups), 'clusters')}")
    sums = {
        "clusters": len(groups),
        "events_squared": sum(x * x for x, _ in groups),
        "events_by_size": sum(x * n for x, n in groups),
        "sizes_squared": sum(n * n for _, n in groups),
    }
    return {name: np.array([value]) for name, value in sums.items()}


def _of_strata(path: Path, rows: Sequence[Row]) -> dict[str, Any]:
    """Counts by stratum, with the weights."""
    import numpy as np

    groups = _grouped(rows, "stratum")
    weights = {
        row["stratum"]: {other["weight"] for other in rows if other["stratum"] == row["stratum"]} for row in rows
    }
    split = [name for name, said in weights.items() if len(said) > 1]
    if split:
        raise InputFault(f"{path}: expected one weight for stratum {split[0]!r}, came {len(weights[split[0]])}")
    values = [_weight(path, name, next(iter(said))) for name, said in weights.items()]
    if abs(math.fsum(values) - 1) > WEIGHTS_SUM_WITHIN:
        raise InputFault(f"{path}: {expected('1', math.fsum(values), 'the sum of the weights')}")
    events, trials = zip(*groups.values(), strict=True)
    rows_of = {"stratum_events": events, "stratum_trials": trials, "stratum_weights": values}
    return {name: np.array([value]) for name, value in rows_of.items()}


def _weight(path: Path, name: str, text: str) -> float:
    """A stratum's share of the population."""
    try:
        value = float(text)
    except ValueError:
        value = math.nan
    if not 0 < value <= 1:
        raise InputFault(f"{path}: {expected('a number above 0 and at most 1', text, f'weight of stratum {name}')}")
    return value


def columns_of_options(population: object, sensitivity: str | None, specificity: str | None) -> dict[str, Any]:
    """What --population, --sensitivity and --specificity add.

    Raises:
        InputFault: no numbers, or one of sensitivity and specificity without the other.
    """
    import numpy as np

    found: dict[str, Any] = {}
    if population is not None:
        if not (isinstance(population, int) and population >= 1):
            raise InputFault(of_option("--population", population, "a whole number of at least 1"))
        found["population"] = population
    if sensitivity is not None or specificity is not None:
        found |= _of_test(sensitivity, specificity)
    return {name: np.array([value]) for name, value in found.items()}


def _of_test(sensitivity: str | None, specificity: str | None) -> dict[str, Any]:
    """Chances known, or estimated from counts."""
    if sensitivity is None or specificity is None:
        raise InputFault("expected --sensitivity and --specificity together")
    chances = _chance("--sensitivity", sensitivity), _chance("--specificity", specificity)
    (se, of_events), (sp, of_others) = chances
    if (of_events is None) != (of_others is None):
        raise InputFault("expected --sensitivity and --specificity both as numbers, or both as COUNT/TESTED")
    if se + sp <= 1:
        raise InputFault(
            f"--sensitivity + --specificity = {se + sp:g}: expected more than 1: such a test tells nothing"
        )
    found: dict[str, Any] = {"sensitivity": se, "specificity": sp}
    if of_events is not None and of_others is not None:
        found |= dict(zip(("diseased_positive", "diseased_tested"), of_events, strict=True))
        found |= dict(zip(("healthy_negative", "healthy_tested"), of_others, strict=True))
    return found


def _chance(option: str, text: str) -> tuple[float, tuple[int, int] | None]:
    """A number, or COUNT/TESTED with its counts."""
    what = "a number from 0 to 1, or COUNT/TESTED, two whole numbers with 0 <= COUNT <= TESTED, TESTED >= 1"
    count, slash, tested = text.partition("/")
    try:
        pair = (int(count), int(tested)) if slash else None
        value = float(text) if pair is None else pair[0] / pair[1]
    except (ValueError, ZeroDivisionError):
        raise InputFault(of_option(option, text, what)) from None
    if not 0 <= value <= 1 or (pair is not None and pair[1] < 1):
        raise InputFault(of_option(option, text, what))
    return value, pair
