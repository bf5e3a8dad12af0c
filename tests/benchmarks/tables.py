"""Whole tables of bounds at n = 1000 against the Clopper-Pearson table; all in one run."""

import time

import numpy as np
from timing import report, seconds

from coverage_lab.intervals import CATALOGUE, shortest_exact

N, TAIL = 1000, 0.025
SOLVED = ("mid-p", "likelihood-ratio", "jeffreys-hpd")


def main() -> None:
    events, trials = np.arange(N + 1), np.array([N])

    def table(name: str) -> None:
        CATALOGUE[name].function(events, trials, TAIL)

    base = seconds(lambda: table("clopper-pearson"))
    print(f"the Clopper-Pearson table takes {1000 * base:.2f} ms")
    for name in SOLVED:
        report(f"{name}: times the Clopper-Pearson table", seconds(lambda n=name: table(n)) / base, "<= 60")
    for name in ("blaker", "sterne"):
        report(f"{name}: times the Clopper-Pearson table", seconds(lambda n=name: table(n), 2) / base, "<= 250")
    started = time.process_time()
    shortest_exact(events, trials, 0.0251)  # a tail that no earlier call has prepared
    report("shortest-exact: CPU seconds", time.process_time() - started, "<= 1")


if __name__ == "__main__":
    main()
