"""The tables of a sample-size page as plain records, from a saved document and its tables alone."""

from collections.abc import Iterable

from coverage_lab.records_sizing import rows_of
from coverage_lab.report.columns import columns as columns_of
from coverage_lab.report.sizing_folder import SavedSizing
from coverage_lab.report.sizing_protocol import made_up_for
from coverage_lab.report.sizing_words import (
    MADE_UP,
    RUNGS,
    as_audit,
    assured,
    at_n,
    binding,
    capital,
    chance,
    chief_of,
    claimed,
    half,
    half_words,
    name_of,
    rare_row,
    risk,
    rule,
    short_target,
    target_heads,
)
from coverage_lab.report.tables import Cell, Column, Table
from coverage_lab.report.words import NOTHING, Document, Row, count, place
from coverage_lab.rounding import percent

NOT_SCANNED = Cell("not scanned", None, "none")


def number(n: int | None, otherwise: str = NOTHING) -> Cell:
    """A whole number, or words in its stead."""
    return Cell(otherwise, None, "no") if n is None else Cell(count(n), n)


def delivers(document: Document) -> Table | None:
    """What the taught formula's n deliver with plus-or-minus and the recommended method, and the recommended n."""
    formula = document["formula"]
    if formula is None:
        return None
    here = [(row, "") for row in formula["delivers"]]
    main = at_n(document, chief_of(document))
    if main is not None:
        here.append((main, "recommended" if document["verdict"]["method"] else "closest, not recommended"))
    heads = ["Worst interval coverage", "at p", "Mean interval coverage", f"Expected {half_words(document)}"]
    if document["targets"]["precision"]["assurance"] is not None:
        heads.append(capital(assured(document)))
    rows = tuple(_delivered(document, row, role, len(heads) > 4) for row, role in here)
    caption = "What the taught formula's n really delivers, over the planned range"
    return Table("delivers", caption, (Column("n and method", numeric=False), *map(Column, heads)), rows)


def _delivered(document: Document, row: Row, role: str, assurance: bool) -> tuple[Cell, ...]:
    """One n and method."""
    written = columns_of(as_audit(document), ())
    label = f"n = {count(row['n'])}, {name_of(document, row['method'])}{', ' if role else ''}{role}"
    chance_ = row["assurance"]
    found = (
        Cell(label, None, "chief" if role else ""),
        Cell(written.coverage(row["minimum_coverage"]), row["minimum_coverage"]),
        Cell(place(row["minimum_at"]), row["minimum_at"]),
        Cell(written.coverage(row["mean_coverage"]), row["mean_coverage"]),
        Cell(NOTHING if row["half_width"] is None else half(row["half_width"]), row["half_width"]),
    )
    return (*found, Cell(NOTHING if chance_ is None else chance(chance_), chance_)) if assurance else found


def targets(document: Document) -> Table | None:
    """First n and the n from which it holds, per method and target."""
    set_ = target_heads(document)
    if not set_:
        return None
    shown = [name for name in set_ if len(set_) > 1]  # a single target is what "all" are
    titles = [f"{short_target(document, name)}: {which}" for name in shown for which in ("first n", "holds from n on")]
    last = ["All targets: first n", "All targets: holds from n on"] if shown else ["First n", "Holds from n on"]
    columns = (Column("Method", numeric=False), *map(Column, (*titles, *last)))
    rows = tuple(_found(document, row, shown) for row in document["methods"])
    caption = "The first n that meets the targets, and the n from which they hold, by method"
    return Table("targets", caption, columns, rows)


def _found(document: Document, row: Row, shown: Iterable[str]) -> tuple[Cell, ...]:
    """One method's numbers; what was not scanned or not reached is said."""
    mark = "chief" if row["method"] == chief_of(document) else ""
    cells = [Cell(capital(name_of(document, row["method"])), None, mark)]
    for name in shown:
        found = row["by"][name]
        cells += [NOT_SCANNED] * 2 if found is None else _pair(found)
    partly = any(row["by"][name] is None for name in target_heads(document))
    return (*cells, *([NOT_SCANNED] * 2 if partly else _pair(row)))


def _pair(found: Row) -> list[Cell]:
    """First n, and the n from which it holds."""
    return [number(found["first_n"], "not found"), number(found["safe_n"], "not found")]


def ladder(document: Document) -> Table | None:
    """Every rung from the calculated n to units."""
    steps = document["inflated"]
    if steps is None:
        return None
    why = made_up_for(document)
    counted = binding(document) in ("rare", "seen") and why["finite"]
    said, before = {"base": "the recommended n"}, steps["base"]
    for name, words in why.items():
        said[name] = words or ("nothing planned" if steps[name] == before else MADE_UP[name])
        before = steps[name]
    if counted:
        said["finite"] += "; already part of the calculated n"
    rows = tuple(
        (Cell(title, None, "chief" if name == "units" else ""), Cell(said[name]), Cell(count(steps[name]), steps[name]))
        for name, title in RUNGS.items()
    )
    columns = (Column("Step", numeric=False), Column("What it makes up for", numeric=False), Column("n"))
    return Table("ladder", "From n to units, in this fixed order", columns, rows)


