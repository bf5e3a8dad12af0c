"""Where in a TOML text a key stands: the standard parser gives values without their lines, so the text is walked."""

import tomllib
from collections.abc import Iterator, Mapping
from typing import Any

KeyPath = tuple[str | int, ...]

LONGEST_STATEMENT = 500  # lines; a longer one ends the walk, and what follows it is reported without a line


def lines_of(text: str) -> dict[KeyPath, int]:
    """The line, counted from 1, on which every table and every key of a valid TOML text begins.

    A path names tables and keys from the outside in; an element of an array of tables is a number, counted from 0.
    """
    found: dict[KeyPath, int] = {}
    opened: dict[KeyPath, int] = {}
    table: KeyPath = ()
    for line, header, parsed in _statements(text):
        if header:
            table = _opened(parsed, opened)
            for length in range(1, len(table) + 1):
                found.setdefault(table[:length], line)
        else:
            for path in _paths(parsed):
                found.setdefault((*table, *path), line)
    return found


def line_of(path: KeyPath, found: Mapping[KeyPath, int]) -> int | None:
    """The line of a key or, where it has none of its own, of what it stands in."""
    while path:
        if path in found:
            return found[path]
        path = path[:-1]
    return None


def _statements(text: str) -> Iterator[tuple[int, bool, dict[str, Any]]]:
    """Every statement: its first line, whether it opens a table, and what it says when parsed alone.

    A statement is the fewest whole lines that the parser accepts. Only line feeds end a line in TOML: a string may hold
    every other separator that Python knows.
    """
    lines = text.replace("\r\n", "\n").split("\n")
    start = 0
    while start < len(lines):
        for end in range(start + 1, min(len(lines), start + LONGEST_STATEMENT) + 1):
            chunk = "\n".join(lines[start:end])
            try:
                parsed = tomllib.loads(chunk)
            except tomllib.TOMLDecodeError:
                continue
            yield start + 1, chunk.lstrip(" \t").startswith("["), parsed
            start = end
            break
        else:
            return


def _opened(parsed: dict[str, Any], opened: dict[KeyPath, int]) -> KeyPath:
    """The path of the table that a header opens; `opened` counts the elements of every array of tables so far."""
    path: KeyPath = ()
    inside: Any = parsed
    while inside:
        ((name, inside),) = inside.items()
        path = (*path, name)
        if isinstance(inside, list):
            opened[path] = opened.get(path, -1) + 1
            inside = inside[0]
        if path in opened:
            path = (*path, opened[path])
    return path


def _paths(value: object, path: KeyPath = ()) -> Iterator[KeyPath]:
    """The paths of every key in a parsed statement, those of inline tables included."""
    if isinstance(value, dict):
        for name, item in value.items():
            yield (*path, name)
            yield from _paths(item, (*path, name))
    elif isinstance(value, list):
        for k, item in enumerate(value):
            yield from _paths(item, (*path, k))
