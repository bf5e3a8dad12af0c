"""Beyond the exact scan: a bracket says where to look; what is looked at there is stated with the answer.

Targets on counts saw with n. A tooth is about 1/p long, and teeth reach across a band of about n/√(npq), the change of
n that moves a chance by one point probability: so a band on both sides of the bracket's place is combed first.
"""

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from coverage_lab.records import Counts
from coverage_lab.records_sizing import Found

SPREAD = 64  # sizes looked at between the place found and four times it
COMB = 20_000  # sizes at most with which a band is combed
WORK = 2_000_000  # events that combing a band, or one step of a neighbourhood, may bring
MOVES = 40  # how often a comb may move on, or a neighbourhood grow

Flags = NDArray[np.bool_]
Check = Callable[[Counts], Flags]


@dataclass(frozen=True)
class Terrain:
    """How far and how densely to look: the p at which chances saw, and about how many events an n brings."""

    p: float
    events: Callable[[int], float]

    def band(self, n: int) -> int:
        """How far teeth reach from n."""
        return math.ceil(2 * math.sqrt(n / max(self.p * (1 - self.p), 1 / n)))

    def affordable(self, n: int, most: int) -> int:
        """How many sizes around n may be looked at."""
        return int(np.clip(WORK / self.events(n), 8, most))


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


def look(check: Check, start: int, top: int, terrain: Terrain) -> Found:
    """First and safe n in start … top, among those looked at, which `checked` states."""
    place = bracket(check, start, top)
    for _ in range(MOVES):
        if place is None:
            break
        combed = _comb(place, start, top, terrain)
        failing = np.flatnonzero(~check(combed))
        after = int(failing[-1]) + 1 if len(failing) else 0
        found = int(combed[after]) if after < len(combed) else None
        if found is not None and found <= place:
            return _neighbourhood(check, (start, found, top), terrain, combed)
        place = found
    return Found(None, None, f"beyond that doubling up to {top}, without success")


def _comb(place: int, start: int, top: int, terrain: Terrain) -> Counts:
    """Sizes over the bands around a place, and spread from it to four times as far."""
    band = terrain.band(place)
    near = np.linspace(max(place - band, start), min(place + 2 * band, top), terrain.affordable(place, COMB))
    far = np.geomspace(place, min(4 * place, top), terrain.affordable(place, SPREAD))
    return np.unique(np.concatenate([near, far, [place]]).astype(np.int64))


def _neighbourhood(check: Check, at: tuple[int, int, int], terrain: Terrain, combed: Counts) -> Found:
    """Every n around a place, growing on the side where the answer is still open."""
    start, place, top = at
    width = max(8, min(terrain.band(place), terrain.affordable(place, COMB)))
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
    words = f"bracketed; every n from {n[0]} to {n[-1]} checked, and {len(combed)} n from {combed[0]} to {combed[-1]}"
    return Found(*first_and_safe(n, met), words)
