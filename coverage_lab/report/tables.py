"""The page's tables as plain records: what stands in each cell, and by which number a column is sorted."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import pandas as pd

from coverage_lab.report.figures import paired
from coverage_lab.report.folder import Saved
from coverage_lab.report.style import catalogue_order, chief, own, runner_up
from coverage_lab.report.words import (
    NOTHING,
    SHORT_WIDTHS,
    Document,
    Row,
    count,
    label_of,
    least,
    limit,
    limit_places,
    place,
    points,
    row_of,
    share,
    sizes,
    times,
)
from coverage_lab.rounding import Towards

MOST_ROWS = 300  # longer tables go to their CSV file
MOST_SIZES = 12  # columns of the table of worst coverage by n
MOST_OWN = 3  # methods of the user's own beside the recommendation
BLOCK = 50  # outcomes in one block of the interval table
PASSES = {True: "yes", False: "no", None: "undecided"}


@dataclass(frozen=True)
class Cell:
    """Words, and the number that sorts them (None: last); `mark` names a style."""

    text: str
    number: float | None = None
    mark: str = ""
    link: str = ""


@dataclass(frozen=True)
class Column:
    """A heading; numbers are set flush right, words flush left."""

    title: str
    numeric: bool = True


@dataclass(frozen=True)
class Table:
    """A table whose rows start with their own heading."""

    name: str
    caption: str
    columns: tuple[Column, ...]
    rows: tuple[tuple[Cell, ...], ...]
    sortable: bool = False


def relative(row: Row, reference: Row | None) -> float | None:
    """Mean width relative to the reference method's."""
    if reference is None or not reference["mean_width"] or row["mean_width"] is None:
        return None
    return float(row["mean_width"] / reference["mean_width"])


def passes(row: Row) -> Cell:
    """Whether the standard is met, in words and as a style."""
    if not row["applies"]:
        return Cell("not applicable", None, "none")
    order = {True: 2.0, None: 1.0, False: 0.0}
    return Cell(PASSES[row["passes"]], order[row["passes"]], {True: "yes", False: "no"}.get(row["passes"], "none"))


def methods(document: Document) -> Table:
    """Every method at the verdict's n."""
    n = document["verdict"]["n"]
    reference = row_of(document, chief(document), n)
    width = SHORT_WIDTHS[document["side"]].capitalize()
    titles = ("Worst interval coverage", "at p", "Mean interval coverage", "Interval too low", "Interval too high")
    columns = (
        Column("Method", numeric=False),
        *(Column(title) for title in (*titles, width, "Relative to the first" if reference is None else "Relative")),
        *(Column("Worst over all p"), Column("Meets the standard", numeric=False), Column("Why", numeric=False)),
    )
    rows = tuple(_method_row(row, reference) for row in document["methods"] if row["n"] == n)
    caption = f"All methods at n = {count(n)}, in catalogue order; misses and widths are means over the planned range"
    return Table("methods", caption, columns, rows, sortable=True)


def _method_row(row: Row, reference: Row | None) -> tuple[Cell, ...]:
    """One method's cells; where it does not apply, its reason."""
    ratio = relative(row, reference)
    everywhere = row["everywhere"]["minimum_coverage"]
    mark = "chief" if reference is not None and row["method"] == reference["method"] else ""
    why = row["why"] if row["applies"] else row["reason"] or ""
    measured = row["minimum_coverage"] is not None
    return (
        Cell(row["label"], None, mark, f"#{anchor(row['method'])}"),
        Cell(least(row) if measured else NOTHING, row["minimum_coverage"]),
        Cell(place(row["minimum_at"]), row["minimum_at"]),
        Cell(share(row["mean_coverage"], "down"), row["mean_coverage"]),
        Cell(share(row["missed_below"]), row["missed_below"]),
        Cell(share(row["missed_above"]), row["missed_above"]),
        Cell(points(row["mean_width"]), row["mean_width"]),
        Cell(NOTHING if ratio is None else f"{ratio:.2f}", ratio),
        Cell(share(everywhere, "down"), everywhere),
        passes(row),
        Cell(why, None, "small"),
    )


