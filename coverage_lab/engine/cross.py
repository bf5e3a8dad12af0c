"""The cross-check of the two routes: whether the simulated counts look like draws from the enumerated law."""

from collections.abc import Sequence

import numpy as np
import pandas as pd
from scipy.special import betainc, betaincc, chdtrc

from coverage_lab.records import Array, Counts, CrossCheck, Outcomes

SMALLEST_EXPECTED = 5.0  # classes of a chi-square test are pooled until each expects this many draws (Cochran 1954)

KEYS = ["n", "p", "method"]


def paired(cells: pd.DataFrame) -> pd.DataFrame:
    """One row per n, p and method with both routes' coverage and z = (simulated - enumerated) / sqrt(C (1 - C) / R)."""
    exact = cells[cells["route"] == "enumerated"].set_index(KEYS)["coverage"]
    drawn = cells[cells["route"] == "simulated"].set_index(KEYS)[["coverage", "draws"]]
    both = drawn.join(exact.rename("enumerated"), how="inner").rename(columns={"coverage": "simulated"})
    both["z"] = z_scores(both["enumerated"].to_numpy(), both["simulated"].to_numpy(), both["draws"].to_numpy(float))
    return both.reset_index()


def z_scores(exact: Array, drawn: Array, draws: Array) -> Array:
    """Standardised differences; where the exact coverage is 0 or 1 only equality will do: 0 or infinity."""
    variance = np.maximum(exact * (1 - exact), 0.0) / draws
    difference = drawn - exact
    certain = variance < 1e-16 / draws
    scaled = difference / np.sqrt(np.where(certain, 1.0, variance))
    return np.where(certain, np.where(np.abs(difference) <= 1e-12, 0.0, np.copysign(np.inf, difference)), scaled)


def tail_chances(exact: Array, drawn: Array, draws: Array) -> Array:
    """Exact two-sided binomial p-values of the simulated miss counts: twice the smaller tail, at most 1.

    The normal approximation would cry wolf where coverage is near 1 and a handful of misses is expected.
    """
    miss = np.clip(1.0 - exact, 0.0, 1.0)
    count = np.rint((1.0 - drawn) * draws)
    at_least = np.where(count > 0, betainc(np.maximum(count, 1.0), draws - count + 1.0, miss), 1.0)
    at_most = np.where(count < draws, betaincc(count + 1.0, np.maximum(draws - count, 1.0), miss), 1.0)
    return np.minimum(1.0, 2.0 * np.minimum(at_least, at_most))


def goodness_of_fit(law: Outcomes, drawn: Outcomes, places: tuple[Counts, Counts]) -> tuple[float, int]:
    """Chi-square statistic and degrees of freedom of one cell's tally against its law; (0, 0) with a single class.

    places: where the samples of the law and of the draws stand in one common list.
    """
    draws = float(drawn.draws or 0)
    size = int(max(place.max() for place in places)) + 1
    wanted = np.bincount(places[0], law.weight * draws, size)
    seen = np.bincount(places[1], np.rint(drawn.weight * draws), size)
    order = np.argsort(-wanted, kind="stable")
    wanted, seen = wanted[order], seen[order]
    large = wanted >= SMALLEST_EXPECTED
    wanted = np.append(wanted[large], max(draws - wanted[large].sum(), 0.0))
    seen = np.append(seen[large], draws - seen[large].sum())
    if wanted[-1] < SMALLEST_EXPECTED and len(wanted) > 1:
        wanted[-2] += wanted[-1]
        seen[-2] += seen[-1]
        wanted, seen = wanted[:-1], seen[:-1]
    if len(wanted) < 2:
        return 0.0, 0
    return float(((seen - wanted) ** 2 / wanted).sum()), len(wanted) - 1


def cross_check(cells: pd.DataFrame, fits: Sequence[tuple[float, int]]) -> CrossCheck | None:
    """Agreement over all cells and methods; None when a route is absent."""
    both = paired(cells)
    if both.empty:
        return None
    columns = (both[name].to_numpy(float) for name in ("enumerated", "simulated", "draws"))
    smallest = float(tail_chances(*columns).min())
    statistic, freedom = (sum(column) for column in zip(*fits, strict=True)) if fits else (0.0, 0)
    return CrossCheck(
        cells=len(both),
        largest_z=float(np.abs(both["z"]).max()),
        p_value=min(1.0, smallest * len(both)),
        chi_square_p=float(chdtrc(freedom, statistic)) if freedom else 1.0,
    )
