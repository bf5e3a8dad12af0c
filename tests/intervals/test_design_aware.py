"""Methods that know the design: against their definitions written out cluster by cluster, and the laws they obey."""

import itertools
import math
from fractions import Fraction

import numpy as np
import pytest
from scipy import stats

from coverage_lab.designs import Classification, Clustered, Finite, Layered, Loss, Simple, Stratified, Stratum
from coverage_lab.intervals import CATALOGUE, DESIGN_AWARE, EVERY
from coverage_lab.intervals import cluster as cluster_module

NAMES = list(DESIGN_AWARE)
PLAIN_TWINS = {name: twin for name in NAMES if (twin := name.removeprefix("corrected-")) in EVERY and twin != name}
TAILS = (0.1, 0.025, 0.005, 5e-7)
STRATA = (Stratum("a", 0.5, 14), Stratum("b", 0.3, 9, 2.0), Stratum("c", 0.2, 7, 4.0))
LOSSES = Loss(0.3, 0.2)
TEST, ESTIMATED = Classification(0.9, 0.85), Classification(0.8, 0.7, 6, 5)
SAMPLES: dict[str, list] = {
    "finite population": [Finite(40), Layered(Finite(40), (LOSSES,))],
    "clusters": [Clustered(4, 0.3), Clustered((1, 2, 8, 9, 10), 0.3), Layered(Clustered(3, 0.6), (Loss(0.7, 0.6),))],
    "strata": [Stratified(STRATA), Layered(Stratified(STRATA), (Loss(0.8, 0.7),))],
}


def samples(name: str, size: int = 300) -> dict[str, np.ndarray]:
    """Columns of many samples of all sorts, those at both ends and with next to nothing left among them."""
    needs = set(EVERY[name].needs)
    family = EVERY[PLAIN_TWINS.get(name, name)].family
    frames = SAMPLES.get(family, [Simple(), Layered(Simple(), (LOSSES,))])
    found: list[dict[str, np.ndarray]] = []
    rng = np.random.default_rng(7)
    for frame in frames:
        bare, layers = (frame.frame, frame.layers) if isinstance(frame, Layered) else (frame, ())
        for test in (TEST, ESTIMATED) if needs & {"sensitivity", "diseased_tested"} else (None,):
            if "diseased_tested" in needs and test is TEST:
                continue
            design = Layered(bare, (*layers, *((test,) if test else ()))) if layers or test else bare
            for p in (0.0, 0.05, 0.5, 1.0):
                found.append(design.draw(design.settle(p, 30)[0], 30, size, rng))
    columns = {}
    for need in needs:
        parts = [np.broadcast_to(c[need], (size, *c[need].shape[1:])) for c in found]
        columns[need] = np.concatenate(parts)
    trials = np.concatenate([np.broadcast_to(c["trials"], (size,)) for c in found])
    return {need: values[trials > 0] for need, values in columns.items()}


def limits(name: str, columns: dict[str, np.ndarray], tail: float) -> tuple[np.ndarray, np.ndarray]:
    return EVERY[name].function(*(columns[need] for need in EVERY[name].needs), tail)


@pytest.mark.parametrize("name", NAMES)
@pytest.mark.parametrize("tail", TAILS)
def test_limits_are_numbers_in_order(name: str, tail: float) -> None:
    columns = samples(name)
    lower, upper = limits(name, columns, tail)
    assert np.isfinite(lower).all()
    assert np.isfinite(upper).all()
    if "two-sided" in EVERY[name].sides:
        assert (lower <= upper).all()


@pytest.mark.parametrize("name", NAMES)
def test_more_confidence_is_wider_unless_exempt(name: str) -> None:
    columns = samples(name)
    pairs = [[np.clip(limit, 0, 1) for limit in limits(name, columns, tail)] for tail in TAILS]
    nested = [
        (outer[0] <= inner[0] + 1e-11).all() and (outer[1] >= inner[1] - 1e-11).all()
        for inner, outer in itertools.pairwise(pairs)
    ]
    assert all(nested) == ("nested" not in EVERY[name].exemptions)


