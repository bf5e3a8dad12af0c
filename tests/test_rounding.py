"""Numbers for people: few digits, never rounded to the flattering side, and float noise is no side."""

import pytest

from coverage_lab.rounding import percent, proportion, rounded, whole


@pytest.mark.parametrize(
    ("share", "towards", "shown"),
    [
        (0.93429, "down", "93.4 %"),
        (0.93421, "up", "93.5 %"),
        (0.95, "nearest", "95 %"),
        (0.9499999999999998, "down", "95 %"),
        (0.05 + 1e-16, "up", "5 %"),
        (0.0005, "nearest", "0.05 %"),
        (0.999995, "down", "99.9995 %"),
        (1e-16, "up", "0 %"),
        (1.0, "down", "100 %"),
        (0.0, "up", "0 %"),
    ],
)
def test_percent(share: float, towards: str, shown: str) -> None:
    assert percent(share, towards) == shown


def test_limits_go_outward() -> None:
    assert proportion(0.13910834, "up") == "0.1392"
    assert proportion(0.0040893, "down") == "0.004089"
    assert proportion(0.0, "down") == "0.0000"
    assert str(rounded(2.5, 0, "up")) == "3"


def test_whole_numbers() -> None:
    assert (whole(250), whole(9999), whole(1_000_000)) == ("250", "9999", "1\u202f000\u202f000")
