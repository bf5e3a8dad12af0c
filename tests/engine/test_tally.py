"""Tallies of many columns: strata, estimates that are functions of counts, keys wider than 64 bits."""

import numpy as np
import pytest

from coverage_lab.engine.tally import merged, restricted, simulated, tally, union
from coverage_lab.records import Columns

RNG = np.random.default_rng(1)
SIZE = 3000


def rows_of(columns: Columns, size: int) -> list[tuple]:
    """Every sample as one flat tuple."""
    flat = [np.broadcast_to(v, (size, *v.shape[1:])).reshape(size, -1) for _, v in sorted(columns.items())]
    return [tuple(row) for row in np.hstack([np.asarray(part, dtype=float) for part in flat])]


POSITIVE = RNG.binomial(20, 0.8, SIZE)
CASES: dict[str, Columns] = {
    "whole numbers": {"events": RNG.binomial(9, 0.3, SIZE), "others": RNG.binomial(5, 0.3, SIZE)},
    "a column on a line with another": {
        "events": POSITIVE,
        "by_size": 10 * POSITIVE - 3,
        "squares": POSITIVE * POSITIVE,
        "trials": np.array([20]),
    },
    "strata": {
        "stratum_events": RNG.binomial(3, 0.4, (SIZE, 3)),
        "stratum_trials": np.array([[3, 3, 3]]),
        "weights": np.array([[0.2, 0.3, 0.5]]),
    },
    "estimates beside their counts": {
        "positive": POSITIVE,
        "sensitivity": POSITIVE / 20,
        "events": RNG.binomial(4, 0.5, SIZE),
    },
    "estimates alone": {"sensitivity": POSITIVE / 20, "specificity": RNG.binomial(7, 0.5, SIZE) / 7},
    "wider than 64 bits": {
        name: RNG.integers(0, 2, SIZE) * 10**k + RNG.integers(0, 2, SIZE)
        for name, k in zip("abcdefg", range(6, 13), strict=True)
    },
    "a hidden difference": {"events": POSITIVE, "other": POSITIVE // 2 + (RNG.random(SIZE) < 0.01)},
    "one value": {"events": np.full(SIZE, 7), "trials": np.array([9])},
}


@pytest.mark.parametrize("name", CASES)
def test_equal_samples_are_counted_once_and_no_others(name: str) -> None:
    columns = CASES[name]
    wanted: dict[tuple, int] = {}
    for row in rows_of(columns, SIZE):
        wanted[row] = wanted.get(row, 0) + 1
    distinct, counts = tally(columns)
    found = rows_of(distinct, len(counts))
    assert len(set(found)) == len(found)
    assert dict(zip(found, counts.tolist(), strict=True)) == wanted
    assert all(distinct[key].dtype == columns[key].dtype for key in columns)


@pytest.mark.parametrize("name", CASES)
def test_a_tally_in_shares_is_the_tally_of_all(name: str) -> None:
    columns = CASES[name]
    whole = dict(zip(rows_of(tally(columns)[0], len(tally(columns)[1])), tally(columns)[1].tolist(), strict=True))
    cuts = [slice(0, 1000), slice(1000, 1001), slice(1001, SIZE)]
    shares = [tally({key: v[cut] if len(v) > 1 else v for key, v in columns.items()}) for cut in cuts]
    distinct, counts = merged(shares)
    assert dict(zip(rows_of(distinct, len(counts)), counts.tolist(), strict=True)) == whole


@pytest.mark.parametrize("name", CASES)
def test_a_union_says_where_every_sample_stands(name: str) -> None:
    columns = CASES[name]
    cuts = [slice(0, 700), slice(500, 1500)]
    lists = [{key: v[cut] if len(v) > 1 else v for key, v in columns.items()} for cut in cuts]
    together, places = union(lists)
    rows = rows_of(together, max(len(v) for v in together.values()))
    assert len(set(rows)) == len(rows)
    for columns_of, place, size in zip(lists, places, (700, 1000), strict=True):
        assert [rows[k] for k in place] == rows_of(columns_of, size)


def test_draws_are_told_apart_by_some_columns_only() -> None:
    columns = CASES["estimates beside their counts"]
    outcomes = simulated(*tally(columns))
    fewer = restricted(outcomes, ["events"])
    assert fewer.draws == SIZE
    assert np.rint(fewer.weight * SIZE).tolist() == np.bincount(columns["events"]).tolist()
    assert restricted(outcomes, list(columns)) is outcomes
    constant = restricted(simulated(*tally({**columns, "trials": np.array([4])})), ["trials"])
    assert constant.weight.tolist() == [1.0]
    assert constant.draws == SIZE
