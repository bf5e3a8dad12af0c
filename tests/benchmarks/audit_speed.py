"""The simulated audit against the plain way, and against NumPy's draws alone; all in one run."""

import numpy as np
from statsmodels.stats.proportion import proportion_confint
from timing import report, seconds

from coverage_lab.engine import size, work
from coverage_lab.engine.audit import measure
from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.measures import measure as measures_of
from coverage_lab.engine.measures import stack
from coverage_lab.intervals import CATALOGUE
from coverage_lab.plan import make_plan
from coverage_lab.records import Plan

N, DRAWS = 250, 100_000
GRID = [float(p) for p in np.linspace(0.005, 0.05, 10)]
PLAIN = {
    "wald": "normal",
    "wilson": "wilson",
    "agresti-coull": "agresti_coull",
    "clopper-pearson": "beta",
    "jeffreys": "jeffreys",
}


def plan(names: list[str]) -> Plan:
    return make_plan(
        {
            "outcome": {"range": [0.005, 0.05]},
            "sample": {"n": N},
            "simulation": {"replicates": DRAWS, "grid": GRID, "routes": ["simulated"]},
            "methods": {"only": names},
        }
    )


def plain_way() -> list[float]:
    """Draw, then an interval for every draw, then count."""
    rng = np.random.default_rng(1)
    found = []
    for p in GRID:
        x = rng.binomial(N, p, DRAWS)
        for method in PLAIN.values():
            low, high = proportion_confint(x, N, method=method)
            found.append(float(np.mean((low <= p) & (p <= high))))
    return found


def draws_alone() -> None:
    rng = np.random.default_rng(1)
    for p in GRID:
        rng.binomial(N, p, DRAWS)


def simulated_route(audited: Plan) -> None:
    """Cells drawn, tallied and measured."""
    measure(audited)


def bounds_given(audited: Plan) -> object:
    """The same without computing bounds: what remains when they are known."""
    found = size.support(audited, N, work.cells(audited), work.simulate(audited, work.cells(audited)))
    methods = [m for m in audited.methods if "two-sided" in m.sides]
    limits = stack([evaluate(method, found.columns, "two-sided", 0.025) for method in methods])

    def run() -> None:
        tallies = work.simulate(audited, work.cells(audited))
        for item in size.support(audited, N, work.cells(audited), tallies).cells:
            measures_of(item.outcomes, limits.at(item.samples), item.p, "two-sided")

    return run


def main() -> None:
    five = plan(list(PLAIN))
    every = plan([name for name, member in CATALOGUE.items() if "two-sided" in member.sides])
    audit = seconds(lambda: simulated_route(five))
    draws = seconds(draws_alone)
    report("simulated audit, 5 methods: times faster than the plain way", seconds(plain_way, 2) / audit, ">= 40")
    report("simulated audit, 5 methods: times NumPy's draws alone", audit / draws, "<= 1.3")
    run = bounds_given(every)
    report("simulated route, all two-sided methods, bounds given: times the draws", seconds(run) / draws, "<= 1.3")


if __name__ == "__main__":
    main()
