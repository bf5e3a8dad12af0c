"""The one clock of the benchmarks: the best of a few runs, and a line that prints a ratio."""

import time
from collections.abc import Callable


def seconds(work: Callable[[], object], repeats: int = 5) -> float:
    """The shortest of `repeats` runs, after one that warms up."""
    work()
    best = float("inf")
    for _ in range(repeats):
        started = time.perf_counter()
        work()
        best = min(best, time.perf_counter() - started)
    return best


def report(name: str, value: float, wanted: str, note: str = "") -> None:
    """One line: what was measured, the figure, what is wanted."""
    print(f"{name:<74} {value:>9.3g}   wanted {wanted:<10} {note}")
