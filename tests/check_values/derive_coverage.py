"""Coverage by another route than the code under test: the limits of derive.py, binomial sums, no grid, 50 digits.

Run as a script it compares every published row of coverage.csv with its own result, and rewrites the derived rows.
"""

import csv
import sys
from collections.abc import Iterator
from functools import cache
from itertools import pairwise
from pathlib import Path

from definitions import METHODS
from derive import ONLY_ONE_SIDED, SOURCE, limits
from mpmath import mpf, nstr
from precise import Pair, at_least, chance

FILE = Path(__file__).with_name("coverage.csv")
SAME = 1 + mpf(10) ** -13  # end points nearer than this, relatively, are one: exact tables share them


@cache
def truncated(name: str, n: int, tail: mpf) -> tuple[Pair, ...]:
    """Every interval for n trials, held in [0, 1]."""
    return tuple(tuple(min(max(v, mpf(0)), mpf(1)) for v in limits(name, x, n, tail)) for x in range(n + 1))


def point(name: str, n: int, p: mpf, tail: mpf) -> mpf:
    """P(L <= p <= U)."""
    return sum((chance(x, n, p) for x, (low, high) in enumerate(truncated(name, n, tail)) if low <= p <= high), mpf(0))


def mean(name: str, n: int, a: mpf, b: mpf, tail: mpf) -> mpf:
    """Coverage averaged over p uniform on [a, b]; the integral of b(x; n, p) is P(Bin(n + 1, p) > x) / (n + 1)."""

    def area(x: int, p: mpf) -> mpf:
        return at_least(x + 1, n + 1, p) / (n + 1) if 0 < p < 1 else p / (n + 1)

    held = [(min(max(low, a), b), min(max(high, a), b)) for low, high in truncated(name, n, tail)]
    return sum((area(x, high) - area(x, low) for x, (low, high) in enumerate(held)), mpf(0)) / (b - a)


def infimum(name: str, n: int, a: mpf, b: mpf, tail: mpf) -> mpf:
    """Least coverage on [a, b]: both ends of each stretch between end points; the covering events are a run there."""
    if n > 10**4:
        return _infimum_near_zero(name, n, tail)
    table = truncated(name, n, tail)
    ends = [a]
    for p in sorted({v for pair in table for v in pair if a < v < b} | {b}):
        if p > ends[-1] * SAME:
            ends.append(p)
    least = mpf(1)
    for left, right in pairwise(ends):
        covering = [x for x, (low, high) in enumerate(table) if low <= (left + right) / 2 <= high]
        assert covering == list(range(covering[0], covering[-1] + 1)) if covering else True, "not a run"
        least = min(least, *(sum((chance(x, n, p) for x in covering), mpf(0)) for p in (left, right)))
    return least


def _infimum_near_zero(name: str, n: int, tail: mpf) -> mpf:
    """Just left of L(x), x = 1 .. 20, where x has not come in yet, and some fewer events have gone out."""
    table = [limits(name, x, n, tail) for x in range(21)]
    lows = [table[x][0] for x in range(1, 21)]
    return min(sum(chance(k, n, p) for k in range(x) if p <= table[k][1]) for x, p in enumerate(lows, start=1))


def computed(line: dict[str, str]) -> mpf:
    """The quantity that a row of coverage.csv asks for."""
    name, n, a, b = line["member"], int(line["n"]), mpf(line["p_low"]), mpf(line["p_high"])
    tail = (1 - mpf(line["confidence"])) / 2
    if line["quantity"] == "point":
        return point(name, n, a, tail)
    return {"mean": mean, "infimum": infimum}[line["quantity"]](name, n, a, b, tail)


def derived_rows() -> Iterator[dict[str, str]]:
    """All three quantities of every two-sided method, for 10 and 29 trials on one planned range."""
    for name in METHODS:
        for n in (10, 29) if name not in ONLY_ONE_SIDED else ():
            for quantity, a, b in (("point", "0.13", "0.13"), ("mean", "0.05", "0.3"), ("infimum", "0.05", "0.3")):
                asked = {"quantity": quantity, "member": name, "n": str(n), "p_low": a, "p_high": b}
                asked["confidence"] = "0.95"
                answer = {"expected": nstr(computed(asked), 16), "tolerance": "1e-11"}
                yield asked | answer | {"source": SOURCE, "status": "derived"}


def main() -> None:
    """Check the published rows, then rewrite the derived ones."""
    with FILE.open(newline="", encoding="utf-8") as file:
        published = [line for line in csv.DictReader(file) if line["status"] != "derived"]
    for line in published:
        came = computed(line)
        if abs(came - mpf(line["expected"])) > mpf(line["tolerance"]):
            sys.stderr.write(f"{list(line.values())}: came {nstr(came, 12)}\n")
    with FILE.open("w", newline="", encoding="utf-8") as file:
        writer = csv.DictWriter(file, list(published[0]), lineterminator="\n")
        writer.writeheader()
        writer.writerows([*published, *derived_rows()])


if __name__ == "__main__":
    main()
