"""The certified infimum against a scan of 100 000 points with scipy's binomial distribution; all in one run."""

import time
from functools import partial

import numpy as np
from scipy import stats
from timing import report, seconds

from coverage_lab.designs import Simple
from coverage_lab.engine.exact import listed, minimum_of
from coverage_lab.engine.minimum import Piece, minimum
from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Method

POINTS = 100_000


def scan(piece: Piece, low: float, high: float) -> float:
    """The smallest coverage on the grid: for every p the covering run from sorted limits, then two tails."""
    p = np.linspace(low, high, POINTS)
    begin = np.searchsorted(piece.upper, p, side="left") + piece.first
    end = np.searchsorted(piece.lower, p, side="right") + piece.first
    cdf = stats.binom.cdf
    return float((cdf(end - 1, piece.trials, p) - cdf(begin - 1, piece.trials, p)).min())


def rule(events, trials, tail):
    """Not monotone: plus-or-minus when both counts are at least 5, else Clopper-Pearson."""
    wald = CATALOGUE["wald"].function(events, trials, tail)
    exact = CATALOGUE["clopper-pearson"].function(events, trials, tail)
    both = (events >= 5) & (trials - events >= 5)
    return tuple(np.where(both, a, b) for a, b in zip(wald, exact, strict=True))


def main() -> None:
    for low, high, wanted in ((0.005, 0.05, ">= 100"), (0.0, 1.0, ">= 60")):
        for name in ("wilson", "clopper-pearson", "wald"):
            piece = listed(Simple(), [CATALOGUE[name]], 250, (low, high), "two-sided", 0.025)[0].piece(0)
            found = minimum([piece], low, high).coverage
            seen = scan(piece, low, high)
            ratio = seconds(partial(scan, piece, low, high), 2) / seconds(partial(minimum, [piece], low, high), 20)
            note = f"minimum {found:.6f}, scan {seen:.6f}" + ("" if found <= seen + 1e-12 else "  ABOVE THE SCAN")
            report(f"infimum of {name}, n = 250 on [{low}, {high}]: times faster than the scan", ratio, wanted, note)
    for n, low, high, wanted in ((20_000, 0.0, 1.0, "<= 1"), (1_000_000, 1e-5, 1e-4, "<= 0.1")):
        parts = listed(Simple(), [CATALOGUE["wilson"]], n, (low, high), "two-sided", 0.025)
        report(
            f"infimum of wilson, n = {n} on [{low}, {high}]: seconds",
            seconds(partial(minimum_of, parts, 0, low, high)),
            wanted,
        )
    own = Method("rule", rule, "rule", "your own", "benchmark")
    started = time.perf_counter()
    found = minimum_of(listed(Simple(), [own], 250, (0.0, 1.0), "two-sided", 0.025), 0, 0.0, 1.0)
    report(
        "a rule that is not monotone, n = 250 on (0, 1): seconds",
        time.perf_counter() - started,
        "<= 0.5",
        f"minimum {found.coverage:.6f}",
    )


if __name__ == "__main__":
    main()