def mirrored(columns: dict[str, np.ndarray]) -> dict[str, np.ndarray]:
    """Every event a non-event and the other way round; a test's two chances change places with them."""
    found = dict(columns)
    if "events" in columns:
        found["events"] = columns["trials"] - columns["events"]
    if "events_squared" in columns:
        found["events_squared"] = columns["sizes_squared"] - 2 * columns["events_by_size"] + columns["events_squared"]
        found["events_by_size"] = columns["sizes_squared"] - columns["events_by_size"]
    if "stratum_events" in columns:
        found["stratum_events"] = columns["stratum_trials"] - columns["stratum_events"]
    for one, other in (("sensitivity", "specificity"), ("diseased_tested", "healthy_tested")):
        if one in columns:
            found[one], found[other] = columns[other], columns[one]
    if "diseased_positive" in columns:
        found["diseased_positive"], found["healthy_negative"] = (
            columns["healthy_negative"],
            columns["diseased_positive"],
        )
    return found


@pytest.mark.parametrize("name", NAMES)
def test_events_and_others_are_treated_alike(name: str) -> None:
    columns = samples(name)
    lower, upper = limits(name, columns, 0.025)
    turned = limits(name, mirrored(columns), 0.025)
    scale = 1e-9 * np.maximum(1, np.abs(upper))
    assert (np.abs(lower - (1 - turned[1])) <= scale).all()
    assert (np.abs(upper - (1 - turned[0])) <= scale).all()


# --- definitions, written out ---------------------------------------------------------------------------------------
def cluster_sample(seed: int) -> tuple[np.ndarray, np.ndarray]:
    rng = np.random.default_rng(seed)
    m = rng.integers(1, 12, int(rng.integers(2, 15)))
    return rng.binomial(m, rng.beta(0.5, 2.0, len(m))), m


def literal(name: str, x: np.ndarray, m: np.ndarray, tail: float) -> tuple[float, float]:
    """The definition, cluster by cluster, with scipy's distributions."""
    k, n = len(m), m.sum()
    p = x.sum() / n
    v = k / (k - 1) * ((x - p * m) ** 2).sum() / n**2
    flat = Fraction(int(x.sum()), int(n)) in (0, 1) or all(
        a * int(n) == int(x.sum()) * b for a, b in zip(x, m, strict=True)
    )
    t = stats.t.isf(tail, k - 1)
    if name == "cluster-wald":
        return p - t * math.sqrt(v), p + t * math.sqrt(v)
    if name == "cluster-logit" and 0 < p < 1:
        centre, reach = math.log(p / (1 - p)), t * math.sqrt(v) / (p * (1 - p))
        return 1 / (1 + math.exp(reach - centre)), 1 / (1 + math.exp(-reach - centre))
    size = n if flat else p * (1 - p) / v
    if name == "wilson-deff-estimated":
        middle, reach = p + t * t / 2 / size, t * math.sqrt(p * (1 - p) / size + t * t / 4 / size**2)
        return (middle - reach) / (1 + t * t / size), (middle + reach) / (1 + t * t / size)
    size = size if flat else size * (stats.t.isf(tail, n - 1) / t) ** 2
    y = size * p
    lower = stats.beta.ppf(tail, y, size - y + 1) if p > 0 else 0.0
    return lower, stats.beta.isf(tail, y + 1, size - y) if p < 1 else 1.0


ESTIMATED_METHODS = ("cluster-wald", "cluster-logit", "korn-graubard", "wilson-deff-estimated")


@pytest.mark.parametrize("name", ESTIMATED_METHODS)
@pytest.mark.parametrize("seed", range(25))
def test_clusters_by_definition(name: str, seed: int) -> None:
    x, m = cluster_sample(seed)
    columns = (x.sum(), m.sum(), len(m), (x * x).sum(), (x * m).sum(), (m * m).sum())
    came = EVERY[name].function(*(np.array([value]) for value in columns), 0.025)
    assert [float(limit[0]) for limit in came] == pytest.approx(literal(name, x, m, 0.025), rel=1e-9, abs=1e-12)


@pytest.mark.parametrize("name", ESTIMATED_METHODS)
@pytest.mark.parametrize("shares", [(0, 0, 0), (1, 1, 1), (0.5, 0.5, 0.5)], ids=["none", "all", "the same share"])
def test_without_variance_the_design_effect_is_one(name: str, shares: tuple[float, ...]) -> None:
    """Decided on whole numbers: thirds and sevenths that no float holds count as the same share."""
    m = np.array([2, 4, 6])
    x = (m * np.array(shares)).astype(int)
    columns = (x.sum(), 12, 3, (x * x).sum(), (x * m).sum(), (m * m).sum())
    lower, upper = (float(limit[0]) for limit in EVERY[name].function(*(np.array([c]) for c in columns), 0.025))
    exact = [float(limit) for limit in CATALOGUE["clopper-pearson"].function(x.sum(), 12, 0.025)]
    if name == "korn-graubard" or (name == "cluster-logit" and shares[0] != 0.5):
        assert [lower, upper] == exact
    elif name == "wilson-deff-estimated":
        assert [lower, upper] == pytest.approx(literal(name, x, m, 0.025), rel=1e-12)
    else:
        assert lower == pytest.approx(upper) == pytest.approx(x.sum() / 12)


