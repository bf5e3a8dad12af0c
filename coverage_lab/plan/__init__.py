"""Words in: a plan file or a mapping becomes a `Plan`, or one line for every fault, all of them at once.

The only place, with the command line, where names become objects.
"""

from pathlib import Path

from coverage_lab.plan.build import make_level, make_plan, read_plan
from coverage_lab.plan.design import KEYS as DESIGN_KEYS
from coverage_lab.plan.faults import of_option
from coverage_lab.plan.needs import audit_faults
from coverage_lab.plan.own import available, own_methods
from coverage_lab.plan.schema import LARGEST_N
from coverage_lab.plan.tables import LAYER_KEYS

__all__ = [
    "DEMONSTRATION",
    "DESIGN_KEYS",
    "LARGEST_N",
    "LAYER_KEYS",
    "STARTER",
    "audit_faults",
    "available",
    "make_level",
    "make_plan",
    "of_option",
    "own_methods",
    "read_plan",
]

DEMONSTRATION = Path(__file__).parents[1] / "demonstration.toml"
STARTER = Path(__file__).parents[1] / "starter.toml"
