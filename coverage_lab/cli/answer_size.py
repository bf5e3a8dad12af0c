"""The answer to "how many?" on a terminal: the verdict and the figures behind it, in at most 25 lines."""

import shutil
from collections.abc import Iterable, Iterator, Sequence
from pathlib import Path
from typing import Any

import pandas as pd

from coverage_lab.cli.answer import MOST_LINES, PLAIN, WIDEST, wrapped
from coverage_lab.precision import points_up
from coverage_lab.records import Plan
from coverage_lab.records_sizing import Sizing, rows_of
from coverage_lab.report.words import NOTHING, count, place, share
from coverage_lab.rounding import percent, proportion
from coverage_lab.sizing.rare import bound as bound_at

Row = tuple[str, ...]

MOST_METHODS = 5
MOST_EVENTS = 6
MOST_PLANNED = 2
NAMES = 15  # columns for the name of a fact


def answer(sizing: Sizing, page: Path | None) -> list[str]:
    """The lines; `page` is the report when there is one."""
    width = min(WIDEST, shutil.get_terminal_size().columns - 1)
    last = [f"{'Report':<{NAMES}}  {page}"] if page is not None else []
    tables = [_aligned(table) for table in (_methods(sizing), _rare(sizing), _decision(sizing))]
    parts = [wrapped(sizing.verdict.sentence, width), _spelled(_units(sizing), width), *tables]
    parts.append([*_spelled(_facts(sizing), width), *last])
    lines = [line for part in parts if part for line in (*part, "")][:-1]
    if len(lines) > MOST_LINES:  # close together, and without what comes last
        lines = [line for line in lines if line]
        lines = [*lines[: MOST_LINES - len(last)], *last]
    return lines


def _spelled(facts: Iterable[tuple[str, str]], width: int) -> list[str]:
    """(name, value) as lines, values under each other."""
    lines = []
    for name, value in facts:
        lines += wrapped(f"{name:<{NAMES}}  {value}", max(width, NAMES + 30), " " * (NAMES + 2))
    return lines


