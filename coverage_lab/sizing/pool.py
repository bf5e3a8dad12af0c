"""Blocks of n in this process or in several: the only place of the scan that knows about processes."""

import time
from collections.abc import Callable, Iterator, Sequence
from typing import Any, TypeVar

from joblib import Parallel, delayed

from coverage_lab.engine.work import POOL_WORTH, Progress

T = TypeVar("T")

TIMED = 0.2  # seconds of work in this process before its whole cost is guessed


class Interrupted(KeyboardInterrupt):
    """Ctrl-C during a scan: nothing is written; `finished` blocks were done, `args[0]` says so in words."""

    def __init__(self, finished: int, words: str) -> None:
        self.finished = finished
        super().__init__(words)


def run(
    function: Callable[..., T],
    tasks: Sequence[tuple[Any, ...]],
    costs: Sequence[float],
    workers: int = 1,
    progress: Progress | None = None,
    label: str = "",
) -> list[T]:
    """The results of function(*task) in order; the number of workers changes no digit.

    `costs` are each task's share of the work, for the progress line and to see whether a pool pays.

    Raises:
        Interrupted: on Ctrl-C, with the number of leading tasks that were finished.
    """
    found: list[T] = []
    done, whole = 0.0, sum(costs) or 1.0
    try:
        for result, cost in zip(_results(function, tasks, costs, workers), costs, strict=True):
            found.append(result)
            done += cost
            if progress is not None:
                progress(label, min(done / whole, 1.0))
    except KeyboardInterrupt:
        raise Interrupted(len(found), f"finished {len(found)} of {len(tasks)} blocks") from None
    return found


def _results(
    function: Callable[..., T], tasks: Sequence[tuple[Any, ...]], costs: Sequence[float], workers: int
) -> Iterator[T]:
    """The first tasks in this process, to time them; the rest in a pool when that pays."""
    started, k = time.perf_counter(), 0
    while k < len(tasks) and (workers == 1 or time.perf_counter() - started < TIMED):
        yield function(*tasks[k])
        k += 1
    if k == len(tasks):
        return
    seconds = (time.perf_counter() - started) / (sum(costs[:k]) or 1.0) * sum(costs[k:])
    if seconds < POOL_WORTH:
        for task in tasks[k:]:
            yield function(*task)
        return
    pool = Parallel(n_jobs=workers, return_as="generator", batch_size=1)  # batches would leave one worker idle
    yield from pool(delayed(function)(*task) for task in tasks[k:])
