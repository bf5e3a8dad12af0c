"""Whether a report folder can be made where it is wanted: asked before the long work."""

import os
from collections.abc import Callable
from pathlib import Path

from coverage_lab.checks import InputFault

MOST_FOLDERS = 1000


def check_place(folder: Path) -> None:
    """Refuse a place where no folder can be written.

    Raises:
        InputFault: a file is in the way, or the folder above is not writable.
    """
    above = existing(folder)
    if not above.is_dir():
        raise InputFault(f"{folder}: expected a folder for the report, but {above} is a file")
    if not os.access(above, os.W_OK | os.X_OK):
        raise InputFault(f"{folder}: expected a folder for the report, but {above} is not writable")


def chosen_folder(out: Path | None, usual: Path, unnamed: bool, check: Callable[[Path], None]) -> Path:
    """Where the report goes: as asked, else the usual place; a question without a file takes the first free one.

    Raises:
        InputFault: what `check` says against it.
    """
    if out is None and unnamed:
        return first_free(usual, check)
    folder = usual if out is None else out
    check(folder)
    return folder


def first_free(folder: Path, check: Callable[[Path], None]) -> Path:
    """The folder, or the first of folder-2, folder-3 … that `check` does not refuse.

    For a question asked without a file, whose folder the user did not name: it must not meet an earlier answer.
    """
    for k in range(1, MOST_FOLDERS):
        tried = folder if k == 1 else folder.with_name(f"{folder.name}-{k}")
        try:
            check(tried)
        except InputFault:
            continue
        return tried
    check(folder)
    return folder


def existing(folder: Path) -> Path:
    """The folder itself, or the nearest above it that exists."""
    return next(path for path in (folder.absolute(), *folder.absolute().parents) if path.exists())