def _aligned(table: Sequence[Row]) -> list[str]:
    """Rows under their headings; nothing for a table without rows."""
    if len(table) < 2:
        return []
    widths = [max(len(row[k]) for row in table) for k in range(len(table[0]))]
    return ["  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)).rstrip() for row in table]


def _shown(plan: Plan) -> list[str]:
    """The methods that the first screen has room for: those that may be named, and plus-or-minus."""
    names = [method.name for method in plan.prefer][: MOST_METHODS - 1]
    return list(dict.fromkeys([*names, PLAIN]))


def _label(plan: Plan, name: str) -> str:
    """A method as people know it."""
    known = {method.name: method.label for method in (*plan.prefer, *plan.methods)}
    return known.get(name, name)


def _methods(sizing: Sizing) -> list[Row]:
    """For each method the n that holds for every target, the first n in brackets."""
    if not sizing.by_method:
        return []
    rows = {row["method"]: row for row in rows_of(sizing.methods)}
    asked = _headings(sizing)
    headings = ("Holds from n on (first n)", "all targets", *asked.values())
    found = [
        (
            _label(sizing.plan, name),
            _two(rows[name]["safe_n"], rows[name]["first_n"]),
            *(_two(rows[name][f"{target}_safe_n"], rows[name][f"{target}_first_n"]) for target in asked),
        )
        for name in _shown(sizing.plan)
        if name in rows
    ]
    return [headings, *found]


def _word(plan: Plan) -> str:
    """What a target for the width is about."""
    return "half-width" if plan.side == "two-sided" else "distance"


def _headings(sizing: Sizing) -> dict[str, str]:
    """The targets for which some method was scanned, with their headings."""
    word = _word(sizing.plan)
    words = {"expected_width": word, "assurance": f"P({word} ≤ d)", "coverage": "coverage"}
    return {name: said for name, said in words.items() if any(by.get(name) for by in sizing.by_method.values())}


def _two(safe: int | None, first: int | None) -> str:
    """'380 (302)'; a dash where there is none."""
    return f"{NOTHING if safe is None else count(int(safe))} ({NOTHING if first is None else count(int(first))})"


def _rare(sizing: Sizing) -> list[Row]:
    """For every number of events allowed: n, the bound that it gives, and the chance of success."""
    rare = sizing.plan.rare
    if rare is None or rare.limit is None:
        return []
    hoped = f"chance at {percent(rare.hoped_for)}" if rare.hoped_for is not None else ""
    headings = (f"To rule out {percent(rare.limit)}, one-sided: events allowed", "n", "upper bound", hoped)
    found = []
    for row in rows_of(sizing.rare)[:MOST_EVENTS]:
        n, bound, chance = row["n"], row["bound"], row["probability_at_hoped_for"]
        figures = (count(int(n)), proportion(bound, "up")) if n is not None else ("none", NOTHING)
        found.append((str(row["events"]), *figures, share(chance, "down") if hoped else ""))
    return [headings, *found]


def _decision(sizing: Sizing) -> list[Row]:
    """The claim by the exact test and by the methods' own intervals: from how many events on, and how surely."""
    decided, goal = sizing.decision, sizing.plan.decision
    if decided is None or goal is None or decided.n is None or decided.critical is None:
        return []
    more = "or more" if decided.claim == "above" else "or fewer"
    first = f" (first {count(decided.found.first_n)})" if decided.found.first_n is not None else ""
    claim = f"Claim {decided.claim} {percent(goal.goal)}, n = {count(decided.n)}{first}"
    headings = (claim, "events", "wrongly ≤", f"rightly at {percent(goal.believed)}")
    found = [("exact test", *_claim(decided.critical, more, decided.size, decided.power))]
    rows = {row["method"]: row for row in rows_of(decided.by_method)}
    for name in sorted(_shown(sizing.plan), key=lambda name: name != PLAIN):  # which errs most, and must not be cut off
        if name in rows:
            row = rows[name]
            found.append((row["label"], *_claim(row["critical"], more, row["worst_size"], row["power"])))
    return [headings, *found]


def _claim(critical: int | None, more: str, size: float | None, power: float | None) -> tuple[str, str, str]:
    """When the claim is made, and its two chances."""
    when = NOTHING if critical is None else f"{count(int(critical))} {more}"
    return when, share(size, "up"), share(power, "down")


def _facts(sizing: Sizing) -> Iterator[tuple[str, str]]:
    """What stands beside the tables, as (name, value)."""
    yield from _planned(sizing)
    yield from _formula(sizing)
    if sizing.seen is not None:
        seen = sizing.seen
        chance = f"at least {seen.events} with probability {share(seen.probability, 'down')} at {percent(seen.rate)}"
        yield "To see events", f"n = {count(seen.n)}: {chance}"
    yield from _checked(sizing)
    if sizing.cautions:
        more = len(sizing.cautions) - 1
        yield "Caution", sizing.cautions[0] + (f" ({more} more on the page)" if more else "")


def _units(sizing: Sizing) -> Iterator[tuple[str, str]]:
    """Every rung of the ladder from n to units, in its order."""
    if sizing.inflated is None:
        return
    design, steps = sizing.plan.document["design"], sizing.inflated
    rungs = {rung.name: count(rung.ceiling) for rung in steps.rungs}
    loss = design.get("loss", {}).get("rate", 0.0)
    of = f" of {count(design['population'])}" if "population" in design else ""
    clusters = NOTHING if steps.clusters is None else count(steps.clusters)
    yield (
        "From n to units",
        f"n {rungs['base']}, design effect {design.get('design_effect', 1):g}: {rungs['design_effect']}, finite "
        f"population{of}: {rungs['finite']}, losses {percent(loss)}: {rungs['loss']}, whole clusters: {clusters}, "
        f"units: {rungs['units']}",
    )


def _planned(sizing: Sizing) -> Iterator[tuple[str, str]]:
    """What the plan's own n give, as far as they were looked at."""
    for n in sizing.plan.sizes[:MOST_PLANNED]:
        said = [*_scanned(sizing, n), *_bounds(sizing, n), *_power(sizing, n)]
        yield f"n = {count(n)} gives", "; ".join(said) or "nothing that was looked at"


def _scanned(sizing: Sizing, n: int) -> Iterator[str]:
    """Coverage and widths at n of the recommended method, or of the first that may be."""
    name, word = sizing.verdict.method or sizing.plan.prefer[0].name, _word(sizing.plan)
    for row in rows_of(sizing.scan[(sizing.scan["method"] == name) & (sizing.scan["n"] == n)]):
        worst = f"worst interval coverage {share(row['minimum_coverage'], 'down')} at p = {place(row['minimum_at'])}"
        width = f", expected {word} {points_up(row['half_width'])} at worst" if row["half_width"] is not None else ""
        yield f"{_label(sizing.plan, name)}: {worst}{width}"


def _bounds(sizing: Sizing, n: int) -> Iterator[str]:
    """The bounds at n for the events allowed."""
    rare, population = sizing.plan.rare, sizing.plan.document["design"].get("population")
    for events in rare.events[:MOST_PLANNED] if rare is not None and (population is None or n <= population) else ():
        bound = bound_at(events, n, sizing.plan.confidence, population)
        yield f"{events} event{'' if events == 1 else 's'}, upper bound {proportion(bound, 'up')} (one-sided)"


def _power(sizing: Sizing, n: int) -> Iterator[str]:
    """The exact test at n."""
    table = sizing.decision.by_n if sizing.decision is not None else pd.DataFrame({"n": []})
    for row in rows_of(table[table["n"] == n]):
        wrong, right = share(row["size"], "up"), share(row["power"], "down")
        yield f"the exact test claims wrongly in at most {wrong}, rightly in {right}"


def _formula(sizing: Sizing) -> Iterator[tuple[str, str]]:
    """The taught formula, and what its n really gives."""
    taught = sizing.formula
    if taught is None:
        return
    sizes = f"{count(taught.worst_case_n)} for p = ½, {count(taught.guess_n)} for p = {place(taught.guess_at)}"
    rows: list[dict[str, Any]] = rows_of(taught.delivers)
    wald = next((row for row in rows if row["n"] == taught.guess_n and row["method"] == PLAIN), None)
    worst = f"; plus-or-minus then covers {share(wald['minimum_coverage'], 'down')} at worst" if wald else ""
    yield "Taught formula", sizes + worst


def _checked(sizing: Sizing) -> Iterator[tuple[str, str]]:
    """Which n were looked at."""
    name = sizing.verdict.method or next(iter(sizing.by_method), None)
    found = [item for item in sizing.by_method.get(name or "", {}).values() if item is not None]
    if sizing.decision is not None:
        found.append(sizing.decision.found)
    if found:
        yield "Looked at", max((item.checked for item in found), key=len).replace(" checked", "")
