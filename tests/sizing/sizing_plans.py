"""Plans for the tests of sample sizes."""

from coverage_lab.designs import Simple
from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Outcome, Plan, Simulation, Standard, Study

STANDARDS = {
    "bradley": Standard("bradley", 1.5, 1.1),
    "guaranteed": Standard("guaranteed", 1 + 1e-9, 1 + 1e-9),
}


def plan(low=0.01, high=0.04, expected=None, *, methods=("wilson", "clopper-pearson"), prefer=None, **other) -> Plan:
    """A two-sided 95 % plan on a range, by Bradley's standard unless `other` says otherwise."""
    chosen = {
        "title": "test",
        "confidence": 0.95,
        "side": "two-sided",
        "study": Study(),
        "outcome": Outcome("event", expected if expected is not None else (low + high) / 2, low, high),
        "sizes": (),
        "standard": STANDARDS["bradley"],
        "design": Simple(),
        "simulation": Simulation(1000, 1, ()),
        "methods": tuple(CATALOGUE[name] for name in methods),
        "prefer": tuple(CATALOGUE[name] for name in (prefer if prefer is not None else methods)),
        "document": {},
    }
    return Plan(**{**chosen, **other})
