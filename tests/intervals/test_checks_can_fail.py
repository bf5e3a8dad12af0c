"""The checks of values and laws catch methods that are wrong on purpose."""

from collections.abc import Callable

import numpy as np
import pytest
from test_laws import LAWS, METHODS, law_faults
from test_values import ROWS, name_of, row_fault

from coverage_lab.intervals import clopper_pearson, wilson

MUTATIONS: dict[str, Callable[[Callable], Callable]] = {
    "lower limit too high by 1e-6": lambda f: lambda x, n, tail: (f(x, n, tail)[0] + 1e-6, f(x, n, tail)[1]),
    "lower limit too low by 1e-6": lambda f: lambda x, n, tail: (f(x, n, tail)[0] - 1e-6, f(x, n, tail)[1]),
    "upper limit too high by 1e-6": lambda f: lambda x, n, tail: (f(x, n, tail)[0], f(x, n, tail)[1] + 1e-6),
    "upper limit too low by 1e-6": lambda f: lambda x, n, tail: (f(x, n, tail)[0], f(x, n, tail)[1] - 1e-6),
    "limits swapped": lambda f: lambda x, n, tail: f(x, n, tail)[::-1],
    "tail halved": lambda f: lambda x, n, tail: f(x, n, tail / 2),
    "tail doubled": lambda f: lambda x, n, tail: f(x, n, 2 * tail),
    "events and non-events confused": lambda f: lambda x, n, tail: f(n - x, n, tail),
    "one trial forgotten": lambda f: lambda x, n, tail: f(np.minimum(x, n - 1), np.maximum(n - 1, 1), tail),
}


@pytest.mark.parametrize("mutation", MUTATIONS)
@pytest.mark.parametrize("name", METHODS)
def test_a_wrong_method_is_caught_by_its_rows(name: str, mutation: str) -> None:
    wrong = MUTATIONS[mutation](METHODS[name].function)
    rows = [row for row in ROWS if row["member"] == name and int(row["trials"]) > 1]
    assert any(row_fault(row, wrong) for row in rows)


@pytest.mark.parametrize("end", ["lower", "upper"])
def test_every_derived_row_catches_a_shifted_limit_alone(end: str) -> None:
    mutations = [MUTATIONS[mutation] for mutation in MUTATIONS if mutation.startswith(end)]
    blind = [
        name_of(row)
        for row in ROWS
        for mutation in mutations
        if row["status"] == "derived" and row["side"] in ("two-sided", end)
        if not row_fault(row, mutation(METHODS[row["member"]].function))
    ]
    assert len(mutations) == 2
    assert not blind


@pytest.mark.parametrize("name", METHODS)
def test_the_fault_names_the_source(name: str) -> None:
    row = next(row for row in ROWS if row["member"] == name)
    fault = row_fault(row, lambda x, n, tail: (np.float64(0.25), np.float64(0.25)))
    assert row["source"] in fault
    assert "came 0.25 0.25, expected" in fault or row["side"] != "two-sided"


def test_no_number_is_a_fault() -> None:
    assert all(row_fault(row, lambda x, n, tail: (np.nan, np.nan)) for row in ROWS)


WRONG: dict[str, Callable] = {
    "finite": lambda x, n, tail: (wilson(x, n, tail)[0], np.where(x == n, np.nan, wilson(x, n, tail)[1])),
    "ordered": lambda x, n, tail: (clopper_pearson(x, n, tail)[0], wilson(x, n, tail)[1] / 2),
    "monotone": lambda x, n, tail: (wilson(x, n, tail)[0] * np.where(x == 3, 1e-9, 1), wilson(x, n, tail)[1]),
    "monotone-raw": lambda x, n, tail: (wilson(x, n, tail)[0] - np.where(x == 1, 0.5, 0), wilson(x, n, tail)[1]),
    "mirror": lambda x, n, tail: (clopper_pearson(x, n, tail)[0], wilson(x, n, tail)[1]),
    "nested": lambda x, n, tail: wilson(x, n, 0.3 - tail),
    "holds-estimate": lambda x, n, tail: (np.maximum(wilson(x, n, tail)[0], 1e-6), wilson(x, n, tail)[1]),
}


@pytest.mark.parametrize("law", LAWS)
def test_each_law_catches_a_method_that_breaks_it(law: str) -> None:
    sides = METHODS["wilson"].sides
    assert next(law_faults(law, WRONG[law], sides), None)
    assert next(law_faults(law, wilson, sides), None) is None


def test_truncation_tells_the_two_monotone_laws_apart() -> None:
    sides = METHODS["wilson"].sides
    assert next(law_faults("monotone", WRONG["monotone-raw"], sides), None) is None
