"""Finished blocks of draws kept in a file, so that an interrupted run goes on where it was."""

import io
import sqlite3
from contextlib import AbstractContextManager
from pathlib import Path
from types import TracebackType
from typing import Any

import numpy as np

from coverage_lab.records import Columns, Counts


class Kept(AbstractContextManager["Kept"]):
    """A table identity -> tally in an SQLite file, written by one process; without a path it keeps nothing.

    Tallies are stored as plain arrays: nothing that is read back can run code. A tally is found again only under the
    same NumPy version, whose generators define the draws.
    """

    def __init__(self, path: Path | None) -> None:
        self._path = path
        self._store: sqlite3.Connection | None = None

    def __enter__(self) -> "Kept":
        if self._path is not None:
            self._store = sqlite3.connect(self._path)
            self._store.execute("PRAGMA journal_mode=WAL")
            self._store.execute("PRAGMA synchronous=NORMAL")
            self._store.execute("CREATE TABLE IF NOT EXISTS kept (block TEXT PRIMARY KEY, tally BLOB)")
        return self

    def __exit__(
        self, kind: type[BaseException] | None, error: BaseException | None, trace: TracebackType | None
    ) -> None:
        if self._store is not None:
            self._store.close()
            self._store = None

    def get(self, block: str) -> tuple[Columns, Counts] | None:
        """The tally kept under this identity, or None."""
        if self._store is None:
            return None
        row = self._store.execute("SELECT tally FROM kept WHERE block = ?", (_versioned(block),)).fetchone()
        if row is None:
            return None
        with np.load(io.BytesIO(row[0]), allow_pickle=False) as saved:
            columns = {name.removeprefix("column_"): saved[name] for name in saved.files if name != "counts"}
            return columns, saved["counts"]

    def put(self, block: str, counted: tuple[Columns, Counts]) -> None:
        """Keep a tally; it is on disk when this returns."""
        if self._store is None:
            return
        columns, counts = counted
        buffer = io.BytesIO()
        arrays: dict[str, Any] = {f"column_{name}": values for name, values in columns.items()}
        np.savez(buffer, counts=counts, **arrays)
        self._store.execute("INSERT OR REPLACE INTO kept VALUES (?, ?)", (_versioned(block), buffer.getvalue()))
        self._store.commit()

    def remove(self) -> None:
        """Delete the file: the work it kept is done."""
        if self._store is not None and self._path is not None:
            self._store.close()
            self._store = None
            for suffix in ("", "-wal", "-shm"):
                self._path.with_name(self._path.name + suffix).unlink(missing_ok=True)


def _versioned(block: str) -> str:
    """The identity with the version of the generator's library."""
    return f"numpy={np.__version__} {block}"