@pytest.mark.parametrize(("x", "m"), [((1, 2, 3), (3, 6, 9)), ((1, 1), (7, 7)), ((10**5 - 1, 10**5), (10**5, 10**5))])
def test_variance_is_exact_where_floats_would_cancel(x: tuple[int, ...], m: tuple[int, ...]) -> None:
    """Against fractions; clusters of 100 000 units go beyond 64 bits."""
    k, total, n = len(m), sum(x), sum(m)
    p = Fraction(total, n)
    exact = Fraction(k, k - 1) * sum((a - p * b) ** 2 for a, b in zip(x, m, strict=True)) / n**2
    columns = (total, n, k, sum(a * a for a in x), sum(a * b for a, b in zip(x, m, strict=True)), sum(b * b for b in m))
    came = float(cluster_module._variance(*(np.array([c]) for c in columns))[0])
    assert came == pytest.approx(float(exact), rel=1e-14, abs=0)
    assert (came == 0) == (exact == 0)


def test_one_cluster_says_nothing_about_the_variance() -> None:
    for name in ESTIMATED_METHODS:
        lower, upper = EVERY[name].function(*(np.array([c]) for c in (3, 10, 1, 9, 30, 100)), 0.025)
        assert [float(lower[0]), float(upper[0])] == [0.0, 1.0]


@pytest.mark.parametrize("seed", range(10))
def test_planned_design_effects(seed: int) -> None:
    """1 + ((1 + cv²)·mean - 1)·ICC with the variance of the sizes over k, not k - 1."""
    x, m = cluster_sample(seed)
    deff = 1 + ((1 + m.var() / m.mean() ** 2) * m.mean() - 1) * 0.07
    for name, twin in (("wilson-deff-planned", "wilson"), ("clopper-pearson-deff-planned", "clopper-pearson")):
        came = EVERY[name].function(x.sum(), m.sum(), (m * m).sum(), 0.07, 0.025)
        wanted = CATALOGUE[twin].function(x.sum() / deff, m.sum() / deff, 0.025)
        assert [float(limit) for limit in came] == pytest.approx([float(limit) for limit in wanted], rel=1e-12)


@pytest.mark.parametrize("seed", range(10))
def test_strata_by_definition(seed: int) -> None:
    rng = np.random.default_rng(seed)
    n = rng.integers(2, 30, 4)
    x, w = rng.binomial(n, 0.3), rng.dirichlet(np.ones(4))
    share = x / n
    p, v = (w * share).sum(), (w**2 * share * (1 - share) / (n - 1)).sum()
    z = stats.norm.isf(0.025)
    size = p * (1 - p) / v if v > 0 else n.sum()
    ratio = stats.t.isf(0.025, n.sum() - 1) / stats.t.isf(0.025, n.sum() - 4) if v > 0 else 1.0
    wanted = {
        "stratified-wald": (p - z * math.sqrt(v), p + z * math.sqrt(v)),
        "stratified-wilson": CATALOGUE["wilson"].function(p * size, size, 0.025),
        "stratified-korn-graubard": CATALOGUE["clopper-pearson"].function(p * size * ratio**2, size * ratio**2, 0.025),
    }
    for name, pair in wanted.items():
        came = EVERY[name].function(x[None], n[None], w[None], 0.025)
        assert [float(limit[0]) for limit in came] == pytest.approx(
            [float(limit) for limit in pair], rel=1e-9, abs=1e-12
        )


def test_an_empty_stratum_is_left_out() -> None:
    """The others' weights are raised in proportion."""
    w = np.array([[0.5, 0.3, 0.2]])
    for name in ("stratified-wald", "stratified-wilson", "stratified-korn-graubard"):
        three = EVERY[name].function(np.array([[3, 2, 0]]), np.array([[10, 12, 0]]), w, 0.025)
        two = EVERY[name].function(np.array([[3, 2]]), np.array([[10, 12]]), w[:, :2] / 0.8, 0.025)
        assert [float(limit[0]) for limit in three] == pytest.approx([float(limit[0]) for limit in two], rel=1e-12)


