"""Laws that every interval method of events and trials obeys, or is exempt from by its catalogue line."""

import math
from collections.abc import Callable, Iterator
from functools import lru_cache

import numpy as np
import pytest

from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Method, tail_of

METHODS = {name: method for name, method in CATALOGUE.items() if method.needs == ("events", "trials")}
TRIALS = (1, 2, 3, 5, 10, 29, 30, 31, 60, 100, 200)
CONFIDENCES = (0.8, 0.9, 0.945, 0.95, 0.99, 0.9999)
SLACK = 1e-11  # relative: limits that two roots give independently agree to far more
Pair = tuple[np.ndarray, np.ndarray]


# --- the tables under the laws --------------------------------------------------------------------------------------
@lru_cache(maxsize=4000)
def table(function: Callable, n: int, tail: float) -> Pair:
    """Raw limits of all n + 1 outcomes."""
    lower, upper = function(np.arange(n + 1), n, tail)
    return np.broadcast_to(lower, n + 1), np.broadcast_to(upper, n + 1)


def raw(function: Callable, n: int, confidence: float, side: str) -> Pair:
    """What the side asks for: a one-sided bound has 0 or 1 for its other limit."""
    lower, upper = table(function, n, tail_of(confidence, side))
    return np.zeros(n + 1) if side == "upper" else lower, np.ones(n + 1) if side == "lower" else upper


def held(function: Callable, n: int, confidence: float, side: str) -> Pair:
    """The same, truncated to [0, 1]."""
    lower, upper = raw(function, n, confidence, side)
    return np.clip(lower, 0, 1), np.clip(upper, 0, 1)


def at_most(a: np.ndarray, b: np.ndarray) -> bool:
    """Whether a <= b everywhere, up to the slack."""
    return bool(np.all(a <= b + SLACK * np.maximum(np.abs(a), np.abs(b))))


def is_rising(pair: Pair) -> bool:
    return all(at_most(limit[:-1], limit[1:]) for limit in pair)


# --- the laws: (function, trials, confidence, side) -> whether it holds ---------------------------------------------
def finite(function: Callable, n: int, confidence: float, side: str) -> bool:
    return all(np.isfinite(limit).all() for limit in table(function, n, tail_of(confidence, side)))


def ordered(function: Callable, n: int, confidence: float, side: str) -> bool:
    lower, upper = raw(function, n, confidence, side)
    return bool(np.all(lower <= upper))


def monotone(function: Callable, n: int, confidence: float, side: str) -> bool:
    return is_rising(held(function, n, confidence, side))


def monotone_raw(function: Callable, n: int, confidence: float, side: str) -> bool:
    return is_rising(raw(function, n, confidence, side))


def mirror(function: Callable, n: int, confidence: float, side: str) -> bool:
    """Events and non-events are treated alike: L(x) = 1 - U(n - x)."""
    lower, upper = table(function, n, tail_of(confidence, side))
    return bool(np.allclose(lower, 1 - upper[::-1], rtol=0, atol=2e-13))


def nested(function: Callable, n: int, confidence: float, side: str) -> bool:
    """No interval of less confidence, down the list, sticks out."""
    lower, upper = held(function, n, confidence, side)
    inner = [held(function, n, less, side) for less in CONFIDENCES if less < confidence]
    return all(at_most(lower, inside[0]) and at_most(inside[1], upper) for inside in inner)


def holds_estimate(function: Callable, n: int, confidence: float, side: str) -> bool:
    estimate = np.arange(n + 1) / n
    lower, upper = held(function, n, confidence, side)
    return at_most(lower, estimate) and at_most(estimate, upper)


LAWS: dict[str, Callable[[Callable, int, float, str], bool]] = {
    law.__name__.replace("_", "-"): law
    for law in (finite, ordered, monotone, monotone_raw, mirror, nested, holds_estimate)
}


def law_faults(law: str, function: Callable, sides: tuple[str, ...]) -> Iterator[str]:
    """Where in the scan the law fails."""
    for n in TRIALS:
        for confidence in CONFIDENCES:
            for side in sides:
                if not LAWS[law](function, n, confidence, side):
                    yield f"{law} fails at n = {n}, confidence {confidence}, {side}"


