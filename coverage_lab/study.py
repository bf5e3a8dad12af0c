"""The straight line: a plan is measured, judged, and written down."""

import datetime
import importlib.metadata
import platform
from collections.abc import Callable, Mapping
from dataclasses import replace
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd

from coverage_lab import reach, report, verdict
from coverage_lab.cautions import cautions
from coverage_lab.checks import InputFault, expected, unknown
from coverage_lab.designs import Layered, Loss, Simple
from coverage_lab.engine.audit import measure, saw
from coverage_lab.engine.bounds import evaluate, inapplicable
from coverage_lab.engine.exact import listed, minimum_of, possible
from coverage_lab.engine.work import Progress
from coverage_lab.intervals import EVERY
from coverage_lab.plan import audit_faults, own_methods
from coverage_lab.plan_text import plan_digest
from coverage_lab.precision import with_precision
from coverage_lab.records import SIDES, Audit, Bounds, Interval, Method, Minimum, Part, Plan, Side, Verdict, tail_of
from coverage_lab.records_sizing import Inflation, Sizing
from coverage_lab.report import write as write_folder
from coverage_lab.report.notebook import audit_html, verdict_html
from coverage_lab.sizing import size

WHOLE_TABLE_UP_TO = 100_000
TABLE_FLOOR = 1e-12  # above that n only outcomes with a probability over this somewhere in the range are listed
LIBRARIES = ("numpy", "scipy", "pandas", "matplotlib")


class Decided(Verdict):
    """A verdict that notebooks can show."""

    def _repr_html_(self) -> str:
        return verdict_html(self)


class Audited(Audit):
    """A finished audit that notebooks can show."""

    def _repr_html_(self) -> str:
        return audit_html(self)


def audit(
    plan: Plan,
    *,
    workers: int = 1,
    extra: Mapping[str, Callable[..., Bounds]] | None = None,
    progress: Progress | None = None,
    keep: Path | None = None,
) -> Audit:
    """Measure every method of the plan at every n, judge them, and recommend.

    Args:
        plan: from `read_plan` or `make_plan`.
        workers: processes for the simulation; used only when the work is worth them, and never changes a digit.
        extra: methods of your own, name -> function (events, trials, tail) -> (lower, upper), audited like any other.
        progress: called with what is being done and the share that is done.
        keep: a file for finished work, read when an interrupted audit is run again.

    Raises:
        InputFault: the plan states no range and no expected proportion, or no n, or asks for what only `sample_size`
            can answer; or a method of your own failed or returned another shape, a NaN, or lower > upper.
    """
    if faults := audit_faults(plan):
        raise InputFault(*faults)
    plan = _with_own(plan, extra)
    measured = measure(plan, workers, progress, keep)
    methods = verdict.judged(measured)
    judged = (with_precision(plan, verdict.decide(measured, methods, n)) for n in plan.sizes)
    by_n = tuple(Decided(**vars(item)) for item in judged)
    decided = verdict.overall(by_n)
    return Audited(
        plan=plan,
        methods=methods,
        cells=measured.cells,
        curve=measured.curve,
        table=interval_table(plan, decided),
        steady=saw(plan),
        verdict=decided,
        by_n=by_n,
        cross_check=measured.cross_check,
        cautions=cautions(measured, methods, decided),
        provenance=provenance(plan),
    )


