"""How the figures of one table are written: every column with the same decimals from top to bottom."""

import math
from collections.abc import Iterable
from dataclasses import dataclass

from coverage_lab.report.words import (
    NOTHING,
    Document,
    Row,
    place,
    place_places,
    points,
    points_at,
    points_places,
)
from coverage_lab.rounding import Towards, percent

MOST_DECIMALS = 4  # a column that would need more is written figure by figure


@dataclass(frozen=True)
class Columns:
    """Decimals of shares (coverage), of places (true proportions) and of widths; None: each figure its own."""

    shares: int
    places: int | None
    widths: int | None

    def coverage(self, value: float | None, towards: Towards = "down") -> str:
        """An interval coverage, rounded to the unflattering side."""
        return NOTHING if value is None else percent(value, towards, self.shares, fixed=True)

    def miss(self, value: float | None) -> str:
        """A miss rate, one decimal finer than a coverage."""
        return NOTHING if value is None else percent(value, "nearest", self.shares + 1, fixed=True)

    def place(self, p: float | None) -> str:
        """A true proportion."""
        return place(p) if p is None or self.places is None else percent(p, "nearest", self.places, fixed=True)

    def width(self, value: float | None) -> str:
        """A width in percentage points."""
        return points(value) if value is None or self.widths is None else points_at(value, self.widths)

    def worst(self, row: Row) -> str:
        """The worst interval coverage, with two standard errors when it was simulated."""
        figure, error = self.coverage(row["minimum_coverage"]), row["simulated"]["standard_error"]
        simulated = row["minimum_is"] == "simulated" and error is not None
        return f"{figure} ± {self.width(2 * error)}" if simulated else figure


def columns(document: Document, rows: Iterable[Row], reference: Row | None = None) -> Columns:
    """The decimals for a table of these methods' figures; widths as the reference method's is written elsewhere."""
    listed = list(rows)
    at = [place_places(row["minimum_at"]) for row in listed if row["minimum_at"] is not None]
    compared = [reference] if reference is not None and reference["mean_width"] else listed
    widths = [points_places(row["mean_width"]) for row in compared if row["mean_width"]]
    return Columns(share_decimals(document["alpha"]), common(at, 1), common(widths, 0))


def share_decimals(alpha: float) -> int:
    """Decimals of a coverage in percent: two significant digits of alpha, at least one."""
    return max(1, 1 - math.floor(math.log10(100 * alpha)))


def common(decimals: list[int], least: int) -> int | None:
    """The decimals that all figures get, or None when some figure needs too many."""
    most = max([least, *decimals])
    return most if most <= MOST_DECIMALS else None
