"""An audit as the plain document that is saved as audit.json."""

from __future__ import annotations

import dataclasses
import math
from collections.abc import Mapping
from typing import TYPE_CHECKING, Any

import numpy as np

from coverage_lab.records import Audit

if TYPE_CHECKING:
    from _typeshed import DataclassInstance

FORMAT = "coverage-lab/audit/1"

SIMULATED = {
    "coverage_min": "simulated_coverage_min",
    "coverage_min_at": "simulated_coverage_min_at",
    "coverage_mean": "simulated_coverage_mean",
    "replicates": "simulated_replicates",
    "standard_error": "simulated_standard_error",
}
EVERYWHERE = {"minimum_coverage": "everywhere_minimum_coverage", "minimum_at": "everywhere_minimum_at"}
LAST = ("passes", "why")


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
    apart = {*SIMULATED.values(), *EVERYWHERE.values(), *LAST}
    simulated = {name: plain(row.get(column)) for name, column in SIMULATED.items()}
    replicates = simulated["replicates"]  # a float where other methods have none
    simulated["replicates"] = int(replicates) if isinstance(replicates, int | float) else None
    return {
        **{str(name): plain(value) for name, value in row.items() if name not in apart},
        "simulated": simulated,
        "everywhere": {name: plain(row.get(column)) for name, column in EVERYWHERE.items()},
        **{name: plain(row.get(name)) for name in LAST},
    }


def _fields(record: DataclassInstance) -> dict[str, Any]:
    """The fields of a record, one level deep: what they hold may be a mapping that cannot be copied."""
    return {field.name: getattr(record, field.name) for field in dataclasses.fields(record)}


def plain(value: object) -> object:
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
