"""A normalised plan as text: TOML to save and read again, and a digest to tell plans apart."""

import hashlib
import json
from collections.abc import Iterator, Mapping
from typing import Any


def plan_text(document: Mapping[str, Any]) -> str:
    """The document as TOML; reading it back gives the same document, every digit included.

    Raises:
        TypeError: a value that is neither text, number, truth value, list nor table.
    """
    return "\n".join(_table(document, ())).strip("\n") + "\n"


def plan_digest(document: Mapping[str, Any]) -> str:
    """SHA-256, in hexadecimal, of the document as JSON with sorted keys: their order makes no difference."""
    text = json.dumps(document, sort_keys=True, separators=(",", ":"), ensure_ascii=False, allow_nan=False)
    return hashlib.sha256(text.encode("utf-8")).hexdigest()


def _table(table: Mapping[str, Any], path: tuple[str, ...]) -> Iterator[str]:
    """The lines of a table: its own values first, then the tables inside it, as TOML asks."""
    inner = {key: value for key, value in table.items() if isinstance(value, Mapping)}
    lists = {key: value for key, value in table.items() if _of_tables(value)}
    own = {key: value for key, value in table.items() if key not in inner and key not in lists}
    if path and (own or not inner):
        yield ""
        yield f"[{'.'.join(_key(name) for name in path)}]"
    for key, value in own.items():
        yield f"{_key(key)} = {_value(value)}"
    for key, value in inner.items():
        yield from _table(value, (*path, key))
    for key, value in lists.items():
        for item in value:
            yield ""
            yield f"[[{'.'.join(_key(name) for name in (*path, key))}]]"
            yield from (f"{_key(name)} = {_value(content)}" for name, content in item.items())


def _of_tables(value: object) -> bool:
    """Whether the value is a list of tables."""
    return isinstance(value, list) and bool(value) and all(isinstance(item, Mapping) for item in value)


def _key(name: str) -> str:
    """A bare key where TOML allows one, else a quoted one."""
    bare = name.isascii() and name.replace("-", "").replace("_", "").isalnum()
    return name if bare else _text(name)


def _value(value: object) -> str:
    """One value on one line."""
    if isinstance(value, bool):
        return "true" if value else "false"
    if isinstance(value, int | float):
        return repr(value)
    if isinstance(value, str):
        return _text(value)
    if isinstance(value, list | tuple):
        return f"[{', '.join(_value(item) for item in value)}]"
    raise TypeError(f"cannot be written as TOML: {value!r}")


def _text(words: str) -> str:
    """A basic string: JSON's escapes are TOML's, but for DEL, which JSON leaves as it is."""
    return json.dumps(words, ensure_ascii=False).replace("\x7f", "\\u007F")
