"""The committed demonstration report is what this program computes."""

import json
import math
from pathlib import Path

import numpy as np
import pytest

import coverage_lab as cl
from coverage_lab.plan import DEMONSTRATION
from coverage_lab.report.folder import audit_document

COMMITTED = json.loads((Path(__file__).parents[1] / "reports/demonstration/audit.json").read_text(encoding="utf-8"))


@pytest.fixture(scope="module")
def rebuilt() -> dict:
    document = audit_document(cl.audit(cl.read_plan(DEMONSTRATION)))
    return json.loads(json.dumps(document, allow_nan=False))


def differences(old: object, new: object, simulated: float, path: str = "") -> list[str]:
    """Where two documents differ: numbers beyond 1e-12, simulated ones beyond their allowance."""
    if isinstance(old, dict) and isinstance(new, dict):
        if old.keys() != new.keys():
            return [f"{path}: other keys"]
        return [d for key in old for d in differences(old[key], new[key], simulated, f"{path}.{key}")]
    if isinstance(old, list) and isinstance(new, list):
        if len(old) != len(new):
            return [f"{path}: other length"]
        return [
            d
            for k, (a, b) in enumerate(zip(old, new, strict=True))
            for d in differences(a, b, simulated, f"{path}[{k}]")
        ]
    if isinstance(old, float) and isinstance(new, int | float):
        allowed = simulated if ".simulated." in path or ".cross_check." in path else 1e-12
        return [] if math.isclose(old, new, rel_tol=allowed, abs_tol=allowed) else [f"{path}: {old!r}, now {new!r}"]
    return [] if old == new else [f"{path}: {old!r}, now {new!r}"]


def test_the_report_is_rebuilt_digit_for_digit(rebuilt: dict) -> None:
    """Simulated counts exactly under the recorded NumPy, else within 5 standard errors; all else to 1e-12."""
    same_draws = COMMITTED["provenance"]["libraries"]["numpy"] == np.__version__
    error = 5 * max(row["simulated"]["standard_error"] for row in COMMITTED["methods"] if row["applies"])
    old, new = ({k: v for k, v in d.items() if k != "provenance"} for d in (COMMITTED, rebuilt))
    if not same_draws:
        old, new = ({k: v for k, v in d.items() if k != "cross_check"} for d in (old, new))
    assert differences(old, new, 1e-12 if same_draws else error) == []
    assert COMMITTED["provenance"]["plan_sha256"] == rebuilt["provenance"]["plan_sha256"]


def test_a_changed_number_would_be_seen(rebuilt: dict) -> None:
    changed = json.loads(json.dumps(rebuilt))
    changed["methods"][0]["minimum_coverage"] += 1e-9
    assert differences(rebuilt, changed, 1e-12) == [
        f".methods[0].minimum_coverage: {rebuilt['methods'][0]['minimum_coverage']!r}, "
        f"now {changed['methods'][0]['minimum_coverage']!r}"
    ]


def test_the_routes_agree(rebuilt: dict) -> None:
    assert rebuilt["cross_check"]["p_value"] > 0.001
    assert rebuilt["cross_check"]["chi_square_p"] > 0.001
