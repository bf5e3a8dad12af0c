"""The audit's answer on a terminal: the verdict and the figures behind it, in at most 25 lines."""

import shutil
import textwrap
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from coverage_lab.precision import points_up
from coverage_lab.report.words import SHORT_WIDTHS, count, how_sure, label_of, least, place, points, row_of, share
from coverage_lab.rounding import Towards, proportion
from coverage_lab.sizing.words import points as points_asked

Document = dict[str, Any]

MOST_LINES = 25
WIDEST = 110
PLAIN = "wald"  # the formula that everybody knows, and that every answer is compared with


def answer(document: Document, page: Path | None) -> list[str]:
    """The lines; `document` is the content of audit.json, `page` the report when there is one."""
    width = min(WIDEST, shutil.get_terminal_size().columns - 1)
    facts = list(_facts(document))
    longest = max(len(name) for name, _ in facts)
    lines = [*wrapped(document["verdict"]["sentence"], width), ""]
    for name, value in facts:
        lines += wrapped(f"{name:<{longest}}  {value}", max(width, longest + 30), " " * (longest + 2))
    last = [f"{'Report':<{longest}}  {page}"] if page is not None else []
    return [*lines[: MOST_LINES - len(last)], *last]


def wrapped(text: str, width: int, hanging: str = "") -> list[str]:
    """Lines of at most that width, names with hyphens unbroken."""
    return textwrap.wrap(text, width, subsequent_indent=hanging, break_on_hyphens=False)


def _facts(document: Document) -> Iterator[tuple[str, str]]:
    """What the verdict rests on, as (name, value)."""
    verdict = document["verdict"]
    n, named = verdict["n"], verdict["method"]
    row = row_of(document, named, n)
    if row is None:
        yield from _closest(document)
    else:
        yield "Method", f"{row['label']} ({named}), n = {count(n)}"
        yield "Worst interval coverage", f"{least(row)} in the planned range, {how_sure(row)}"
        yield "Mean interval coverage", share(row["mean_coverage"], "down")
        yield SHORT_WIDTHS[document["side"]].capitalize(), points(row["mean_width"])
    plain = row_of(document, PLAIN, n)
    if plain is not None and named != PLAIN and plain["minimum_coverage"] is not None:
        width = f"{SHORT_WIDTHS[document['side']]} {points(plain['mean_width'])}"
        yield plain["label"], f"would have covered {least(plain)} at worst, {how_sure(plain)}; {width}"
    yield from _one_sided(document)
    yield from _precision(document)
    yield from _sizes(document)
    yield from _checks(document)


def _closest(document: Document) -> Iterator[tuple[str, str]]:
    """When nothing is named: what came nearest."""
    closest = document["verdict"]["closest"]
    if closest:
        worst = f"{share(closest['minimum_coverage'], 'down')} at p = {place(closest['minimum_at'])}"
        name = f"{label_of(document, closest['method'])} ({closest['method']}), n = {count(closest['n'])}"
        yield "Closest, not recommended", f"{name}: worst interval coverage {worst}"


def _one_sided(document: Document) -> Iterator[tuple[str, str]]:
    """For one-sided plans the bound at the most extreme outcomes."""
    bounds = document["verdict"]["bounds_at"]
    if bounds:
        towards: Towards = "up" if document["side"] == "upper" else "down"
        said = ", ".join(f"{proportion(item['bound'], towards)} at {item['events']}" for item in bounds)
        yield "Bound by events", said


def _precision(document: Document) -> Iterator[tuple[str, str]]:
    """What the plan asks of the width, and what it gets."""
    found = document["verdict"]["precision"]
    if found is None:
        return
    what = "half-width" if document["side"] == "two-sided" else "distance from the true proportion"
    got = (
        f"expected {what} {points_up(found['expected_half_width'])} at worst, {points_asked(found['half_width'])} asked"
    )
    if found["assurance"] is not None:
        got += f"; kept to with probability {share(found['probability'], 'down')}, {share(found['assurance'])} asked"
    yield "Precision", f"{got}: {'met' if found['meets'] else 'not met'}"


def _sizes(document: Document) -> Iterator[tuple[str, str]]:
    """With several n, the verdict of each."""
    by_n = document["by_n"]
    if len(by_n) > 1:
        wide = {item["n"]: " (too wide)" for item in by_n if item["precision"] and not item["precision"]["meets"]}
        named = (f"{count(item['n'])}: {item['method'] or item['status']}{wide.get(item['n'], '')}" for item in by_n)
        yield "By n", ", ".join(named)


def _checks(document: Document) -> Iterator[tuple[str, str]]:
    """Whether the two routes agree, and the gravest caution."""
    check = document["cross_check"]
    if check is not None:
        agreement = f"largest |z| {check['largest_z']:.2f}, p = {check['p_value']:.2g}"
        yield "Cross-check", f"of the two routes: {count(check['cells'])} figures, {agreement}"
    if document["cautions"]:
        more = len(document["cautions"]) - 1
        yield "Caution", document["cautions"][0] + (f" ({more} more on the page)" if more else "")
