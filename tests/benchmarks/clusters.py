"""Clustered simulation against the plain way, in one run: 100 000 replicates, all cluster methods together.

The plain way draws a proportion for every cluster, then its events, and evaluates every method on every replicate, all
in NumPy. The package draws equal clusters by table, counts equal samples once, and evaluates each method on what is
left.

    python tests/benchmarks/clusters.py
"""

import time
from collections.abc import Callable

import numpy as np
from timing import report

from coverage_lab.designs import Clustered, Layered, Loss
from coverage_lab.designs.frame import Frame
from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.measures import measure, stack
from coverage_lab.engine.tally import merged, restricted, simulated
from coverage_lab.engine.work import Cell, blocks, draw_block
from coverage_lab.intervals import EVERY

REPLICATES = 100_000
TAIL = 0.025
NAMES = [name for name, method in EVERY.items() if method.family == "clusters"]


def plain(design: Clustered, loss: float, n: int, p: float, seed: int) -> dict[str, float]:
    """Coverage of every cluster method, replicate by replicate."""
    rng = np.random.default_rng(seed)
    strength = (1 - design.icc) / design.icc
    shape = (REPLICATES, len(design.sizes(n)))
    if design.cv:
        spread = design.cv**2
        m = np.maximum(np.rint(rng.gamma(1 / spread, design.largest * spread, shape)), 1).astype(np.int64)
    else:
        m = np.array(design.sizes(n))
    x = rng.binomial(m, rng.beta(p * strength, (1 - p) * strength, shape))
    if loss:
        others = rng.binomial(m - x, 1 - loss)
        x = rng.binomial(x, 1 - loss)
        m = x + others
    m = np.broadcast_to(m, shape)
    columns = {
        "events": x.sum(1),
        "trials": m.sum(1),
        "clusters": (m > 0).sum(1),
        "events_squared": (x * x).sum(1),
        "events_by_size": (x * m).sum(1),
        "sizes_squared": (m * m).sum(1),
        "planned_icc": np.array([design.icc]),
    }
    found = {}
    for name in NAMES:
        limits = evaluate(EVERY[name], columns, "two-sided", TAIL)
        found[name] = float(((limits.lower <= p) & (p <= limits.upper)).mean())
    return found


def quick(design: Frame | Layered, n: int, p: float, seed: int) -> dict[str, float]:
    """The same by the package's own route: methods that need the same columns share their samples."""
    shares = [draw_block(design, block, seed) for block in blocks(Cell(n, p), REPLICATES)]
    outcomes = simulated(*merged(shares))
    views: dict[object, list[str]] = {}
    for name in NAMES:
        views.setdefault(design.view(frozenset(EVERY[name].needs)), []).append(name)
    found = {}
    for view, names in views.items():
        seen = restricted(outcomes, view.columns)
        limits = stack([evaluate(EVERY[name], seen.columns, "two-sided", TAIL) for name in names])
        found |= dict(zip(names, measure(seen, limits, p, "two-sided")["coverage"].tolist(), strict=True))
    return found


def ratio(slow: Callable[[], object], fast: Callable[[], object], repeats: int = 4) -> float:
    """Processor time of the one over that of the other, the best of interleaved runs: other work on the machine
    disturbs both alike.
    """
    best = [float("inf"), float("inf")]
    for _ in range(repeats):
        for k, work in enumerate((slow, fast)):
            started = time.process_time()
            work()
            best[k] = min(best[k], time.process_time() - started)
    return best[0] / best[1]


def compare(label: str, design: Clustered, loss: float, wanted: str, p: float, n: int = 300) -> None:
    """Print one ratio, and the largest difference of the two ways in standard errors."""
    layered = Layered(design, (Loss(loss, loss),)) if loss else design
    slow, fast = plain(design, loss, n, p, 1), quick(layered, n, p, 2)
    apart = max(abs(slow[k] - fast[k]) / np.sqrt(2 * slow[k] * (1 - slow[k]) / REPLICATES) for k in NAMES)
    times = ratio(lambda: plain(design, loss, n, p, 1), lambda: quick(layered, n, p, 2))
    report(f"{label}, true proportion {p:g}", times, wanted, f"apart by at most {apart:.1f} standard errors")


def main() -> None:
    for p in (0.02, 0.1):
        compare("30 equal clusters of 10", Clustered(10, 0.05), 0.0, ">= 15", p)
        compare("the same, 5 % of units lost at random", Clustered(10, 0.05), 0.05, ">= 4", p)
    for p in (0.02, 0.1):
        compare("30 clusters of 10 on average, random sizes", Clustered(10, 0.05, cv=0.4), 0.0, ">= 1", p)
        compare("random sizes, 5 % lost at random", Clustered(10, 0.05, cv=0.4), 0.05, ">= 1", p)


if __name__ == "__main__":
    main()
