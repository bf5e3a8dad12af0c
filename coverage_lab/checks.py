"""The one error class for unusable input, and the few ways to word a fault."""

import difflib
from collections.abc import Iterable


class InputFault(ValueError):
    """Unusable input: one line per fault, all faults at once.

    Attributes:
        faults: the lines, each naming where, what was expected and what came.
    """

    def __init__(self, *faults: str) -> None:
        self.faults = faults
        super().__init__("\n".join(faults))


def shown(value: object, limit: int = 60) -> str:
    """The value as an error line quotes it: its repr, cut when long, always on one line."""
    text = repr(value)
    return text if len(text) <= limit else text[: limit - 1] + "…"


def expected(what: str, came: object, where: str = "") -> str:
    """A fault line: ``where = came: expected what``."""
    head = f"{where} = {shown(came)}" if where else shown(came)
    return f"{head}: expected {what}"


def unknown(kind: str, name: str, known: Iterable[str]) -> str:
    """A fault line for a name that is not on a list, with the nearest known name, else the whole list."""
    names = list(known)
    near = difflib.get_close_matches(name.lower(), names, n=1, cutoff=0.6)
    hint = f'did you mean "{near[0]}"?' if near else f"must be one of {', '.join(names)}"
    return f"unknown {kind} {shown(name)}: {hint}"
