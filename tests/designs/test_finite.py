"""Finite populations: every count of events, the census, the methods by brute force with exact fractions."""

import math
from fractions import Fraction
from math import comb

import numpy as np
import pytest

from coverage_lab.designs import Classification, Finite, Layered, Loss
from coverage_lab.engine.attained import minimum_at
from coverage_lab.engine.bounds import evaluate
from coverage_lab.engine.exact import figures, listed, minimum_of
from coverage_lab.engine.means import Range
from coverage_lab.engine.minimum import Piece
from coverage_lab.intervals import CATALOGUE, EVERY
from coverage_lab.probability_finite import reachable

FINITE = ("wilson-fpc", "hypergeometric-exact", "hypergeometric-mid-p", "wald-fpc")
TAIL = 0.025


def chance(x: int, n: int, population: int, marked: int) -> Fraction:
    if not (0 <= x <= marked and 0 <= n - x <= population - marked):
        return Fraction(0)
    return Fraction(comb(marked, x) * comb(population - marked, n - x), comb(population, n))


def covering(lower: np.ndarray, upper: np.ndarray, n: int, population: int, marked: int) -> float:
    p = marked / population
    return float(sum(chance(x, n, population, marked) for x in range(n + 1) if lower[x] <= p <= upper[x]))


@pytest.mark.parametrize(("n", "population"), [(1, 1), (1, 7), (1, 40), (2, 80), (5, 9), (10, 50), (20, 20)])
@pytest.mark.parametrize("tail", [Fraction(1, 40), Fraction(1, 10), Fraction(1, 100), Fraction(1, 7)])
def test_exact_counts_by_fractions(n: int, population: int, tail: Fraction) -> None:
    """Ties included: with N = 40·n a tail of 1/40 is attained exactly, and does not count as more."""
    columns = np.arange(n + 1), np.array([n]), np.array([population])
    exact = EVERY["hypergeometric-exact"].function(*columns, float(tail))
    mid = EVERY["hypergeometric-mid-p"].function(*columns, float(tail))
    marks = range(population + 1)
    for k in range(n + 1):
        above = [sum(chance(j, n, population, m) for j in range(k, n + 1)) for m in marks]
        point = [chance(k, n, population, m) for m in marks]
        inside = [m for m in marks if above[m] > tail and 1 - above[m] + point[m] > tail]
        assert [float(limit[k]) for limit in exact] == [inside[0] / population, inside[-1] / population]
        halves = [m for m in marks if above[m] - point[m] / 2 > tail and 1 - above[m] + point[m] / 2 > tail]
        assert [float(limit[k]) for limit in mid] == [halves[0] / population, halves[-1] / population]


@pytest.mark.parametrize(("n", "population"), [(5, 9), (12, 30), (40, 41)])
@pytest.mark.parametrize("method", [*FINITE, "wald", "logit"])
def test_the_minimum_is_that_of_all_counts(n: int, population: int, method: str) -> None:
    """Stretches and tables against a sum of exact fractions at every count of events."""
    columns = {"events": np.arange(n + 1), "trials": np.array([n]), "population": np.array([population])}
    limits = evaluate(EVERY[method], columns, "two-sided", TAIL)
    wanted = [covering(limits.lower, limits.upper, n, population, m) for m in range(population + 1)]
    parts = listed(Finite(population), [EVERY[method]], n, (0.0, 1.0), "two-sided", TAIL)
    found = minimum_of(parts, 0, 0.0, 1.0)
    assert found.certified
    assert found.coverage == pytest.approx(min(wanted), abs=1e-13)
    assert wanted[round(found.at * population)] == pytest.approx(min(wanted), abs=1e-13)
    means = figures(parts, Range(0.0, 1.0, (1.0, 1.0)), "two-sided")[0]
    weights = np.full(population + 1, 1 / population)
    weights[[0, -1]] /= 2  # the ends of the range are nearest to half as much
    assert means["mean_coverage"] == pytest.approx(weights @ wanted, abs=1e-12)


@pytest.mark.parametrize("seed", range(6))
def test_disordered_limits_and_mixtures(seed: int) -> None:
    """Covering sets that are no runs, and two pieces: against every point, with and without tables of tails."""
    rng = np.random.default_rng(seed)
    population, sizes = 300, (12, 17)
    pieces = []
    for n, weight in zip(sizes, (0.4, 0.6), strict=True):
        lower, upper = (np.clip(x, 0, 1) for x in CATALOGUE["wilson"].function(np.arange(n + 1), np.array([n]), TAIL))
        if seed % 2:
            rows = rng.permutation(n + 1)[:3]
            lower[rows], upper[rows] = lower[np.sort(rows)], upper[np.sort(rows)]
        pieces.append(Piece(n, weight, 0, lower, upper, population=population))
    points = reachable(population, 0.01, 0.4)
    wanted = [
        sum(
            piece.weight * covering(piece.lower, piece.upper, piece.trials, population, round(p * population))
            for piece in pieces
        )
        for p in points
    ]
    found = minimum_at(pieces, points)
    assert found.coverage == pytest.approx(min(wanted), abs=1e-12)


