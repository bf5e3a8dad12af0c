"""An audit as the plain document that is saved as audit.json."""

import dataclasses
import math
from collections.abc import Mapping
from typing import Any

import numpy as np

from coverage_lab.records import Audit

FORMAT = "coverage-lab/audit/1"

SIMULATED = {
    "coverage_min": "simulated_coverage_min",
    "coverage_min_at": "simulated_coverage_min_at",
    "coverage_mean": "simulated_coverage_mean",
    "replicates": "simulated_replicates",
    "standard_error": "simulated_standard_error",
}
EVERYWHERE = {"minimum_coverage": "everywhere_minimum_coverage", "minimum_at": "everywhere_minimum_at"}
COUNTS = ("replicates",)


def audit_document(audit: Audit) -> dict[str, Any]:
    """The exact content of audit.json: plain Python types, a figure that is missing or not finite is None."""
    plan = audit.plan
    return {
        "format": FORMAT,
        "plan": plain(plan.document),
        "confidence": plan.confidence,
        "side": plan.side,
        "alpha": plan.alpha,
        "standard": plain(dataclasses.asdict(plan.standard)),
        "methods": [method_entry(row) for row in audit.methods.to_dict("records")],
        "verdict": plain(_fields(audit.verdict)),
        "by_n": [plain(_fields(verdict)) for verdict in audit.by_n],
        "cross_check": None if audit.cross_check is None else plain(_fields(audit.cross_check)),
        "cautions": list(audit.cautions),
        "provenance": plain(audit.provenance),
    }


def method_entry(row: Mapping[Any, Any]) -> dict[str, Any]:
    """One row of the method table, with the simulated and the everywhere figures as objects of their own."""
    nested = {*SIMULATED.values(), *EVERYWHERE.values()}
    entry = {str(name): plain(value) for name, value in row.items() if name not in nested}
    judged = {name: entry.pop(name) for name in ("passes", "why") if name in entry}
    entry["simulated"] = {name: plain(row.get(column)) for name, column in SIMULATED.items()}
    entry["everywhere"] = {name: plain(row.get(column)) for name, column in EVERYWHERE.items()}
    for name in COUNTS:
        count = entry["simulated"][name]
        entry["simulated"][name] = None if count is None else int(count)
    return {**entry, **judged}


def _fields(record: Any) -> dict[str, Any]:
    """The fields of a record, one level deep: what they hold may be a mapping that cannot be copied."""
    return {field.name: getattr(record, field.name) for field in dataclasses.fields(record)}


def plain(value: Any) -> Any:
    """The value in types that JSON knows: NumPy scalars unwrapped, tuples as lists, NaN and infinities as None."""
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, Mapping):
        return {str(key): plain(item) for key, item in value.items()}
    if isinstance(value, list | tuple | np.ndarray):
        return [plain(item) for item in value]
    if isinstance(value, float):
        return value if math.isfinite(value) else None
    if value is None or isinstance(value, bool | int | str):
        return value
    if type(value).__name__ in ("NAType", "NaTType"):  # pandas' own ways to say "missing"
        return None
    raise TypeError(f"cannot be saved as JSON: {value!r}")
