"""Designs that cannot be: one clear line each, all lines of one design at once."""

import math
from collections.abc import Callable

import pytest

from coverage_lab.checks import InputFault
from coverage_lab.designs import (
    Classification,
    Clustered,
    Finite,
    Layered,
    Loss,
    Simple,
    Stratified,
    Stratum,
    faults,
)

STRATA = "[design.strata]"
WEAK = "[design.classification] sensitivity + specificity"
WEAKER = "expected more than 1: a test that errs more tells nothing"
WHOLE = "expected a whole number of at least 1"
SHARE = "expected a number of at least 0 and below 1"

IMPOSSIBLE: list[tuple[Callable[[], object], tuple[str, ...]]] = [
    (lambda: Classification(0.5, 0.5), (f"{WEAK} = 1.0: {WEAKER}",)),
    (lambda: Classification(0.3, 0.6), (f"{WEAK} = 0.8999999999999999: {WEAKER}",)),
    (lambda: Classification(0.9, 0.9, planned_specificity=0.05), (f"{WEAK} = 0.9500000000000001: {WEAKER}",)),
    (
        lambda: Classification(1.2, math.nan),
        (
            "[design.classification] sensitivity = 1.2: expected a number from 0 to 1",
            "[design.classification] specificity = nan: expected a number from 0 to 1",
        ),
    ),
    (
        lambda: Classification(0.9, 0.9, 0, 0),
        (
            f"[design.classification] diseased_tested = 0: {WHOLE}",
            f"[design.classification] healthy_tested = 0: {WHOLE}",
        ),
    ),
    (lambda: Classification(0.9, 0.9, 50), (f"[design.classification] healthy_tested = None: {WHOLE}",)),
    (lambda: Classification(0.9, 0.9, 2.5, 10), (f"[design.classification] diseased_tested = 2.5: {WHOLE}",)),
    (lambda: Clustered(10, 1.0), (f"[design] icc = 1.0: {SHARE}",)),
    (lambda: Clustered(10, -0.01), (f"[design] icc = -0.01: {SHARE}",)),
    (lambda: Clustered(10, math.nan), (f"[design] icc = nan: {SHARE}",)),
    (lambda: Clustered(10, 0.1, planned_icc=2.0), (f"[design] planned_icc = 2.0: {SHARE}",)),
    (
        lambda: Clustered(1, 0.1),
        ("[design] icc = 0.1: expected 0, since clusters of one unit leave nothing to be alike",),
    ),
    (lambda: Clustered(0, 0.1), ("[design] cluster_size = 0: expected whole numbers of at least 1",)),
    (lambda: Clustered((3, 2.5), 0.1), ("[design] cluster_size = (3, 2.5): expected whole numbers of at least 1",)),
    (lambda: Clustered((), 0.1), ("[design] cluster_size = (): expected whole numbers of at least 1",)),
    (lambda: Clustered(10, 0.1, cv=-1.0), ("[design] cluster_cv = -1.0: expected a number of at least 0",)),
    (lambda: Clustered((5, 5), 0.1, cv=0.3), ("[design] cluster_cv = 0.3: expected none beside a list of sizes",)),
    (
        lambda: Clustered(0, 1.5, cv=-1.0),
        (
            "[design] cluster_size = 0: expected whole numbers of at least 1",
            "[design] cluster_cv = -1.0: expected a number of at least 0",
            f"[design] icc = 1.5: {SHARE}",
        ),
    ),
    (lambda: Finite(0), ("[design] population = 0: expected a whole number from 1 to 10000000, or inf",)),
    (lambda: Finite(10.5), ("[design] population = 10.5: expected a whole number from 1 to 10000000, or inf",)),
    (lambda: Finite(math.nan), ("[design] population = nan: expected a whole number from 1 to 10000000, or inf",)),
    (lambda: Finite(10**8), ("[design] population = 100000000: expected a whole number from 1 to 10000000, or inf",)),
    (lambda: Loss(1.0, 0.1), (f"[design.loss] rate_events = 1.0: {SHARE}",)),
    (lambda: Loss(0.1, -0.1), (f"[design.loss] rate_others = -0.1: {SHARE}",)),
    (
        lambda: Loss(0.1, 0.1, "event"),
        ("[design.loss] unknown treat_as 'event': did you mean \"events\"?",),
    ),
    (
        lambda: Layered(Simple(), (Loss(0.1, 0.1), Loss(0.2, 0.2))),
        ("layers = ['loss', 'loss']: expected each kind at most once: their errors would not be told apart",),
    ),
    (
        lambda: Stratified((Stratum("a", 0.5, 10), Stratum("b", 0.4, 10))),
        (f"{STRATA} sum of the weights = 0.9: expected 1",),
    ),
    (lambda: Stratified(()), (f"{STRATA} sum of the weights = 0.0: expected 1",)),
    (
        lambda: Stratified((Stratum("a", 0.5, 1), Stratum("b", 0.5, 10, 0.0))),
        (f"{STRATA} a: n = 1: expected at least 2 units", f"{STRATA} b: odds_ratio = 0.0: expected a positive number"),
    ),
    (
        lambda: Stratified((Stratum("a", -0.5, 10), Stratum("b", 1.5, 10))),
        (
            f"{STRATA} a: weight = -0.5: expected a number above 0 and at most 1",
            f"{STRATA} b: weight = 1.5: expected a number above 0 and at most 1",
        ),
    ),
]


