"""The report folder: what is saved, how it is read back, and what may be overwritten."""

import json
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from coverage_lab.checks import InputFault, shown
from coverage_lab.plan_text import plan_digest, plan_text
from coverage_lab.records import Audit
from coverage_lab.report.chapters import chapters, markdown, protocol_title
from coverage_lab.report.document import FORMAT, audit_document
from coverage_lab.report.staging import staged
from coverage_lab.report.word_file import word_file

DATA_FILES = (
    *("audit.json", "methods.csv", "cells.csv", "curve.csv", "steady.csv", "interval-table.csv", "plan.toml"),
    "protocol.md",
)
WORD_FILE = "protocol.docx"  # only where python-docx is installed
PAGE = "report.html"

CELLS = (
    *("n", "p", "method", "route", "coverage", "standard_error", "missed_below", "missed_above", "mean_width"),
    *("outside_unit_rate", "zero_width_rate", "no_data_rate", "draws"),
)
CURVE = ("n", "p", "method", "coverage", "mean_width")
STEADY = ("planned", "n", "method", "worst_miss", "mean_miss")
METHODS = ("n", "method", "label", "applies", "passes")
TABLE = ("events", "lower", "upper")
COUNTS = ("draws", "simulated_replicates", "events")
WORDS = ("method", "label", "family", "source", "formula", "ends", "faults", "reason", "minimum_is", "route", "why")
WHOLE = ("n", "events", "planned")
JUDGED = ("passes", "applies")
JUDGED_AS = {"True": True, "False": False}  # anything else is None: not decided
ABSENT = ("reason", "minimum_is")  # words that may be missing, as against empty
KEYS = (
    *("plan", "confidence", "side", "alpha", "standard", "methods", "verdict", "by_n", "cross_check", "cautions"),
    "provenance",
)
SHORTENED = "# only outcomes with a probability over 1e-12 somewhere in the planned range are listed\n"


@dataclass(frozen=True)
class Saved:
    """A report folder's data as read back: all that figures and page are made from.

    document: audit.json. methods, cells, curve, steady, table: the CSV files of those names (table:
    interval-table.csv). word_file: whether protocol.docx lies beside them.
    """

    document: dict[str, Any]
    methods: pd.DataFrame
    cells: pd.DataFrame
    curve: pd.DataFrame
    steady: pd.DataFrame
    table: pd.DataFrame
    word_file: bool = False


def save(audit: Audit, folder: Path, overwrite: bool = False) -> Path:
    """Write the data files, all of them or none; figures and page are made by `page.write`.

    Raises:
        InputFault: see `check_target`.
        OSError: the folder cannot be written.
    """
    check_target(folder, audit.plan.document, overwrite)
    with staged(folder, [WORD_FILE]) as stage:
        write_data(audit, stage)
    return folder


def write_data(audit: Audit, into: Path) -> None:
    """The data files, into an existing directory."""
    document = audit_document(audit)
    _write(into / "audit.json", json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False) + "\n")
    _write(into / "methods.csv", _csv(audit.methods))
    _write(into / "cells.csv", _csv(audit.cells, CELLS))
    _write(into / "curve.csv", _csv(audit.curve, CURVE))
    _write(into / "steady.csv", _csv(audit.steady, STEADY))
    shortened = 0 < len(audit.table) < audit.verdict.n + 1
    _write(into / "interval-table.csv", _csv(audit.table, TABLE) + (SHORTENED if shortened else ""))
    _write(into / "plan.toml", plan_text(audit.plan.document))
    told = chapters(document, audit.table)
    title = protocol_title(document)
    _write(into / "protocol.md", markdown(title, told))
    word = word_file(title, told)
    if word is not None:
        (into / WORD_FILE).write_bytes(word)


