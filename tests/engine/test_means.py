"""Means over a range in closed form: identities, a published table, quadrature, Beta weights."""

from itertools import pairwise

import numpy as np
import pytest
from scipy import integrate, special, stats

from coverage_lab.designs import Simple
from coverage_lab.engine.exact import listed, means_of
from coverage_lab.engine.means import Range
from coverage_lab.intervals import CATALOGUE
from coverage_lab.records import Method


def mean_coverage(method: Method, n: int, low=0.0, high=1.0, prior=(1.0, 1.0), confidence=0.95) -> float:
    parts = listed(Simple(), [method], n, (low, high), "two-sided", (1 - confidence) / 2)
    means = means_of(parts, Range(low, high, prior), "two-sided")
    return 1 - float(means["missed_below"][0] + means["missed_above"][0])


@pytest.mark.parametrize("n", [1, 5, 30, 400])
@pytest.mark.parametrize("confidence", [0.8, 0.95, 0.999])
def test_uniform_bayes_is_exact_on_average_under_its_own_prior(n: int, confidence: float) -> None:
    """A credible interval's coverage averaged over its prior is its credibility: an identity."""
    assert mean_coverage(CATALOGUE["uniform-bayes"], n, confidence=confidence) == pytest.approx(confidence, abs=1e-12)


def test_beta_quantiles_are_exact_under_the_jeffreys_prior() -> None:
    """The same identity for Beta(1/2, 1/2) with no end rule: the closed form takes Beta weights."""

    def plain(x, n, tail):
        return special.betaincinv(x + 0.5, n - x + 0.5, tail), special.betaincinv(x + 0.5, n - x + 0.5, 1 - tail)

    method = Method("plain", plain, "plain", "bayes", "identity")
    assert mean_coverage(method, 25, prior=(0.5, 0.5)) == pytest.approx(0.95, abs=1e-11)


@pytest.mark.parametrize("method", ["wald", "wilson", "blaker"])
@pytest.mark.parametrize(("low", "high", "prior"), [(0.3, 0.4, (1.0, 1.0)), (0.01, 0.2, (2.0, 30.0))])
def test_closed_form_equals_quadrature(method: str, low: float, high: float, prior: tuple[float, float]) -> None:
    n, x = 20, np.arange(21)
    member = CATALOGUE[method]
    lower, upper = (np.clip(v, 0, 1) for v in member.function(x, np.array([n]), 0.025))

    def weighed(p: float) -> float:
        covers = (lower <= p) & (p <= upper)
        return float(stats.binom.pmf(x, n, p) @ covers) * float(stats.beta.pdf(p, *prior))

    cuts = np.unique(np.concatenate([[low, high], *(v[(v > low) & (v < high)] for v in (lower, upper))]))
    total = sum(integrate.quad(weighed, a, b, epsabs=1e-13)[0] for a, b in pairwise(cuts))
    mass = stats.beta.cdf(high, *prior) - stats.beta.cdf(low, *prior)
    assert mean_coverage(member, n, low, high, prior) == pytest.approx(total / mass, abs=1e-10)


@pytest.mark.parametrize(("side", "sign"), [("upper", 1), ("lower", -1)])
def test_a_one_sided_width_is_the_signed_excess(side: str, sign: int) -> None:
    n, low, high = 30, 0.05, 0.2
    member = CATALOGUE["clopper-pearson"]
    parts = listed(Simple(), [member], n, (low, high), side, 0.05)
    mean = float(means_of(parts, Range(low, high, (1.0, 1.0)), side)["mean_width"][0])
    x = np.arange(n + 1)
    lower, upper = member.function(x, np.array([n]), 0.05)
    limit = upper if side == "upper" else lower
    excess = integrate.quad(lambda p: sign * (stats.binom.pmf(x, n, p) @ limit - p), low, high, epsabs=1e-13)[0]
    assert mean == pytest.approx(excess / (high - low), abs=1e-9)
