"""A walk over 72 plans: only listed methods are named, and the name is steady when n or the range moves a little."""

from itertools import product

import pytest

from coverage_lab.engine import size
from coverage_lab.engine.audit import measure
from coverage_lab.plan import make_plan
from coverage_lab.records import Plan
from coverage_lab.verdict import decide, judged

CONFIDENCES = (0.9, 0.95, 0.99)
RANGES = {"rare": (0.005, 0.05), "middling": (0.2, 0.4), "near one": (0.9, 0.99)}
TWO_SIDED = (20, 36, 60, 150, 250, 1000)
ONE_SIDED = (60, 3000)
LISTED = {"two-sided": {"wilson", "clopper-pearson"}, "upper": {"clopper-pearson"}, "lower": {"clopper-pearson"}}

PLANS = [
    *((c, r, n, "two-sided") for c, r, n in product(CONFIDENCES, RANGES, TWO_SIDED)),
    *((c, r, n, "lower" if r == "near one" else "upper") for c, r, n in product(CONFIDENCES, RANGES, ONE_SIDED)),
]


@pytest.fixture(autouse=True)
def _no_curve(monkeypatch: pytest.MonkeyPatch) -> None:
    """The verdict does not read the curve; two points of it save most of the time."""
    monkeypatch.setattr(size, "CURVE_POINTS", 2)


def plan(confidence: float, low: float, high: float, n: int, side: str, only: list[str] | None = None) -> Plan:
    keys = {
        "confidence": confidence,
        "side": side,
        "outcome": {"range": [low, high]},
        "sample": {"n": n},
        "simulation": {"routes": ["enumerated"], "grid": [low, high]},
    }
    return make_plan(keys | ({"methods": {"only": only}} if only else {}))


def named(p: Plan) -> str | None:
    measured = measure(p)
    return decide(measured, judged(measured), p.sizes[0]).method


def names_around(confidence: float, place: str, n: int, side: str) -> list[str | None]:
    """The name at n, at n - 5 and n + 5, and with the range moved by 10 % of its own position."""
    low, high = RANGES[place]
    flip = place == "near one"
    down, up = (
        (1 - (1 - low) * share, 1 - (1 - high) * share) if flip else (low * share, high * share) for share in (0.9, 1.1)
    )
    only = sorted(LISTED[side])
    varied = [(low, high, n), (low, high, n - 5), (low, high, n + 5), (*down, n), (*up, n)]
    return [named(plan(confidence, a, b, m, side, only)) for a, b, m in varied]


def test_there_are_some_seventy_plans() -> None:
    assert len(PLANS) == 72


@pytest.mark.parametrize(("confidence", "place", "n", "side"), [p for p in PLANS if p[2] <= 250])
def test_only_listed_methods_are_named_whatever_is_measured(confidence: float, place: str, n: int, side: str) -> None:
    """Clopper-Pearson always holds in a simple design, so there is always a name, and it is on the list."""
    assert named(plan(confidence, *RANGES[place], n, side)) in LISTED[side]


def test_names_are_steady() -> None:
    """Budget: at most 4 of the 72 plans may change their name within n ± 5, at most 8 when the range moves by 10 %.

    A change is honest only near the place where wilson starts to hold, so it must be rare.
    """
    by_n, by_range = [], []
    for item in PLANS:
        here, *around = names_around(*item)
        by_n += [item] if set(around[:2]) != {here} else []
        by_range += [item] if set(around[2:]) != {here} else []
    assert len(by_n) <= 4, by_n
    assert len(by_range) <= 8, by_range
