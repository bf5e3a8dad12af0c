"""Small answers to "how many?", made by the real search."""

from collections.abc import Mapping
from functools import cache
from typing import Any

from coverage_lab import study
from coverage_lab.plan import make_plan
from coverage_lab.records import Plan
from coverage_lab.records_sizing import Sizing

METHODS = ["wilson", "clopper-pearson", "jeffreys", "wald"]
RARE = {"limit": 0.05, "events": [0, 1, 2], "hoped_for": 0.005}
DECISION = {"goal": 0.9, "believed": 0.97, "alpha": 0.025, "power": 0.8}

PLANS: Mapping[str, Mapping[str, Any]] = {
    "precision": {
        "title": "Weld test",
        "outcome": {"name": "crack found", "expected": 0.2, "range": [0.1, 0.3]},
        "precision": {"half_width": 0.09, "assurance": 0.8},
        "sample": {"horizon": 300},
        "design": {"population": 2000, "loss": {"rate": 0.05}},
    },
    "rare": {"rare": RARE},
    "seen": {"rare": {"see_at_least": 3, "at_rate": 0.02}, "design": {"population": 500}},
    "decision": {"decision": DECISION},
    "all": {
        "study": {"population": "welds of one line", "unit": "one weld", "range_basis": "pilot"},
        "outcome": {"expected": 0.03, "range": [0.02, 0.1]},
        "precision": {"half_width": 0.05},
        "rare": {**RARE, "see_at_least": 1, "at_rate": 0.01},
        "decision": {"goal": 0.15, "believed": 0.03},
        "sample": {"horizon": 300},
        "design": {"design_effect": 1.5, "cluster_size": 10},
    },
    "none": {
        "outcome": {"range": [0.1, 0.3]},
        "precision": {"half_width": 0.02},
        "sample": {"horizon": 120},
    },
    "coverage": {"side": "upper", "outcome": {"range": [0.1, 0.3]}, "sample": {"horizon": 60}},
    "upper": {
        "side": "upper",
        "outcome": {"range": [0.1, 0.3]},
        "precision": {"half_width": 0.1, "assurance": 0.8},
        "sample": {"horizon": 200},
    },
    "hostile": {
        "title": "<script>alert(1)</script> </title> مرحبا 😀 " + "x" * 300,
        "study": {"population": "<img src=x onerror=alert(2)>\n\n# not a heading", "range_basis": "*so* [it](is)"},
        "outcome": {"name": "</style><b>bold</b> $x_1$", "range": [0.1, 0.3]},
        "precision": {"half_width": 0.15},
        "sample": {"horizon": 60},
    },
}
"""Plans by what is special about them."""


def planned(name: str) -> Plan:
    """The plan of that name, with few methods."""
    return make_plan({"methods": {"only": METHODS}, **PLANS[name]})


@cache
def answered(name: str) -> Sizing:
    """The answer to that plan."""
    return study.sample_size(planned(name))