@pytest.mark.parametrize("name", PLAIN_TWINS)
def test_limits_are_mapped(name: str) -> None:
    columns = samples(name)
    lower, upper = limits(name, columns, 0.025)
    plain = limits(PLAIN_TWINS[name], columns, 0.025)
    se, sp = columns["sensitivity"], columns["specificity"]
    tells = se + sp - 1 > 1e-12
    gain = np.where(tells, se + sp - 1, 1.0)
    for came, apparent in zip((lower, upper), plain, strict=True):
        assert np.allclose(came[tells], ((apparent + sp - 1) / gain)[tells], rtol=1e-9, atol=1e-9)
    assert tells.any()
    assert (~tells).any(), "no sample in which the estimates tell nothing"
    assert (lower[~tells] == 0).all()
    assert (upper[~tells] == 1).all()


def test_a_test_that_tells_nothing_gives_everything() -> None:
    counts = {"diseased_positive": 3, "diseased_tested": 10, "healthy_negative": 7, "healthy_tested": 10}
    for name in ("corrected-delta", "corrected-adjusted"):
        for change in ({}, {"healthy_negative": 2}):
            values = {"events": 5, "trials": 20, **counts, **change}
            came = EVERY[name].function(*(np.array([values[need]]) for need in EVERY[name].needs), 0.025)
            assert [float(limit[0]) for limit in came] == [0.0, 1.0]


def test_estimated_test_errors_by_definition() -> None:
    x, n, a, m1, b, m0, z = 30, 200, 45, 50, 93, 100, stats.norm.isf(0.025)
    share, se, sp = x / n, a / m1, b / m0
    gain = se + sp - 1
    p = (share + sp - 1) / gain
    v = (share * (1 - share) / n + p**2 * se * (1 - se) / m1 + (1 - p) ** 2 * sp * (1 - sp) / m0) / gain**2
    came = EVERY["corrected-delta"].function(x, n, a, m1, b, m0, 0.025)
    assert [float(limit) for limit in came] == pytest.approx([p - z * v**0.5, p + z * v**0.5], rel=1e-12)
    se, sp, share = (a + 1) / (m1 + 2), (b + 1) / (m0 + 2), (x + z * z / 2) / (n + z * z)
    gain = se + sp - 1
    p = (share + sp - 1) / gain
    shift = 2 * z * z * (p * se * (1 - se) / (m1 + 2) - (1 - p) * sp * (1 - sp) / (m0 + 2))
    v = share * (1 - share) / (n + z * z) + p**2 * se * (1 - se) / (m1 + 2) + (1 - p) ** 2 * sp * (1 - sp) / (m0 + 2)
    reach = z * v**0.5 / gain
    came = EVERY["corrected-adjusted"].function(x, n, a, m1, b, m0, 0.025)
    assert [float(limit) for limit in came] == pytest.approx([p + shift - reach, p + shift + reach], rel=1e-12)


@pytest.mark.parametrize(("x", "n", "population"), [(37, 100, 500), (1, 2, 3), (0, 5, 9), (5, 5, 9), (1, 1, 4)])
def test_finite_corrections_by_definition(x: int, n: int, population: int) -> None:
    p, z = x / n, stats.norm.isf(0.025)
    error = math.sqrt((1 - n / population) * p * (1 - p) / (n - 1)) if n > 1 else 0.0
    came = EVERY["wald-fpc"].function(x, n, population, 0.025)
    assert [float(limit) for limit in came] == pytest.approx([p - z * error, p + z * error], abs=1e-13)
    size = n * (population - 1) / (population - n)
    came = EVERY["wilson-fpc"].function(x, n, population, 0.025)
    wanted = CATALOGUE["wilson"].function(p * size, size, 0.025)
    assert [float(limit) for limit in came] == pytest.approx([float(limit) for limit in wanted], abs=1e-13)


@pytest.mark.parametrize("name", NAMES)
def test_every_line_says_what_a_reader_must_know(name: str) -> None:
    method = EVERY[name]
    for field in ("label", "family", "source", "formula", "ends", "faults"):
        text = getattr(method, field)
        assert text, field
        assert text == text.strip(), field
    assert method.name == name
    assert any(year in method.source for year in ("19", "20"))
    assert len({other.label for other in EVERY.values()}) == len(EVERY)