def load(folder: Path) -> Saved:
    """Read a report folder back.

    Raises:
        OSError: a file is missing or unreadable.
        InputFault: audit.json is not one of ours, or a file is damaged.
    """
    document = _document(folder / "audit.json")
    if document is None:
        raise InputFault(f"{folder / 'audit.json'}: expected an audit saved by coverage-lab, format {FORMAT!r}")
    missing = [key for key in KEYS if key not in document]
    if missing:
        raise InputFault(f"{folder / 'audit.json'}: expected the keys {', '.join(KEYS)}; {', '.join(missing)} missing")
    columns = {"methods": METHODS, "cells": CELLS, "curve": CURVE, "steady": STEADY, "interval-table": TABLE}
    methods, cells, curve, steady, table = (
        _read_csv(folder / f"{name}.csv", wanted) for name, wanted in columns.items()
    )
    return Saved(document, methods, cells, curve, steady, table, (folder / WORD_FILE).is_file())


def check_target(folder: Path, plan_document: Mapping[str, Any], overwrite: bool) -> None:
    """Refuse a folder that holds another plan's report, or other files under the names of ours.

    Raises:
        InputFault: what the folder holds, and how to go on.
    """
    if folder.exists() and not folder.is_dir():
        raise InputFault(f"{folder}: expected a folder for the report, but it is a file")
    taken = [name for name in (*DATA_FILES, PAGE) if (folder / name).exists()]
    if overwrite or not taken:
        return
    document = _document(folder / "audit.json") if "audit.json" in taken else None
    if document is None:
        raise InputFault(
            f"{folder}: expected a new folder or an earlier report of this plan, but it holds other files named "
            f"{', '.join(taken)}; choose another folder with --out, or replace them with --overwrite"
        )
    found = document.get("provenance", {}).get("plan_sha256")
    if found != plan_digest(plan_document):
        raise InputFault(
            f"{folder}: expected a new folder or an earlier report of this plan, but it holds the report of another "
            f"plan ({shown(document.get('plan', {}).get('title'))}); choose another folder with --out, or replace it "
            "with --overwrite"
        )


def _document(path: Path) -> dict[str, Any] | None:
    """The audit saved at path, or None when the file is something else."""
    try:
        document = json.loads(path.read_text(encoding="utf-8"))
    except ValueError:  # not JSON, or not even text
        return None
    return document if isinstance(document, dict) and document.get("format") == FORMAT else None


def _write(path: Path, text: str) -> None:
    path.write_bytes(text.encode("utf-8"))


def _csv(frame: pd.DataFrame, first: tuple[str, ...] = ()) -> str:
    """The frame as CSV: floats in full, counts as whole numbers, missing values empty, `first` columns first."""
    columns = [*first, *(name for name in frame.columns if name not in first)]
    counts = {name: frame[name].astype("Int64") for name in COUNTS if name in frame.columns}
    return frame.reindex(columns=columns).assign(**counts).to_csv(index=False, lineterminator="\n")


def _read_csv(path: Path, wanted: tuple[str, ...]) -> pd.DataFrame:
    """The frame as it was saved: words stay words, also when they look like a number or like a missing value."""
    try:
        frame = pd.read_csv(path, dtype=object, keep_default_na=False, comment=_comment(path))
        absent = [name for name in wanted if name not in frame.columns]
        if not absent:
            return pd.DataFrame({name: _read(str(name), frame[name].to_numpy(dtype=object)) for name in frame.columns})
    except ValueError as error:  # cells that are no numbers, rows of another length, text that is not UTF-8
        raise InputFault(f"{path}: expected the table that an audit saved, but: {error}") from None
    raise InputFault(f"{path}: expected the columns {', '.join(wanted)}; {', '.join(absent)} missing")


def _read(name: str, texts: NDArray[np.object_]) -> pd.Series:
    """One column from its texts; numbers keep every digit."""
    if name in JUDGED:
        return pd.Series([JUDGED_AS.get(text) for text in texts], dtype=object)
    if name in WORDS:
        return pd.Series([None if name in ABSENT and text == "" else text for text in texts], dtype=object)
    numbers = np.where(texts == "", "nan", texts).astype(float)
    return pd.Series(numbers.astype(np.int64) if name in WHOLE else numbers)


def _comment(path: Path) -> str | None:
    """Only the interval table may end in a remark; elsewhere a # is part of somebody's words."""
    return "#" if path.name == "interval-table.csv" else None