@pytest.mark.parametrize(("make", "lines"), IMPOSSIBLE, ids=[str(lines[0])[:60] for _, lines in IMPOSSIBLE])
def test_every_fault_is_one_line(make: Callable[[], object], lines: tuple[str, ...]) -> None:
    with pytest.raises(InputFault, match=r".") as raised:
        make()
    assert raised.value.faults == lines


TWO = Stratified((Stratum("a", 0.5, 90), Stratum("b", 0.5, 10)))
UNSUITED = [
    (Finite(100), 101, (0.1, 0.2), ["[sample] n = 101: expected at most the population of 100"]),
    (
        Finite(10),
        5,
        (0.11, 0.19),
        ["[outcome] range = [0.11, 0.19]: expected a reachable proportion, like 0.2"],
    ),
    (
        Clustered(25, 0.1),
        20,
        (0.1, 0.2),
        ["[sample] n = 20: expected at least 2 clusters: one alone shows no variance between clusters"],
    ),
    (
        Clustered((30,), 0.1),
        30,
        (0.1, 0.2),
        ["[sample] n = 30: expected at least 2 clusters: one alone shows no variance between clusters"],
    ),
    (
        Clustered((5, 6, 7), 0.1),
        20,
        (0.1, 0.2),
        ["[sample] n = 20: expected 18, the sum of the listed cluster sizes"],
    ),
    (
        Clustered(10, 0.1, population=100),
        200,
        (0.1, 0.2),
        ["[sample] n = 200: expected at most the population of 100"],
    ),
    (TWO, 10, (0.1, 0.2), ["[design.strata] b: n of 10 = 1: expected at least 2 units"]),
    (
        Layered(Finite(10), (Loss(0.1, 0.1),)),
        11,
        (0.11, 0.19),
        [
            "[sample] n = 11: expected at most the population of 10",
            "[outcome] range = [0.11, 0.19]: expected a reachable proportion, like 0.2",
        ],
    ),
    (Simple(), 1, (0.1, 0.2), []),
    (Finite(100), 100, (0.0, 1.0), []),
    (Clustered(25, 0.1), 250, (0.1, 0.2), []),
]


@pytest.mark.parametrize(("design", "n", "between", "lines"), UNSUITED, ids=[f"{d.kind}-{n}" for d, n, *_ in UNSUITED])
def test_designs_that_do_not_suit_the_plan(
    design: object, n: int, between: tuple[float, float], lines: list[str]
) -> None:
    assert faults(design, n, *between) == lines
