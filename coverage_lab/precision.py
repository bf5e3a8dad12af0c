"""Whether the interval that an audit names is as narrow as the plan asks."""

import math
from collections.abc import Mapping
from dataclasses import replace
from typing import Any

import numpy as np

from coverage_lab.records import Plan, Precision, Verdict
from coverage_lab.rounding import percent, rounded
from coverage_lab.sizing.scan import asked, scan, scanned
from coverage_lab.sizing.search import targets_of
from coverage_lab.sizing.words import points

FIGURES = ("half_width", "assurance")


def with_precision(plan: Plan, verdict: Verdict) -> Verdict:
    """The verdict with what its method gives at its n of the plan's precision; a miss is said in its sentence.

    Unchanged without a target, without a method, and for designs whose widths cannot be sized.
    """
    if plan.precision is None or verdict.method is None or not _sized(plan):
        return verdict
    found = measured(plan, plan.precision, verdict.method, verdict.n)
    missed = "" if found["meets"] else f" {_missed(plan, plan.precision, found)}"
    return replace(verdict, precision=found, sentence=verdict.sentence + missed)


def _sized(plan: Plan) -> bool:
    """Whether the plan's samples are simple ones, seen as they are."""
    return plan.design.kind == "simple" and plan.design.columns == ("events", "trials") and len(_parts(plan)) == 1


def _parts(plan: Plan) -> tuple[object, ...]:
    """The parts of the smallest planned sample."""
    return plan.design.parts(min(plan.sizes)) or ()


def measured(plan: Plan, precision: Precision, method: str, n: int) -> Mapping[str, Any]:
    """half_width and assurance as asked; expected_half_width at the worst p; probability; meets.

    The half-width of a one-sided bound is its distance from the true proportion. probability: of a half-width as asked,
    at the expected p; None when no assurance is asked.
    """
    item = next(scanned(known, coverage=False) for known in plan.methods if known.name == method)
    table = scan(replace(asked(plan), columns=FIGURES), [item], np.array([n]))
    targets = targets_of(plan, coverage=False)
    return {
        "half_width": precision.half_width,
        "assurance": precision.assurance,
        "expected_half_width": float(table["half_width"].iloc[0]),
        "probability": None if precision.assurance is None else float(table["assurance"].iloc[0]),
        "meets": all(bool(targets.met(table, name).all()) for name in targets.names),
    }


def _missed(plan: Plan, precision: Precision, found: Mapping[str, Any]) -> str:
    """What is missed of the plan's precision, and by how much."""
    what = "half-width" if plan.side == "two-sided" else "distance from the true proportion"
    expected = points_up(found["expected_half_width"])
    said = f"This is less precise than the plan asks: its expected {what} at the worst proportion of the range is "
    said += f"{expected}, against {points(precision.half_width)}"
    if precision.assurance is not None:
        p, sure = percent(plan.outcome.expected), percent(precision.assurance)
        chance = percent(found["probability"], "down")
        said += f"; at {p} its {what} keeps within that with probability {chance}, against {sure}"
    return said + "."


def points_up(width: float) -> str:
    """A half-width in percentage points, three significant digits, never flattered: 0.020001 -> '2.01 points'."""
    places = max(0, 2 - math.floor(math.log10(100 * width))) if width > 0 else 0
    return f"{rounded(100 * width, places, 'up')} points"
