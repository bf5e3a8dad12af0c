"""A simulation-based coverage auditor for confidence intervals of one proportion.

    import coverage_lab as cl

    plan = cl.read_plan("plan.toml")
    audit = cl.audit(plan)
    cl.write_report(audit, "plan-report")
    cl.sample_size(plan).verdict.sentence

Names are handed on when they are first asked for, so that importing the package loads no numerical library.
"""

import importlib
from typing import TYPE_CHECKING

if TYPE_CHECKING:
    from coverage_lab import intervals as intervals
    from coverage_lab.checks import InputFault as InputFault
    from coverage_lab.plan import make_plan as make_plan
    from coverage_lab.plan import read_plan as read_plan
    from coverage_lab.study import audit as audit
    from coverage_lab.study import interval as interval
    from coverage_lab.study import minimum_coverage as minimum_coverage
    from coverage_lab.study import sample_size as sample_size
    from coverage_lab.study import write_report as write_report
    from coverage_lab.study import write_sizing as write_sizing

    __version__: str

_HOMES = {
    "InputFault": "checks",
    "audit": "study",
    "interval": "study",
    "make_plan": "plan",
    "minimum_coverage": "study",
    "read_plan": "plan",
    "sample_size": "study",
    "write_report": "study",
    "write_sizing": "study",
}

__all__ = [
    "InputFault",
    "__version__",
    "audit",
    "interval",
    "intervals",
    "make_plan",
    "minimum_coverage",
    "read_plan",
    "sample_size",
    "write_report",
    "write_sizing",
]


def __getattr__(name: str) -> object:
    """A public name, from the module that defines it."""
    if name in _HOMES:
        return getattr(importlib.import_module(f"coverage_lab.{_HOMES[name]}"), name)
    if name == "intervals":
        return importlib.import_module("coverage_lab.intervals")
    if name == "__version__":
        return importlib.import_module("importlib.metadata").version("coverage-lab")
    raise AttributeError(f"module 'coverage_lab' has no attribute {name!r}")


def __dir__() -> list[str]:
    """The public names."""
    return sorted({*globals(), *__all__})
