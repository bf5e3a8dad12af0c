"""Check values by another route than the code under test: mpmath, literal definitions, plain root finding.

`limits(name, x, n, tail)` gives the (lower, upper) of one method as its definition states them, untruncated. It shares
nothing with the package: no import, hardly a closed form, one interval at a time, slowly, with 50 digits of which 40
are good. Run as a script it rewrites the derived rows of intervals.csv, in three to five minutes, and leaves the
published ones alone.
"""

import csv
import sys
from collections.abc import Iterator
from pathlib import Path

from definitions import METHODS
from mpmath import mpf, nstr
from precise import Pair

FILE = Path(__file__).with_name("intervals.csv")
SOURCE = "definition, mpmath with 50 digits"
ONLY_TWO_SIDED = ("blaker", "shortest-exact", "sterne", "jeffreys-hpd")
ONLY_ONE_SIDED = ("second-order",)
# (events, trials, confidence): where the acceptance regions have gaps, and the smallest n of rules with clauses
SPECIAL = {
    "blaker": [(1, 31, "0.95"), (0, 21, "0.90"), (2, 27, "0.99")],
    "sterne": [(1, 30, "0.95"), (0, 18, "0.90"), (2, 27, "0.99")],
    "jeffreys-modified": [(0, 1, "0.95"), (1, 1, "0.95"), (1, 2, "0.95")],
    "wilson-cc": [(0, 1, "0.95")],
    "jeffreys-hpd": [(1, 1, "0.95")],
    "shortest-exact": [(0, 1, "0.95"), (10, 10, "0.945")],
}


def limits(name: str, x: int, n: int, tail: mpf) -> Pair:
    """(lower, upper) of the method for x events in n trials with error probability `tail` per side."""
    return METHODS[name](x, n, tail)


def _inputs(name: str) -> Iterator[tuple[int, int, str, str]]:
    """(events, trials, confidence, side) of a method's derived rows: ends, their neighbours, a middle; three tails."""
    for n in (10, 29) if name == "shortest-exact" else (10, 250, 10**6):
        middle = 3 * n // 10 + 5 * (n == 250)
        both = "upper" if name in ONLY_ONE_SIDED else "two-sided"
        upper, lower = ("two-sided", "two-sided") if name in ONLY_TWO_SIDED else ("upper", "lower")
        usual, wide, strict = ("0.975", "0.95", "0.9999995") if both == "upper" else ("0.95", "0.90", "0.999999")
        yield from ((x, n, usual, both) for x in (0, 1, middle, n - 1, n)[: 4 if n == 10**6 else 5])
        yield from ((x, n, strict, both) for x in (1, middle, n - 1))
        yield 1, n, wide, both
        yield n, n, "0.90" if lower == "two-sided" else "0.95", lower
        if n < 10**6:
            yield 0, n, "0.90" if upper == "two-sided" else "0.95", upper
            yield middle, n, wide, "lower" if both == "upper" else both
    yield from ((x, n, confidence, "two-sided") for x, n, confidence in SPECIAL.get(name, []))


def row(name: str, x: int, n: int, confidence: str, side: str) -> dict[str, str]:
    """One derived row."""
    alpha = 1 - mpf(confidence)
    lower, upper = limits(name, x, n, alpha / 2 if side == "two-sided" else alpha)
    lower, upper = mpf(0) if side == "upper" else lower, mpf(1) if side == "lower" else upper
    return {
        "member": name, "events": str(x), "trials": str(n), "confidence": confidence, "side": side,
        "lower": nstr(lower, 22), "upper": nstr(upper, 22),
        "tolerance": "1e-10", "kind": "relative",
        "source": SOURCE, "status": "derived",
    }  # fmt: skip


def derived_rows() -> Iterator[dict[str, str]]:
    """Every derived row, method by method. Sterne with a wide middle takes hours at n = 1e6, and is left out."""
    for name in METHODS:
        for x, n, confidence, side in _inputs(name):
            if not (name == "sterne" and 1 < x < n - 1 and n == 10**6):
                yield row(name, x, n, confidence, side)


def main() -> None:
    """Rewrite the derived rows of intervals.csv, after the published ones."""
    with FILE.open(newline="", encoding="utf-8") as file:
        published = [line for line in csv.DictReader(file) if line["status"] != "derived"]
    rows = published + list(derived_rows())
    with FILE.open("w", newline="", encoding="utf-8") as file:
        writer = csv.DictWriter(file, list(published[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows(rows)
    sys.stderr.write(f"{len(rows) - len(published)} rows derived, {len(published)} published rows kept\n")


if __name__ == "__main__":
    main()
