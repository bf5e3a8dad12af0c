"""Whether a report folder can be made where it is wanted: asked before the long work."""

import os
from pathlib import Path

from coverage_lab.checks import InputFault


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


def existing(folder: Path) -> Path:
    """The folder itself, or the nearest above it that exists."""
    return next(path for path in (folder.absolute(), *folder.absolute().parents) if path.exists())
