"""From a file to a TOML document, or one line that says why there is none."""

import re
import tomllib
from collections.abc import Mapping
from pathlib import Path
from typing import Any

import numpy as np

from coverage_lab.checks import InputFault

LARGEST_FILE = 1 << 20


def parsed(path: str | Path) -> tuple[str, dict[str, Any]]:
    """The file's text and what it says as TOML.

    Raises:
        InputFault: no such file, a folder, unreadable, too large, not text, not TOML, empty.
    """
    try:
        with Path(path).open("rb") as file:
            content = file.read(LARGEST_FILE + 1)
    except FileNotFoundError:
        raise InputFault(f"{path}: expected a plan file, but there is no such file") from None
    except IsADirectoryError:
        raise InputFault(f"{path}: expected a plan file, but this is a folder") from None
    except (OSError, ValueError) as error:
        reason = getattr(error, "strerror", None) or error
        raise InputFault(f"{path}: expected a plan file, but it cannot be read: {reason}") from None
    if len(content) > LARGEST_FILE:
        raise InputFault(f"{path}: expected a plan file, but this one is larger than 1 MiB")
    return _toml(path, content)


def _toml(path: str | Path, content: bytes) -> tuple[str, dict[str, Any]]:
    """Bytes as text and as TOML."""
    try:
        text = content.decode("utf-8-sig").replace("\r\n", "\n")
    except UnicodeDecodeError as error:
        raise InputFault(
            f"{path}: expected a text file (TOML in UTF-8), but byte {error.start + 1} is not text"
        ) from None
    try:
        document = tomllib.loads(text)
    except (ValueError, RecursionError) as error:
        found = re.search(r"at line (\d+)", str(error))
        place = f"{path}:{found[1]}" if found else f"{path}"
        reason = "nested too deeply" if isinstance(error, RecursionError) else error
        raise InputFault(f"{place}: expected a plan file, but this is not TOML: {reason}") from None
    if not document:
        raise InputFault(f'{path}: expected a plan, but the file is empty; "coverage-lab plan FILE" writes a first one')
    return text, document


def plain(value: object) -> object:
    """A mapping's content in the types that a TOML file would give."""
    if isinstance(value, np.generic | np.ndarray):
        return value.tolist()
    if isinstance(value, Mapping):
        return {key: plain(item) for key, item in value.items()}
    return [plain(item) for item in value] if isinstance(value, list | tuple) else value