def anchor(method: str) -> str:
    """The id of a method's description: letters, digits and hyphens only."""
    return "m-" + "".join(letter if letter.isascii() and letter.isalnum() else "-" for letter in method)


def instead(document: Document) -> Table:
    """The chief method, the runner-up, the user's own and plus-or-minus, side by side."""
    n, main = document["verdict"]["n"], chief(document)
    reference = row_of(document, main, n)
    rows = []
    for name, role in _roles(document).items():
        row = row_of(document, name, n)
        if row is not None and row["minimum_coverage"] is not None:
            head = Cell(f"{row['label']}, {role}" if role else row["label"], None, "chief" if name == main else "")
            rows.append((head, *_compared(row, reference)))
    titles = ("Worst coverage", "at p", "Mean coverage", SHORT_WIDTHS[document["side"]].capitalize(), "Compared")
    columns = (Column("Method", numeric=False), *map(Column, titles), Column("Meets the standard", numeric=False))
    return Table("instead", "What it delivers, and what others would have delivered instead", columns, tuple(rows))


def _compared(row: Row, reference: Row | None) -> tuple[Cell, ...]:
    """One method's figures beside the reference's width."""
    ratio = relative(row, reference)
    is_reference = reference is not None and row["method"] == reference["method"]
    return (
        Cell(least(row), row["minimum_coverage"]),
        Cell(place(row["minimum_at"]), row["minimum_at"]),
        Cell(share(row["mean_coverage"], "down"), row["mean_coverage"]),
        Cell(points(row["mean_width"]), row["mean_width"]),
        Cell("reference" if is_reference else times(ratio), ratio),
        passes(row),
    )


def _roles(document: Document) -> dict[str | None, str]:
    """Who stands in the comparison, and as what."""
    named = document["verdict"]["method"] is not None
    roles = {chief(document): "recommended" if named else "closest, not recommended"}
    roles.setdefault(runner_up(document), "runner-up" if named else "next on the list")
    for name in own(document)[:MOST_OWN]:
        roles.setdefault(name, "your own")
    roles.setdefault("wald", "")
    return roles


def by_n(document: Document) -> Table | None:
    """The verdict at every planned n, when there are several."""
    verdicts = sorted(document["by_n"], key=lambda verdict: verdict["n"])
    if len(verdicts) < 2:
        return None
    titles = ("Worst interval coverage", "Mean interval coverage", SHORT_WIDTHS[document["side"]].capitalize())
    columns = (Column("n"), Column("Method", numeric=False), *map(Column, titles), Column("Holds from"), Column("to"))
    rows = tuple(_verdict_row(document, verdict) for verdict in verdicts)
    return Table("by-n", "The verdict at each planned n", columns, rows)


def _verdict_row(document: Document, verdict: Row) -> tuple[Cell, ...]:
    """One n's verdict."""
    row = row_of(document, verdict["method"], verdict["n"])
    chosen = verdict["n"] == document["verdict"]["n"]
    head = Cell(count(verdict["n"]), verdict["n"], "chief" if chosen else "")
    if row is None:
        words = {"none": "none meets the standard", "undecided": "undecided"}[verdict["status"]]
        return (head, Cell(words, None, "no"), *(Cell(NOTHING) for _ in range(5)))
    low, high = verdict["holds_on"] or (None, None)
    return (
        head,
        Cell(row["label"] + (", too small to learn from" if verdict["too_small"] else "")),
        Cell(least(row), row["minimum_coverage"]),
        Cell(share(row["mean_coverage"], "down"), row["mean_coverage"]),
        Cell(points(row["mean_width"]), row["mean_width"]),
        Cell(share(low, "up"), low),
        Cell(share(high, "down"), high),
    )