EXEMPT = [(name, law) for name, method in METHODS.items() for law in method.exemptions]
BOUND = [(name, law) for name in METHODS for law in LAWS if (name, law) not in EXEMPT]


@pytest.mark.parametrize(("name", "law"), BOUND)
def test_law(name: str, law: str) -> None:
    faults = list(law_faults(law, METHODS[name].function, METHODS[name].sides))
    assert not faults, faults


@pytest.mark.parametrize(("name", "law"), EXEMPT)
def test_exemption_is_needed_and_explained(name: str, law: str) -> None:
    method = METHODS[name]
    assert law in LAWS, f"{name} is exempt from {law}, which is no law"
    assert len(method.exemptions[law]) > 15
    assert next(law_faults(law, method.function, method.sides), None), f"{name} keeps {law} throughout the scan"


# --- where the known faults begin -----------------------------------------------------------------------------------
# The smallest n at which a law breaks; found by scanning n = 1 .. 200.
BEGINS = [
    ("logit", "monotone", 0.99, "two-sided", 28),
    ("cloglog", "monotone", 0.99, "two-sided", 10),
    ("logit-half", "monotone", 0.9999, "two-sided", 32),
]


@pytest.mark.parametrize(("name", "law", "confidence", "side", "first"), BEGINS)
def test_fault_begins(name: str, law: str, confidence: float, side: str, first: int) -> None:
    function = METHODS[name].function
    assert [n for n in range(1, first + 1) if not LAWS[law](function, n, confidence, side)] == [first]


@pytest.mark.parametrize(("confidence", "first"), [(0.95, 21), (0.9, 34), (0.99, 20)])
def test_second_order_bound_leaves_one_at_n_events(confidence: float, first: int) -> None:
    tops = [held(METHODS["second-order"].function, n, confidence, "upper")[1][n] for n in range(1, first + 1)]
    assert [n for n, top in enumerate(tops, start=1) if top < 1] == [first]


def tail_at(z: float) -> float:
    return math.erfc(z / math.sqrt(2)) / 2


@pytest.mark.parametrize(("z", "dips"), [(2.366, False), (2.367, True)])
def test_logit_dips_from_one_event_to_two_once_z_passes_a_threshold(z: float, dips: bool) -> None:
    """For many trials U(x) tends to x exp(z / sqrt x) / n, so that U(1) > U(2) when z > 2.3665."""
    _, upper = METHODS["logit"].function(np.array([1, 2]), 10**6, tail_at(z))
    assert bool(upper[0] > upper[1]) == dips


@pytest.mark.parametrize(("z", "is_positive"), [(1.2246, True), (1.2249, False)])
def test_arcsine_lower_limit_at_no_events_is_positive_below_a_threshold(z: float, is_positive: bool) -> None:
    """For many trials the angle at 0 events tends to sqrt(3/8) / sqrt n, against z / (2 sqrt n)."""
    lower, _ = METHODS["arcsine"].function(0, 10**6, tail_at(z))
    assert bool(lower > 0) == is_positive


def test_plus_four_lower_limit_at_no_events_is_positive_at_low_confidence() -> None:
    function = METHODS["plus-four"].function
    assert all(raw(function, n, 0.8, "two-sided")[0][0] > 0 for n in TRIALS)
    assert [n for n in TRIALS if raw(function, n, 0.9, "two-sided")[0][0] > 0] == [1, 2, 3]


def test_shortest_exact_is_not_nested() -> None:
    at_95, at_945 = (raw(METHODS["shortest-exact"].function, 10, c, "two-sided")[0][10] for c in (0.95, 0.945))
    assert (round(at_95, 4), round(at_945, 4)) == (0.7330, 0.7324)


# --- arrays ---------------------------------------------------------------------------------------------------------
@pytest.mark.parametrize("method", METHODS.values(), ids=METHODS)
def test_arrays_give_what_single_calls_give(method: Method) -> None:
    events, trials = np.array([[0], [1], [3]]), np.array([3, 10, 31])
    lower, upper = method.function(events, trials, 0.025)
    assert lower.shape == upper.shape == (3, 3)
    assert lower.dtype == upper.dtype == np.float64
    for i, j in np.ndindex(3, 3):
        single = method.function(int(events[i, 0]), int(trials[j]), 0.025)
        assert (float(single[0]), float(single[1])) == (lower[i, j], upper[i, j]), (events[i, 0], trials[j])


