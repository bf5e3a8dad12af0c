"""One fault of a plan, and how people read it: where it is, what was expected, what came."""

from collections.abc import Mapping
from dataclasses import dataclass, field

from coverage_lab.checks import expected, shown
from coverage_lab.plan.lines import KeyPath, line_of

# Options that fill what a table lacks.
INSTEAD: dict[KeyPath, str] = {
    ("outcome",): "--range or --expected",
    ("sample",): "--n",
    ("precision",): "--half-width",
    ("rare",): "--rule-out",
    ("decision",): "--goal and --believed",
}
LAST = 1_000_000_000  # after every line of a file


@dataclass(frozen=True)
class Fault:
    """One fault of a document.

    what: what was expected instead of the value found at the path. With `where` it is a remark about that place, and
    there is no value. instead: the options that could fill what is missing, where they are not the place's usual ones.
    """

    path: KeyPath
    what: str
    value: object = None
    where: str | None = None
    instead: str | None = None


@dataclass(frozen=True)
class Source:
    """Where a document came from.

    name: the file, or nothing. lines: the line of every key. options: the command-line option that set a key.
    by_command: whether there is a command line whose options could fill what is missing.
    """

    name: str = ""
    lines: Mapping[KeyPath, int] = field(default_factory=dict)
    options: Mapping[KeyPath, str] = field(default_factory=dict)
    by_command: bool = False

    def line(self, fault: Fault) -> str:
        """The fault as people read it."""
        option = self._option(fault)
        if option is not None:
            return of_option(option, fault.value, fault.what)
        number = line_of(fault.path, self.lines)
        place = ":".join(str(part) for part in (self.name, number) if part)
        return ": ".join(part for part in (place, self._said(fault)) if part)

    def rank(self, fault: Fault) -> int:
        """For listing faults in the order of the file; those of options come after it."""
        if self._option(fault) is not None:
            return LAST
        return line_of(fault.path, self.lines) or LAST

    def _option(self, fault: Fault) -> str | None:
        """The option that set the key, or the list of which an item is wrong."""
        return next((name for path, name in self.options.items() if fault.path[: len(path)] == path), None)

    def _said(self, fault: Fault) -> str:
        """The fault without its place in the file."""
        if fault.where is None:
            return _of_value(fault)
        instead = fault.instead or INSTEAD.get(fault.path) if self.by_command else None
        hint = f"; or give {instead}" if instead else ""
        return ": ".join(part for part in (fault.where, fault.what + hint) if part)


def of_option(option: str, value: object, what: str) -> str:
    """A fault of a command-line option: ``--n 0: expected what``."""
    return f"{option} {_typed(value)}: expected {what}"


def _of_value(fault: Fault) -> str:
    """``[sample] n = 12.5: expected what``."""
    where = _words(fault.path)
    try:
        return expected(fault.what, fault.value, where)
    except ValueError:  # Python refuses to print such a number
        return f"{where}: expected {fault.what}, came a number of thousands of digits"


def _words(path: KeyPath) -> str:
    """A key as a plan file writes it, items of lists counted from 1."""
    names = [part for part in path if isinstance(part, str)]
    table = f"[{'.'.join(names[:-1])}] " if len(names) > 1 else ""
    return table + ", ".join([*names[-1:], *(f"item {part + 1}" for part in path if isinstance(part, int))])


def _typed(value: object) -> str:
    """A value as it was typed after an option."""
    if isinstance(value, list):
        return " ".join(_typed(item) for item in value)
    return value if isinstance(value, str) and value.isprintable() and value else shown(value)
