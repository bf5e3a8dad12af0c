"""The scan for n against scipy's binomial distribution on a grid of 2000 points; two workers against one. One run.

The grid takes the table of every n, the covering run at each p, two tails, and for the assurance one sum of points. It
is run for every 40th n and counted forty times; both sides find worst coverage and assurance of the same methods. The
limits are computed by the same functions on both sides, so the ratio is also given without their time. Processor time
is counted, for other work on the machine would bend the ratio; half of the grid is run before the scan, half after it.
"""

import sys
import time
from dataclasses import dataclass

import numpy as np
from scipy import stats
from timing import report

from coverage_lab.engine.bounds import evaluate
from coverage_lab.intervals import CATALOGUE
from coverage_lab.sizing import scan as scanning
from coverage_lab.sizing.scan import Asked, scan, scanned

METHODS = (
    *("wilson", "agresti-coull", "plus-four", "wilson-cc", "arcsine", "logit", "logit-half", "cloglog", "wald-cc"),
    *("wald", "clopper-pearson", "jeffreys", "mid-p"),
)
SIZES = np.arange(10, 2001)
STEP = 40
LOW, HIGH, P, HALF_WIDTH = 0.01, 0.1, 0.05, 0.02
GRID = np.linspace(LOW, HIGH, 2000)
QUESTION = Asked(LOW, HIGH, (1.0, 1.0), P, HALF_WIDTH, "two-sided", 0.025, ("worst_miss", "assurance"))


@dataclass
class Clock:
    """Seconds spent in the limits, apart from the rest."""

    limits: float = 0.0

    def evaluate(self, *arguments):
        started = time.process_time()
        found = evaluate(*arguments)
        self.limits += time.process_time() - started
        return found


def grid_scan(sizes: np.ndarray, clock: Clock) -> dict[tuple[str, int], float]:
    """Worst coverage on the grid, and the assurance, the straightforward way."""
    worst = {}
    for n in sizes:
        x = np.arange(n + 1)
        for name in METHODS:
            limits = clock.evaluate(CATALOGUE[name], {"events": x, "trials": np.array([n])}, "two-sided", 0.025)
            begin = np.searchsorted(limits.upper, GRID, side="left")
            end = np.searchsorted(limits.lower, GRID, side="right")
            coverage = stats.binom.cdf(end - 1, n, GRID) - stats.binom.cdf(begin - 1, n, GRID)
            worst[name, int(n)] = float(coverage.min())
            stats.binom.pmf(x, n, P)[(limits.upper - limits.lower) / 2 <= HALF_WIDTH].sum()
    return worst


def against_the_grid() -> None:
    sample = SIZES[::STEP]
    grid_clock, own_clock = Clock(), Clock()
    started = time.process_time()
    on_grid = grid_scan(sample[::2], grid_clock)
    grid = time.process_time() - started
    scanning.evaluate = own_clock.evaluate
    started = time.process_time()
    found = scan(QUESTION, [scanned(CATALOGUE[name], coverage=True) for name in METHODS], SIZES)
    own = time.process_time() - started
    scanning.evaluate = evaluate
    started = time.process_time()
    on_grid |= grid_scan(sample[1::2], grid_clock)
    grid = (grid + time.process_time() - started) * len(SIZES) / len(sample)
    grid_limits = grid_clock.limits * len(SIZES) / len(sample)
    exact = {(row.method, row.n): 1 - row.worst_miss for row in found.itertuples()}
    above = sum(exact[key] > value + 1e-12 for key, value in on_grid.items())
    gap = max(value - exact[key] for key, value in on_grid.items())
    note = f"{own:.1f} s against {grid:.0f} s; {above} minima above the grid's, the grid misses up to {gap:.4f}"
    report("scan n = 10 … 2000, worst coverage and assurance: times faster than the grid", grid / own, ">= 10", note)
    rest = (grid - grid_limits) / (own - own_clock.limits)
    note = f"limits: {own_clock.limits:.1f} s here, {grid_limits:.0f} s for the grid's whole tables"
    report("the same without the time of the limits, which both compute alike", rest, ">= 10", note)


def two_workers() -> None:
    question = Asked(0.05, 0.45, (1.0, 1.0), 0.25, 0.02, "two-sided", 0.025)
    items = [scanned(CATALOGUE[name], coverage=True) for name in ("wilson", "clopper-pearson", "jeffreys")]
    seconds, tables = [], []
    for workers in (1, 2):
        started = time.perf_counter()
        tables.append(scan(question, items, np.arange(1, 3001), workers))
        seconds.append(time.perf_counter() - started)
    same = "the same digits" if tables[0].equals(tables[1]) else "OTHER DIGITS"
    report("two workers against one", seconds[0] / seconds[1], ">= 1.6", f"{seconds[0]:.0f} s of serial work; {same}")


if __name__ == "__main__":
    against_the_grid()
    if "--no-workers" not in sys.argv:
        two_workers()