def test_a_large_population_is_answered_without_tables() -> None:
    """Ten million units, 450 000 possible truths: certified, and the exact method keeps its promise."""
    parts = listed(Finite(10**7), [EVERY["hypergeometric-exact"]], 200, (0.005, 0.05), "two-sided", TAIL)
    found = minimum_of(parts, 0, 0.005, 0.05)
    assert found.certified
    assert 0.95 <= found.coverage < 0.96
    assert found.at * 10**7 == pytest.approx(round(found.at * 10**7), abs=1e-6)


@pytest.mark.parametrize(("n", "population"), [(3, 8), (15, 40), (50, 300)])
def test_the_exact_method_keeps_its_promise_at_every_count(n: int, population: int) -> None:
    """Limits and truths come from one division: an end point that is attained covers itself."""
    parts = listed(Finite(population), [EVERY["hypergeometric-exact"]], n, (0.0, 1.0), "two-sided", TAIL)
    assert minimum_of(parts, 0, 0.0, 1.0).coverage >= 0.95


@pytest.mark.parametrize("method", ["wilson-fpc", "hypergeometric-exact", "hypergeometric-mid-p", "wald-fpc"])
def test_a_census_knows(method: str) -> None:
    x = np.arange(31)
    lower, upper = EVERY[method].function(x, np.array([30]), np.array([30]), TAIL)
    assert lower.tolist() == upper.tolist() == (x / 30).tolist()
    over = Range(0.0, 1.0, (1.0, 1.0))
    row = figures(listed(Finite(30), [EVERY[method]], 30, (0.0, 1.0), "two-sided", TAIL), over, "two-sided")[0]
    assert row["minimum_coverage"] == 1
    assert row["mean_width"] == 0


def test_truths() -> None:
    assert Finite(400).settle(0.1, 50) == (0.1, 50)
    assert Finite(7).settle(0.5, 3) == (4 / 7, 3)  # halves up
    assert Finite(7).settle(0.0, 3) == (0.0, 3)
    assert Finite(7).points(0.1, 0.5, 3).tolist() == [1 / 7, 2 / 7, 3 / 7]
    assert Finite(7).points(0.01, 0.1, 3).tolist() == []
    assert Finite(math.inf).points(0.1, 0.5, 3) is None
    assert Finite(math.inf).settle(0.123, 3) == (0.123, 3)


@pytest.mark.parametrize(
    "layers", [(Loss(0.2, 0.1),), (Classification(0.9, 0.8),), (Loss(0.1, 0.1), Classification(0.9, 0.8))]
)
def test_laws_under_layers_by_brute_force(layers: tuple) -> None:
    """Six of nine units, four of the nine events: every state of the sample, every fate of a unit."""
    design = Layered(Finite(9), layers)
    wanted: dict[tuple[int, int], float] = {}
    for k in range(7):
        of_sample = float(chance(k, 6, 9, 4))
        kinds = [design.lens.event] * k + [design.lens.other] * (6 - k)
        joint = {(0, 0): 1.0}
        for row in kinds:
            grown: dict[tuple[int, int], float] = {}
            for (x, y), weight in joint.items():
                for step, share in zip(((1, 0), (0, 1), (0, 0)), row, strict=True):
                    key = x + step[0], y + step[1]
                    grown[key] = grown.get(key, 0.0) + weight * share
            joint = grown
        for key, weight in joint.items():
            wanted[key] = wanted.get(key, 0.0) + of_sample * weight
    law = design.law(4 / 9, 6)
    x, m = np.broadcast_arrays(law.columns["events"], law.columns["trials"])
    for events, trials, weight in zip(x.tolist(), m.tolist(), law.weight, strict=True):
        assert weight == pytest.approx(wanted[events, trials - events], rel=1e-11)


def test_more_than_the_population_is_not_listed() -> None:
    assert Finite(50).law(0.1, 51) is None
    assert Finite(50).parts(51) is None
    assert Finite(50).faults(51) == ("[sample] n = 51: expected at most the population of 50",)