def worst_by_n(document: Document) -> Table | None:
    """Worst coverage of every method at every planned n, when there are several and they fit."""
    listed = sizes(document)
    if not 2 <= len(listed) <= MOST_SIZES:
        return None
    columns = (Column("Method", numeric=False), *(Column(f"n = {count(n)}") for n in listed))
    rows = []
    for name in catalogue_order(document):
        found = [row_of(document, name, n) for n in listed]
        cells = [
            Cell(NOTHING) if row is None or row["minimum_coverage"] is None
            else Cell(share(row["minimum_coverage"], "down"), row["minimum_coverage"], passes(row).mark)
            for row in found
        ]  # fmt: skip
        rows.append((Cell(label_of(document, name)), *cells))
    caption = "Worst interval coverage in the planned range by n; underlined where the standard is not met"
    return Table("worst-by-n", caption, columns, tuple(rows), sortable=True)


def bounds(document: Document) -> Table | None:
    """For one-sided plans the bound at the most extreme outcomes."""
    listed = document["verdict"]["bounds_at"]
    if not listed:
        return None
    towards: Towards = "up" if document["side"] == "upper" else "down"
    places = limit_places(document["verdict"]["n"])
    rows = tuple((Cell(count(item["events"])), Cell(limit(item["bound"], towards, places))) for item in listed)
    name = "Upper bound" if document["side"] == "upper" else "Lower bound"
    return Table("bounds", f"{name} at the most extreme outcomes", (Column("Events"), Column(name)), rows)


def outcomes(saved: Saved) -> list[Table]:
    """The recommended interval for every possible outcome, in blocks; none when the list is too long for a page."""
    if not 0 < len(saved.table) <= MOST_ROWS + 1:
        return []
    side = saved.document["side"]
    shown = [name for name in ("lower", "upper") if side in ("two-sided", name)]
    return [_block(saved, block, shown) for block in _blocks(saved.table)]


def _blocks(table: pd.DataFrame) -> Iterator[pd.DataFrame]:
    """The table in blocks of at most `BLOCK` rows, the last one not a mere remnant."""
    parts = max(1, round(len(table) / BLOCK))
    size = -(-len(table) // parts)
    for start in range(0, len(table), size):
        yield table.iloc[start : start + size]


def _block(saved: Saved, block: pd.DataFrame, shown: Sequence[str]) -> Table:
    """One block, limits rounded outward."""
    places = limit_places(saved.document["verdict"]["n"])
    towards: dict[str, Towards] = {"lower": "down", "upper": "up"}
    rows = tuple(
        (Cell(count(int(row["events"]))), *(Cell(limit(row[name], towards[name], places)) for name in shown))
        for row in block.to_dict("records")
    )
    first, last = int(block["events"].iloc[0]), int(block["events"].iloc[-1])
    columns = (Column("Events"), *(Column(name.capitalize()) for name in shown))
    return Table(f"outcomes-{first}", f"{count(first)} to {count(last)} events", columns, rows)


def simulated(saved: Saved) -> Table | None:
    """Both routes at every true proportion for the chief method at the verdict's n."""
    document = saved.document
    name, n = chief(document), document["verdict"]["n"]
    cells = saved.cells[(saved.cells["method"] == name) & (saved.cells["n"] == n)]
    drawn = cells[cells["route"] == "simulated"].sort_values("p")
    if name is None or drawn.empty or len(drawn) > MOST_ROWS:
        return None
    both = paired(cells).set_index("p")
    rows = []
    for row in drawn.to_dict("records"):
        known = both.loc[row["p"]] if row["p"] in both.index else None
        rows.append(
            (
                Cell(place(row["p"]), row["p"]),
                Cell(NOTHING if known is None else share(known["coverage_enumerated"])),
                Cell(share(row["coverage"])),
                Cell(points(row["standard_error"])),
                Cell(NOTHING if known is None else f"{known['z']:+.2f}".replace("-", "\u2212")),
            )
        )
    titles = ("True proportion", "Enumerated coverage", "Simulated coverage", "Standard error", "z")
    caption = f"{label_of(document, name)} at n = {count(n)}: the two routes side by side"
    return Table("simulated", caption, tuple(map(Column, titles)), tuple(rows))
