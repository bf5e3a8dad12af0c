"""Beyond the exact scan: a bracket says where to look; what is looked at there is stated with the answer."""

import math
from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray

from coverage_lab.records import Counts
from coverage_lab.records_sizing import Found

SPREAD = 64  # sizes looked at between the place found and four times it
WORK = 2_000_000  # events that one step of a neighbourhood may bring
MOVES = 40  # how often a neighbourhood may grow

Flags = NDArray[np.bool_]
Check = Callable[[Counts], Flags]


def first_and_safe(n: Counts, met: Flags) -> tuple[int | None, int | None]:
    """The smallest n that meets a target, and the smallest from which every later one on the list does."""
    if not met.any():
        return None, None
    failing = np.flatnonzero(~met)
    safe = 0 if len(failing) == 0 else int(failing[-1]) + 1
    return int(n[np.argmax(met)]), int(n[safe]) if safe < len(n) else None


def bracket(check: Check, start: int, top: int) -> int | None:
    """Where the target is met: doubling from `start`, then halving. A place to look, never an answer: targets saw."""
    high = start
    while not check(np.array([high]))[0]:
        if high >= top:
            return None
        high = min(2 * high, top)
    low = max(start - 1, high // 2)
    while high - low > 1:
        middle = (low + high) // 2
        low, high = (low, middle) if check(np.array([middle]))[0] else (middle, high)
    return high


def look(check: Check, start: int, top: int, events: Callable[[int], float]) -> Found:
    """First and safe n in start … top, among those looked at, which `checked` states.

    Sizes spread from the bracket's place to four times it must all meet the target; then every n of a neighbourhood is
    looked at, which grows until it holds a failing n (or `start`) and safe ones after it. `events` says about how many
    events one n brings, which bounds the neighbourhood.
    """
    place = bracket(check, start, top)
    spread = np.array([], dtype=np.int64)
    while place is not None:
        count = int(np.clip(WORK / events(place), 8, SPREAD))
        spread = np.unique(np.geomspace(place, min(4 * place, top), count).astype(np.int64))
        failing = np.flatnonzero(~check(spread))
        if len(failing) == 0:
            return _neighbourhood(check, (start, place, top), events(place), spread)
        place = int(spread[failing[-1] + 1]) if failing[-1] + 1 < len(spread) else None
    return Found(None, None, f"beyond that doubling up to {top}, without success")


def _neighbourhood(check: Check, at: tuple[int, int, int], events: float, spread: Counts) -> Found:
    """Every n around a place, growing on the side where the answer is still open."""
    start, place, top = at
    width = max(8, min(math.ceil(2 * math.sqrt(place)), int(WORK / events)))
    n = np.arange(max(place - width, start), min(place + width, top) + 1)
    met = check(n)
    for _ in range(MOVES):
        safe = first_and_safe(n, met)[1]
        if safe is None and n[-1] < top:
            more = np.arange(n[-1] + 1, min(n[-1] + width, top) + 1)
            n, met = np.append(n, more), np.append(met, check(more))
        elif safe == n[0] > start:
            more = np.arange(max(n[0] - width, start), n[0])
            n, met = np.append(more, n), np.append(check(more), met)
        else:
            break
    words = f"bracketed; every n from {n[0]} to {n[-1]} checked, and {len(spread)} n spread up to {spread[-1]}"
    return Found(*first_and_safe(n, met), words)