@pytest.mark.parametrize("method", METHODS.values(), ids=METHODS)
def test_pure_and_blind_to_the_number_type(method: Method) -> None:
    events, trials = np.arange(31), np.full(31, 30)
    first = method.function(events, trials, 0.025)
    again = method.function(events, trials, 0.025)
    in_floats = method.function(events.astype(float), trials.astype(float), 0.025)
    reversed_order = method.function(events[::-1], trials, 0.025)
    for one, two, three, four in zip(first, again, in_floats, reversed_order, strict=True):
        np.testing.assert_array_equal(one, two)
        np.testing.assert_array_equal(one, three)
        np.testing.assert_array_equal(one, four[::-1])
    np.testing.assert_array_equal(events, np.arange(31))
    np.testing.assert_array_equal(trials, np.full(31, 30))


# --- identities between methods -------------------------------------------------------------------------------------
def test_agresti_coull_is_wilson_at_one_half() -> None:
    for n in (2, 10, 60, 200):
        for confidence in CONFIDENCES:
            one, two = (raw(METHODS[name].function, n, confidence, "two-sided") for name in ("agresti-coull", "wilson"))
            np.testing.assert_allclose(
                [limit[n // 2] for limit in one], [limit[n // 2] for limit in two], rtol=1e-13, atol=1e-16
            )


def test_agresti_coull_is_never_shorter_than_wilson() -> None:
    for n in TRIALS:
        for confidence in CONFIDENCES:
            widths = [
                np.subtract(*raw(METHODS[name].function, n, confidence, "two-sided")[::-1])
                for name in ("wilson", "agresti-coull")
            ]
            assert at_most(*widths), (n, confidence)


def test_blaker_lies_inside_clopper_pearson() -> None:
    for n in TRIALS:
        for confidence in CONFIDENCES:
            inner, outer = (
                raw(METHODS[name].function, n, confidence, "two-sided") for name in ("blaker", "clopper-pearson")
            )
            assert at_most(outer[0], inner[0]), (n, confidence)
            assert at_most(inner[1], outer[1]), (n, confidence)


def test_sterne_may_leave_clopper_pearson() -> None:
    inner, outer = (METHODS[name].function(1, 10, 0.025) for name in ("sterne", "clopper-pearson"))
    assert float(inner[1]) > float(outer[1]) + 0.001


@pytest.mark.parametrize("n", [1, 2, 20, 10**6])
def test_one_sided_clopper_pearson_is_two_sided_mid_p_at_no_events(n: int) -> None:
    one_sided = METHODS["clopper-pearson"].function(0, n, tail_of(0.95, "upper"))[1]
    two_sided = METHODS["mid-p"].function(0, n, tail_of(0.95, "two-sided"))[1]
    assert float(one_sided) == pytest.approx(float(two_sided), rel=1e-14, abs=0)


# Upper limits; arguments: trials, tail, z.
CLOSED_FORMS: dict[str, Callable[[int, float, float], float]] = {
    "clopper-pearson": lambda n, tail, _: -math.expm1(math.log(tail) / n),
    "mid-p": lambda n, tail, _: -math.expm1(math.log(2 * tail) / n),
    "jeffreys-modified": lambda n, tail, _: -math.expm1(math.log(tail) / n),
    "wilson": lambda n, _, z: z * z / (n + z * z),
    "likelihood-ratio": lambda n, _, z: -math.expm1(-z * z / (2 * n)),
    "poisson-exact": lambda n, tail, _: -math.log(tail) / n,
    "logit": lambda n, tail, _: -math.expm1(math.log(tail) / n),
    "cloglog": lambda n, tail, _: -math.expm1(math.log(tail) / n),
}


@pytest.mark.parametrize(("tail", "z"), [(0.025, 1.959963984540054), (5e-7, 4.891638475698590)])
@pytest.mark.parametrize("name", CLOSED_FORMS)
def test_closed_form_at_no_events(name: str, tail: float, z: float) -> None:
    for n in (1, 3, 250, 10**6):
        lower, upper = METHODS[name].function(0, n, tail)
        assert float(lower) == 0
        assert float(upper) == pytest.approx(CLOSED_FORMS[name](n, tail, z), rel=1e-13, abs=0)