def sample_size(
    plan: Plan,
    *,
    workers: int = 1,
    extra: Mapping[str, Callable[..., Bounds]] | None = None,
    progress: Progress | None = None,
) -> Sizing:
    """Choose n, and the method with it, for the plan's targets: precision, coverage, rare outcomes, a claim.

    The standard is a target when the plan sets [precision], or no other target. What the sample has to make up for is
    in [design]: population, design_effect, cluster_size, loss.

    Args:
        plan: from `read_plan` or `make_plan`; it needs no n.
        workers: processes for the scan; used only when the work is worth them, and never changes a digit.
        extra: methods of your own, name -> function (events, trials, tail) -> (lower, upper), sized like any other.
        progress: called with what is being done and the share that is done.

    Returns:
        The record behind `sample-size --json`; `.document()` is that dictionary. Every n counts evaluable units; units
        (`.verdict.units`, `.inflated`) are those to be recruited. Proportions, probabilities, coverages and half-widths
        are shares between 0 and 1: a half-width of 0.02 is 2 percentage points. `.methods`, `.scan`, `.rare` and
        `.characteristic` are pandas DataFrames.

    Raises:
        InputFault: targets that cannot be answered, one line each.
        KeyboardInterrupt: on Ctrl-C, with what was finished.
    """
    plan = _as_sized(plan)
    return size(_with_own(plan, extra), _made_up_for(plan), workers=workers, progress=progress)


def _with_own(plan: Plan, extra: Mapping[str, Callable[..., Bounds]] | None) -> Plan:
    """The plan with methods of the user's own, measured like any other; those that it has already are not added."""
    known = {method.name for method in plan.methods}
    added = tuple(method for method in own_methods(extra or {}) if method.name not in known)
    return replace(plan, methods=(*plan.methods, *added))


def _as_sized(plan: Plan) -> Plan:
    """The plan with the frame of its design: n counts evaluable units, and the ladder makes up for what is lost.

    Raises:
        InputFault: a test that errs, or losses that the ladder does not know.
    """
    design = plan.design
    if not isinstance(design, Layered):
        return plan
    alike = all(
        isinstance(layer, Loss) and layer.rate_events == layer.rate_others and layer.treat_as == "excluded"
        for layer in design.layers
    )
    if not alike:
        what = "no test that errs, and losses with one rate that are excluded: no other design is sized so far"
        raise InputFault(f"[design]: expected {what}")
    return replace(plan, design=design.frame)


def _made_up_for(plan: Plan) -> Inflation:
    """What the plan's design says that the sample has to make up for."""
    design = plan.document["design"]
    loss = design.get("loss", {}).get("rate", 0.0)
    clusters = design.get("cluster_size")
    clusters = None if isinstance(clusters, list) else clusters
    return Inflation(design.get("design_effect", 1.0), design.get("population"), loss, clusters)


def interval_table(plan: Plan, decided: Verdict) -> pd.DataFrame:
    """The recommended interval for every possible events count; empty without a recommendation.

    Above n = 100 000 only counts with a probability over 1e-12 somewhere in the planned range.
    """
    columns = ["events", "lower", "upper"]
    if decided.method is None:
        return pd.DataFrame(columns=columns)
    method, n = reach.method_of(plan, decided.method), decided.n
    if method.needs != ("events", "trials"):
        return pd.DataFrame(columns=columns)
    events = np.arange(n + 1)
    if n > WHOLE_TABLE_UP_TO:
        events = possible(Part(n, 1.0), plan.outcome.low, plan.outcome.high, TABLE_FLOOR)
    limits = evaluate(method, {"events": events, "trials": np.array([n])}, plan.side, plan.tail)
    return pd.DataFrame({"events": events, "lower": limits.lower, "upper": limits.upper})


def provenance(plan: Plan) -> dict[str, Any]:
    """What it takes to compute the same again."""
    versions = {name: importlib.metadata.version(name) for name in LIBRARIES}
    return {
        "version": importlib.metadata.version("coverage-lab"),
        "seed": plan.simulation.seed,
        "plan_sha256": plan_digest(plan.document),
        "libraries": {"python": platform.python_version(), **versions},
        "created": datetime.datetime.now(datetime.UTC).isoformat(timespec="seconds"),
    }


def write_report(
    audit: Audit, folder: str | Path, *, overwrite: bool = False, progress: Progress | None = None
) -> Path:
    """Write the report folder and return the path of its page.

    progress: called with what is being done and the share that is done.

    Raises:
        InputFault: the folder holds another plan's report, or files that are no report, and `overwrite` is not set.
        OSError: the folder cannot be written; nothing half-written is left.
    """
    return write_folder(audit, Path(folder), overwrite=overwrite, progress=progress)


