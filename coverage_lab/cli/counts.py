"""Data in hand: two numbers, or the rows of a CSV file added up."""

import csv
from collections.abc import Iterable
from pathlib import Path

from coverage_lab.checks import InputFault, expected, unknown
from coverage_lab.plan import LARGEST_N, of_option

COLUMNS = ("events", "trials")
OTHER_DESIGNS = ("cluster", "stratum", "weight")
MOST_FAULTS = 20  # of one file; the rest is counted


def checked(events: object, trials: object) -> tuple[int, int]:
    """The two numbers as typed.

    Raises:
        InputFault: one or both missing, not whole, negative, or more events than trials.
    """
    if events is None or trials is None:
        raise InputFault("expected EVENTS and TRIALS, two whole numbers, or --data FILE.csv")
    faults = []
    if not (isinstance(trials, int) and 1 <= trials <= LARGEST_N):
        faults.append(of_option("TRIALS", trials, f"a whole number from 1 to {LARGEST_N}"))
    if not (isinstance(events, int) and events >= 0):
        faults.append(of_option("EVENTS", events, "a whole number of at least 0"))
    if not faults and isinstance(events, int) and isinstance(trials, int):
        if events <= trials:
            return events, trials
        faults.append(of_option("EVENTS", events, f"at most the {trials} of TRIALS"))
    raise InputFault(*faults)


def from_csv(path: Path) -> tuple[int, int]:
    """The sums of the columns events and trials: the rows are one simple random sample.

    Raises:
        InputFault: unreadable, other columns, or counts that are not whole numbers with events <= trials; with lines.
    """
    try:
        with path.open(encoding="utf-8-sig", newline="") as file:
            rows = list(csv.reader(file, strict=True))
    except UnicodeDecodeError as error:
        raise InputFault(f"{path}: expected a text file (CSV in UTF-8), but byte {error.start + 1} is not text") from None
    except csv.Error as error:
        raise InputFault(f"{path}: expected a CSV file, but {error}") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or error
        raise InputFault(f"{path}: expected a CSV file, but it cannot be read: {reason}") from None
    return _added(path, rows)


def _added(path: Path, rows: list[list[str]]) -> tuple[int, int]:
    """The sums over all rows below the headings; empty lines do not count."""
    headings = [name.strip() for name in rows[0]] if rows else []
    _refuse(_heading_faults(path, headings))
    pairs, faults = [], []
    for number, row in enumerate(rows[1:], start=2):
        if not any(cell.strip() for cell in row):
            continue
        values = dict(zip(headings, (cell.strip() for cell in row), strict=False))
        found = tuple(_whole(values.get(name, "")) for name in COLUMNS)
        if len(row) != len(headings) or None in found or not 0 <= found[0] <= found[1]:  # type: ignore[operator]
            faults.append(f"{path}:{number}: {expected('events and trials, whole numbers, 0 <= events <= trials', row)}")
        pairs.append(found)
    _refuse(faults)
    return _within(path, pairs)


def _heading_faults(path: Path, headings: list[str]) -> Iterable[str]:
    """Columns that are missing, unknown, or of designs that are not analysed here."""
    for name in headings:
        if name in OTHER_DESIGNS:
            yield f"{path}:1: column {name!r}: expected a simple random sample, without clusters, strata or weights"
        elif name not in COLUMNS:
            yield f"{path}:1: {unknown('column', name, COLUMNS)}"
    if sorted(name for name in headings if name in COLUMNS) != sorted(COLUMNS):
        yield f"{path}:1: {expected('the columns events and trials, each once', headings, 'headings')}"
