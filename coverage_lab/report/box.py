"""The box on the page where events are typed and the pre-specified interval is read, from interval-table.csv alone."""

from typing import Any

from coverage_lab.report.folder import Saved
from coverage_lab.report.words import count, label_of, level, limit, limit_places
from coverage_lab.rounding import Towards
from coverage_lab.sentences import OF_ZERO

MOST_ANSWERS = 20_001  # rows that the page carries: some 300 kB
TOWARDS: dict[str, Towards] = {"lower": "down", "upper": "up"}
PHRASES = {"two-sided": "LOWER to UPPER", "upper": "at most UPPER", "lower": "at least LOWER"}


def answers(saved: Saved) -> dict[str, Any] | None:
    """What the page's script needs to answer; None without a table, or where that is too long for a page.

    lower, upper: limits in percent, rounded outward, one for every events count from `first` on.
    """
    if not 0 < len(saved.table) <= MOST_ANSWERS:
        return None
    n, side = int(saved.document["verdict"]["n"]), saved.document["side"]
    return {
        "n": n,
        "first": int(saved.table["events"].iloc[0]),
        "phrase": PHRASES[side],
        "zero": OF_ZERO,
        "all": "Events throughout are not certainty: every proportion down to the lower limit stays open.",
        **{name: _limits(saved, name) for name in TOWARDS},
    }


def _limits(saved: Saved, name: str) -> str:
    """One limit of every outcome, as the table prints it, with blanks between."""
    places = limit_places(int(saved.document["verdict"]["n"]))
    return " ".join(limit(float(value), TOWARDS[name], places).removesuffix(" %") for value in saved.table[name])


def serves(saved: Saved) -> str:
    """For what the box answers: 'Wilson score, 95 % two-sided interval, n = 250 and no other n'."""
    verdict = saved.document["verdict"]
    name = label_of(saved.document, verdict["method"])
    return f"{name}, {level(saved.document)}, n = {count(verdict['n'])} and no other n"


def at_zero(saved: Saved) -> str | None:
    """The caution that belongs to the row without events, with its limit; None without that row or its limit."""
    here = saved.table[saved.table["events"] == 0]
    if here.empty or saved.document["side"] == "lower":
        return None
    upper = limit(float(here["upper"].iloc[0]), "up", limit_places(int(saved.document["verdict"]["n"])))
    return f"With 0 events the upper limit is {upper}. {OF_ZERO}"