def rare(document: Document) -> Table | None:
    """n, bound and chance for each number of events allowed."""
    target = document["targets"]["rare"]
    if not document["rare"]:
        return None
    columns = [Column("Events allowed"), Column("n"), Column("Upper bound after that many")]
    if target["hoped_for"] is not None:
        columns.append(Column(f"Probability of no more than that, at a true rate of {place(target['hoped_for'])}"))
    rows = tuple(_allowed(document, row, len(columns)) for row in document["rare"])
    level = percent(document["confidence"])
    caption = f"To rule out a rate of {place(target['limit'])} at {level} confidence, one-sided"
    return Table("rare", caption, tuple(columns), rows)


def _allowed(document: Document, row: Row, cells: int) -> tuple[Cell, ...]:
    """One number of events allowed."""
    chosen = rare_row(document)
    mark = "chief" if chosen is not None and chosen["events"] == row["events"] else ""
    census = " (a census)" if row["census"] else ""
    bound, chance_ = row["bound"], row["probability_at_hoped_for"]
    found = (
        Cell(count(row["events"]), row["events"], mark),
        Cell("none", None, "no") if row["n"] is None else Cell(f"{count(row['n'])}{census}", row["n"]),
        Cell(NOTHING if bound is None else place(bound, "up"), bound),
        Cell(NOTHING if chance_ is None else chance(chance_), chance_),
    )
    return found[:cells]


def exact_test(saved: SavedSizing) -> Table | None:
    """The exact test at its first n, at the n from which its power holds, and at the recommended n."""
    found = saved.document["decision"]
    if found is None or found["n"] is None:
        return None
    wanted = {"First n with the power": found["first_n"], "Power holds from n on": found["safe_n"]}
    if saved.document["verdict"]["n"] not in wanted.values():
        wanted["The recommended n"] = saved.document["verdict"]["n"]
    known: dict[int, Row] = {row["n"]: row for row in rows_of(saved.decision)}
    known.setdefault(found["n"], found)
    rows = tuple(_tested(found, title, known[n]) for title, n in wanted.items() if n in known)
    heads = ("n", "Claim made at", "Attained size", "Power")
    return Table("test", "The exact test", (Column("Which n", numeric=False), *map(Column, heads)), rows)


def _tested(found: Row, title: str, row: Row) -> tuple[Cell, ...]:
    """The exact test at one n."""
    return (
        Cell(title, None, "chief" if row["n"] == found["safe_n"] else ""),
        number(int(row["n"])),
        Cell(rule(found["claim"], int(row["critical"])), row["critical"]),
        Cell(risk(row["size"]), row["size"]),
        Cell(chance(row["power"]), row["power"]),
    )


def by_method(document: Document) -> Table | None:
    """The same claim made by each method's own limit."""
    found, target = document["decision"], document["targets"]["decision"]
    if found is None or not found["by_method"]:
        return None
    heads = (Column("Claim made at"), Column("Worst size"), Column("Keeps α", numeric=False), Column("Power"))
    rows = tuple(_judged(document, row) for row in found["by_method"])
    caption = (
        f"At n = {count(found['n'])}, claiming that {claimed(document)} when each method's limit clears it; "
        f"α = {percent(target['alpha'])}"
    )
    return Table("by-method", caption, (Column("Method", numeric=False), *heads), rows)


def _judged(document: Document, row: Row) -> tuple[Cell, ...]:
    """One method's claim."""
    found, alpha = document["decision"], document["targets"]["decision"]["alpha"]
    keeps = row["worst_size"] <= alpha * (1 + 1e-9)
    return (
        Cell(capital(name_of(document, row["method"]))),
        Cell(rule(found["claim"], row["critical"]), row["critical"]),
        Cell(risk(row["worst_size"]), row["worst_size"]),
        Cell("yes", 1.0, "yes") if keeps else Cell("no", 0.0, "no"),
        Cell(chance(row["power"]), row["power"]),
    )


def alternatives(document: Document) -> Table | None:
    """What each other method would cost in units, and what speaks against it."""
    verdict = document["verdict"]
    if not verdict["alternatives"] or verdict["n"] is None:
        return None
    first: tuple[tuple[Cell, ...], ...] = ()
    if verdict["method"] is not None and "interval" in verdict["needs"]:
        label = f"{capital(name_of(document, verdict['method']))}, recommended"
        own = number(verdict["needs"]["interval"])
        first = ((Cell(label, None, "chief"), own, number(verdict["units"]), Cell("reference"), Cell(NOTHING)),)
    rows = tuple(_alternative(document, item) for item in verdict["alternatives"])
    heads = (Column("Holds from n on"), Column("Units"), Column("Cost in units"), Column("Against", numeric=False))
    caption = "The n that meets every target which a method was scanned for, and what it would cost"
    return Table("alternatives", caption, (Column("Method", numeric=False), *heads), (*first, *rows))


def _alternative(document: Document, item: Row) -> tuple[Cell, ...]:
    """One alternative; where another target asks for more than any interval does, it costs nothing."""
    units, more = document["verdict"]["units"], item["more_units"]
    if more is not None and more < 0 and binding(document) != "interval":
        more = 0
    plus = "" if more is None or more <= 0 else "+"
    return (
        Cell(capital(name_of(document, item["method"]))),
        number(item["safe_n"], "not found"),
        Cell(NOTHING) if more is None else Cell(count(units + more), units + more),
        Cell(NOTHING) if more is None else Cell(f"{plus}{count(more)}".replace("-", "\u2212"), more),
        Cell(item["against"]),
    )