def write_sizing(
    sizing: Sizing, folder: str | Path, *, overwrite: bool = False, progress: Progress | None = None
) -> Path:
    """Write the report folder of a sample size and return the path of its page.

    progress: called with what is being done and the share that is done.

    Raises:
        InputFault: the folder holds another plan's report, or files that are no report, and `overwrite` is not set.
        OSError: the folder cannot be written; nothing half-written is left.
    """
    made = provenance(sizing.plan)
    del made["seed"]  # nothing is drawn
    return report.write_sizing(sizing, Path(folder), overwrite=overwrite, provenance=made, progress=progress)


def interval(
    events: int, trials: int, method: str = "wilson", confidence: float = 0.95, side: Side = "two-sided"
) -> Interval:
    """The interval for data in hand: `events` in `trials`, by one method, truncated to [0, 1].

    Raises:
        InputFault: unusable counts, confidence or side, or a method that does not apply.
    """
    faults = _question_faults(method, confidence, side)
    if not (_whole(events) and _whole(trials) and 0 <= events <= trials and trials >= 1):
        faults.append(expected("0 <= events <= trials, whole numbers, trials >= 1", (events, trials), "events, trials"))
    if faults:
        raise InputFault(*faults)
    chosen = _applicable(method, int(trials), side)
    columns = {"events": np.array([int(events)]), "trials": np.array([int(trials)])}
    limits = evaluate(chosen, columns, side, tail_of(confidence, side))
    return Interval(*(float(x[0]) for x in (limits.lower, limits.upper, limits.raw_lower, limits.raw_upper)))


def minimum_coverage(
    method: str,
    n: int,
    between: tuple[float, float] = (0.0, 1.0),
    confidence: float = 0.95,
    side: Side = "two-sided",
) -> Minimum:
    """The certified infimum of a method's coverage for X ~ Binomial(n, p) with p in `between`, and where it lies.

    Raises:
        InputFault: an unknown method, or one that does not apply; an unusable n, range, confidence or side.
    """
    faults = _question_faults(method, confidence, side)
    if not (_whole(n) and n >= 1):
        faults.append(expected("a whole number of at least 1", n, "n"))
    if not _range(between):
        faults.append(expected("0 <= low <= high <= 1", between, "between"))
    if faults:
        raise InputFault(*faults)
    chosen = _applicable(method, int(n), side)
    low, high = (float(end) for end in between)
    parts = listed(Simple(), [chosen], int(n), (low, high), side, tail_of(confidence, side))
    return minimum_of(parts, 0, low, high)


def _question_faults(method: str, confidence: float, side: str) -> list[str]:
    """Faults that every quick question can have."""
    faults = []
    if method not in EVERY:
        faults.append(unknown("method", str(method), EVERY))
    if not 0 < confidence < 1:
        faults.append(expected("a number strictly between 0 and 1", confidence, "confidence"))
    if side not in SIDES:
        faults.append(unknown("side", str(side), SIDES))
    return faults


def _applicable(name: str, n: int, side: Side) -> Method:
    """The catalogue's method, or a fault with the reason why it cannot answer."""
    method = EVERY[name]
    reason = inapplicable(method, ("events", "trials"), n, side)
    if reason is not None:
        raise InputFault(f"method {name!r} does not apply: {reason}")
    return method


def _range(ends: object) -> bool:
    """Whether these are two numbers with 0 <= low <= high <= 1."""
    try:
        low, high = np.asarray(ends, dtype=float)
    except (TypeError, ValueError):
        return False
    return bool(0 <= low <= high <= 1)


def _whole(value: object) -> bool:
    """Whether the value is a whole number, of whatever type."""
    return isinstance(value, int | float | np.integer | np.floating) and float(value).is_integer()
