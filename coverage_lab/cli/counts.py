"""Data in hand: two numbers, or the rows of a CSV file added up."""

import csv
from collections.abc import Iterator
from pathlib import Path
from typing import Any

from coverage_lab.checks import InputFault, expected, unknown
from coverage_lab.cli.designed import columns_of_rows
from coverage_lab.plan import LARGEST_N, of_option

COLUMNS = ("events", "trials")
OF_DESIGNS = ("cluster", "stratum", "weight")
MOST_FAULTS = 20  # of one file; the rest is counted


def read_counts(events: object, trials: object, data: Path | None) -> tuple[int, int, dict[str, Any]]:
    """Events and trials, as typed or from a file, and the columns that a file's clusters or strata give.

    Raises:
        InputFault: neither or both, or counts that are not whole numbers with 0 <= events <= trials.
    """
    typed = [value for value in (events, trials) if value is not None]
    if data is not None and typed:
        raise InputFault("--data: expected EVENTS and TRIALS or --data FILE.csv, not both")
    if data is not None:
        return from_csv(data)
    if len(typed) < 2:
        raise InputFault("expected EVENTS and TRIALS, two whole numbers, or --data FILE.csv")
    return (*_sound(events, trials), {})


def _sound(events: object, trials: object) -> tuple[int, int]:
    """Two counts that belong together."""
    faults = []
    if not (isinstance(events, int) and events >= 0):
        faults.append(of_option("EVENTS", events, "a whole number of at least 0"))
    if not (isinstance(trials, int) and 1 <= trials <= LARGEST_N):
        faults.append(of_option("TRIALS", trials, f"a whole number from 1 to {LARGEST_N}"))
    elif isinstance(events, int) and events > trials:
        faults.append(of_option("EVENTS", events, f"at most the {trials} of TRIALS"))
    elif not faults and isinstance(events, int):
        return events, trials
    raise InputFault(*faults)


def from_csv(path: Path) -> tuple[int, int, dict[str, Any]]:
    """The sums of the columns events and trials, and what columns for clusters or strata add.

    Raises:
        InputFault: unreadable, other columns, or rows that are not whole numbers with events <= trials; with lines.
    """
    headings, *rows = _rows(path) or [(1, [])]
    faults = list(_heading_faults(path, headings[1]))
    if faults:
        raise InputFault(*faults)
    pairs = [(number, row, _pair(headings[1], row)) for number, row in rows if any(row)]
    bad = [(number, ",".join(row)) for number, row, pair in pairs if pair is None]
    faults = [f"{path}:{number}: {expected('whole numbers, 0 <= events <= trials', row, 'row')}" for number, row in bad]
    if len(faults) > MOST_FAULTS:
        faults[MOST_FAULTS:] = [f"{path}: {len(faults) - MOST_FAULTS} more rows like these"]
    if faults:
        raise InputFault(*faults)
    events, trials = (sum(pair[k] for _, _, pair in pairs if pair is not None) for k in range(2))
    if not 1 <= trials <= LARGEST_N:
        raise InputFault(f"{path}: {expected(f'a whole number from 1 to {LARGEST_N}', trials, 'the sum of trials')}")
    named = [dict(zip(headings[1], row, strict=True)) for _, row, pair in pairs if pair is not None]
    return events, trials, columns_of_rows(path, named)


def _rows(path: Path) -> list[tuple[int, list[str]]]:
    """Every row with its line, cells without the spaces around them."""
    try:
        with path.open(encoding="utf-8-sig", newline="") as file:
            reader = csv.reader(file, strict=True)
            return [(reader.line_num, [cell.strip() for cell in row]) for row in reader]
    except UnicodeDecodeError as error:
        raise InputFault(f"{path}: expected a CSV file, but byte {error.start + 1} is not text in UTF-8") from None
    except csv.Error as error:
        raise InputFault(f"{path}: expected a CSV file, but: {error}") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or error
        raise InputFault(f"{path}: expected a CSV file, but it cannot be read: {reason}") from None


def _heading_faults(path: Path, headings: list[str]) -> Iterator[str]:
    """Columns that are missing, unknown, or given twice."""
    for name in headings:
        if name not in (*COLUMNS, *OF_DESIGNS):
            yield f"{path}:1: {unknown('column', name, (*COLUMNS, *OF_DESIGNS))}"
    if any(headings.count(name) != 1 for name in COLUMNS) or any(headings.count(name) > 1 for name in OF_DESIGNS):
        yield f"{path}:1: {expected('the columns events and trials, each once', ','.join(headings), 'headings')}"


def _pair(headings: list[str], row: list[str]) -> tuple[int, int] | None:
    """The two counts of a row, or None when they are no counts."""
    if len(row) != len(headings):
        return None
    values = dict(zip(headings, row, strict=True))
    try:
        events, trials = (int(values[name]) for name in COLUMNS)
    except ValueError:
        return None
    return (events, trials) if 0 <= events <= trials else None
