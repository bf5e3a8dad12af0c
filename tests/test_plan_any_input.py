"""No plan ends in a traceback: whatever a file or a mapping holds becomes a plan, or lines that say what is wrong."""

from collections.abc import Callable
from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from coverage_lab.checks import InputFault
from coverage_lab.plan import make_plan, read_plan

GOOD = """\
title = "A study"
confidence = 0.95
side = "two-sided"

[outcome]
name = "a fault"
expected = 0.02
range = [0.005, 0.05]

[sample]
n = 250

[simulation]
replicates = 1000
"""

SCALARS = (
    st.booleans()
    | st.integers()
    | st.floats()
    | st.text(max_size=5)
    | st.sampled_from(
        ["two-sided", "upper", "custom", "simple", "wilson", "blaker", "simulated", "population", 10**400]
    )
)
ANYTHING = st.recursive(
    SCALARS,
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=3), inner, max_size=2),
    max_leaves=5,
)
KEYS = {
    "study": ["population", "unit", "target", "range_basis"],
    "outcome": ["name", "expected", "range", "prior"],
    "sample": ["n", "candidates", "horizon"],
    "standard": ["kind", "worst_miss", "mean_miss"],
    "design": ["kind", "population"],
    "simulation": ["replicates", "seed", "grid", "routes"],
    "methods": ["only", "prefer"],
}
SHAPED = st.fixed_dictionaries(
    {},
    optional={
        "title": ANYTHING,
        "confidence": ANYTHING,
        "side": ANYTHING,
        "extra": ANYTHING,
        **{
            table: ANYTHING | st.fixed_dictionaries({}, optional=dict.fromkeys(keys, ANYTHING))
            for table, keys in KEYS.items()
        },
    },
)


def lines_of_faults(ask: Callable[[], object]) -> tuple[str, ...]:
    """The faults, or none; whatever else is raised fails the test."""
    try:
        ask()
    except InputFault as fault:
        return fault.faults
    return ()


@settings(deadline=None, max_examples=300)
@given(SHAPED)
def test_no_mapping_ends_in_a_traceback(mapping: dict) -> None:
    for line in lines_of_faults(lambda: make_plan(mapping)):
        assert line
        assert "\n" not in line


@settings(deadline=None, max_examples=200, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(
    cut=st.integers(0, len(GOOD)),
    end=st.integers(0, len(GOOD)),
    new=st.text(max_size=6) | st.sampled_from(list("[]=#\"'")),
)
def test_no_mangled_file_ends_in_a_traceback(cut: int, end: int, new: str, tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    path.write_text(GOOD[:cut] + new + GOOD[max(cut, end) :], encoding="utf-8", errors="surrogatepass")
    for line in lines_of_faults(lambda: read_plan(path)):
        assert line.startswith(str(path))


@settings(deadline=None, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(content=st.binary(max_size=60))
def test_no_bytes_end_in_a_traceback(content: bytes, tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    path.write_bytes(content)
    with pytest.raises(InputFault, match=r"plan\.toml: expected|plan\.toml:\d+: "):
        read_plan(path)
