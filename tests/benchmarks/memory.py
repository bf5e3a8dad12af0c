"""Peak memory of an audit at n = 1 000 000 for a rare outcome, all methods that answer there but blaker and sterne."""

import resource
import time

from timing import report

from coverage_lab.engine.audit import measure
from coverage_lab.intervals import CATALOGUE
from coverage_lab.plan import make_plan

LEFT_OUT = ("blaker", "sterne", "shortest-exact")


def main() -> None:
    names = [name for name, member in CATALOGUE.items() if "two-sided" in member.sides and name not in LEFT_OUT]
    plan = make_plan({"outcome": {"range": [1e-5, 1e-4]}, "sample": {"n": 1_000_000}, "methods": {"only": names}})
    before = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    started = time.perf_counter()
    measure(plan)
    took = time.perf_counter() - started
    peak = resource.getrusage(resource.RUSAGE_SELF).ru_maxrss / 1024
    report(
        "n = 1 000 000, range 1e-5 … 1e-4: peak MiB of the process", peak, "< 400", f"{before:.0f} before, {took:.1f} s"
    )


if __name__ == "__main__":
    main()
