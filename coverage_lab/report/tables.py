"""The page's tables as plain records: what stands in each cell, and by which number a column is sorted."""

from collections.abc import Iterator, Sequence
from dataclasses import dataclass

import pandas as pd

from coverage_lab.report.columns import Columns, common, share_decimals
from coverage_lab.report.columns import columns as columns_of
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
    limit,
    limit_places,
    place_places,
    points_places,
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
    note: str = ""  # below the first row


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
        *(Column("Worst over all p"), Column("Meets the standard", numeric=False)),
    )
    here = [row for row in document["methods"] if row["n"] == n]
    written = columns_of(document, here, reference)
    rows = tuple(_method_row(row, reference, written) for row in here)
    caption = f"All methods at n = {count(n)}, in catalogue order; misses and widths are means over the planned range"
    return Table("methods", caption, columns, rows, sortable=True)


def _method_row(row: Row, reference: Row | None, written: Columns) -> tuple[Cell, ...]:
    """One method's cells; where it does not apply, its reason."""
    ratio = relative(row, reference)
    everywhere = row["everywhere"]["minimum_coverage"]
    mark = "chief" if reference is not None and row["method"] == reference["method"] else ""
    return (
        Cell(row["label"], None, mark, f"#{anchor(row['method'])}"),
        Cell(written.worst(row), row["minimum_coverage"]),
        Cell(written.place(row["minimum_at"]), row["minimum_at"]),
        Cell(written.coverage(row["mean_coverage"]), row["mean_coverage"]),
        Cell(written.miss(row["missed_below"]), row["missed_below"]),
        Cell(written.miss(row["missed_above"]), row["missed_above"]),
        Cell(written.width(row["mean_width"]), row["mean_width"]),
        Cell(NOTHING if ratio is None else f"{ratio:.2f}", ratio),
        Cell(written.coverage(everywhere), everywhere),
        passes(row),
    )


def anchor(method: str) -> str:
    """The id of a method's description: letters, digits and hyphens only."""
    return "m-" + "".join(letter if letter.isascii() and letter.isalnum() else "-" for letter in method)


def instead(document: Document) -> Table:
    """The chief method, the runner-up, the user's own and plus-or-minus, side by side."""
    n, main = document["verdict"]["n"], chief(document)
    reference = row_of(document, main, n)
    found = [(row_of(document, name, n), role) for name, role in _roles(document).items()]
    shown = [(row, role) for row, role in found if row is not None and row["minimum_coverage"] is not None]
    written = columns_of(document, [row for row, _ in shown], reference)
    rows = []
    for row, role in shown:
        mark = "chief" if row["method"] == main else ""
        head = Cell(f"{row['label']}, {role}" if role else row["label"], None, mark)
        rows.append((head, *_compared(row, reference, written)))
    titles = ("Worst coverage", "at p", "Mean coverage", SHORT_WIDTHS[document["side"]].capitalize(), "Width compared")
    heads = (Column("Method", numeric=False), *map(Column, titles), Column("Meets the standard", numeric=False))
    return Table("instead", "What it delivers, and what others would have delivered instead", heads, tuple(rows))


def _compared(row: Row, reference: Row | None, written: Columns) -> tuple[Cell, ...]:
    """One method's figures beside the reference's width."""
    ratio = relative(row, reference)
    is_reference = reference is not None and row["method"] == reference["method"]
    return (
        Cell(written.worst(row), row["minimum_coverage"]),
        Cell(written.place(row["minimum_at"]), row["minimum_at"]),
        Cell(written.coverage(row["mean_coverage"]), row["mean_coverage"]),
        Cell(written.width(row["mean_width"]), row["mean_width"]),
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
    named = [row_of(document, verdict["method"], verdict["n"]) for verdict in verdicts]
    written = columns_of(document, (row for row in named if row is not None))
    rows = tuple(_verdict_row(document, verdict, written) for verdict in verdicts)
    return Table("by-n", "The verdict at each planned n", columns, rows)


def _verdict_row(document: Document, verdict: Row, written: Columns) -> tuple[Cell, ...]:
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
        Cell(written.worst(row), row["minimum_coverage"]),
        Cell(written.coverage(row["mean_coverage"]), row["mean_coverage"]),
        Cell(written.width(row["mean_width"]), row["mean_width"]),
        Cell(share(low, "up"), low),
        Cell(share(high, "down"), high),
    )


def worst_by_n(document: Document) -> Table | None:
    """Worst coverage of every method at every planned n, when there are several and they fit."""
    listed = sizes(document)
    if not 2 <= len(listed) <= MOST_SIZES:
        return None
    columns = (Column("Method", numeric=False), *(Column(f"n = {count(n)}") for n in listed))
    written = columns_of(document, ())
    rows = []
    for name in catalogue_order(document):
        found = [row_of(document, name, n) for n in listed]
        cells = [
            Cell(NOTHING) if row is None or row["minimum_coverage"] is None
            else Cell(written.coverage(row["minimum_coverage"]), row["minimum_coverage"], passes(row).mark)
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
    zero = "Not zero risk; no change of side afterwards." if first == 0 else ""
    return Table(f"outcomes-{first}", f"{count(first)} to {count(last)} events", columns, rows, note=zero)


def simulated(saved: Saved) -> Table | None:
    """Both routes at every true proportion for the chief method at the verdict's n."""
    document = saved.document
    name, n = chief(document), document["verdict"]["n"]
    cells = saved.cells[(saved.cells["method"] == name) & (saved.cells["n"] == n)]
    drawn = cells[cells["route"] == "simulated"].sort_values("p")
    if name is None or drawn.empty or len(drawn) > MOST_ROWS:
        return None
    both = paired(cells).set_index("p")
    decimals = share_decimals(document["alpha"]) + 1
    errors = common([points_places(float(value)) for value in drawn["standard_error"] if value > 0], 2)
    written = Columns(decimals, common([place_places(float(p)) for p in drawn["p"]], 1), errors)
    rows = []
    for row in drawn.to_dict("records"):
        known = both.loc[row["p"]] if row["p"] in both.index else None
        rows.append(
            (
                Cell(written.place(row["p"]), row["p"]),
                Cell(NOTHING if known is None else written.coverage(known["coverage_enumerated"], "nearest")),
                Cell(written.coverage(row["coverage"], "nearest")),
                Cell(written.width(row["standard_error"])),
                Cell(NOTHING if known is None else f"{known['z']:+.2f}".replace("-", "\u2212")),
            )
        )
    titles = ("True proportion", "Enumerated coverage", "Simulated coverage", "Standard error", "z")
    caption = f"{label_of(document, name)} at n = {count(n)}: the two routes side by side"
    return Table("simulated", caption, tuple(map(Column, titles)), tuple(rows))
