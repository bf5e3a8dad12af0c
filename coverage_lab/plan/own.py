"""Methods that are not the catalogue's: the user's functions, and those of installed packages."""

import functools
import importlib.metadata
from collections.abc import Callable, Mapping

from coverage_lab import intervals
from coverage_lab.checks import InputFault, expected
from coverage_lab.records import Bounds, Method

ENTRY_POINTS = "coverage_lab.methods"

Extra = Mapping[str, Callable[..., Bounds]]


def own_methods(extra: Extra) -> tuple[Method, ...]:
    """The user's functions as methods.

    Raises:
        InputFault: a name that is taken or not one line of text, or something that cannot be called.
    """
    known, faults = known_methods(extra)
    if faults:
        raise InputFault(*faults)
    return tuple(known[name] for name in extra)


def available(extra: Extra | None = None) -> dict[str, Method]:
    """Every method by name: the catalogue's, those of installed packages, and the user's, in this order.

    Raises:
        InputFault: a method of an installed package cannot be loaded, or see `own_methods`.
    """
    known, faults = known_methods(extra or {})
    if faults:
        raise InputFault(*faults)
    return known


def known_methods(extra: Extra) -> tuple[dict[str, Method], list[str]]:
    """Every method by name, and a line for each that cannot be had."""
    known, faults = dict(intervals.EVERY), []
    loaded: list[tuple[str, object]] = []
    for entry in importlib.metadata.entry_points(group=ENTRY_POINTS):
        try:
            loaded.append((entry.name, entry.load()))
        except Exception as error:  # whatever a stranger's module raises while it is imported
            reason = " ".join(f"{type(error).__name__}: {error}".split())
            faults.append(f"method {entry.name!r} of an installed package ({entry.value}) cannot be loaded: {reason}")
    for name, function in (*loaded, *extra.items()):
        if fault := _own_fault(name, function, known):
            faults.append(fault)
        elif callable(function):
            guarded = _guarded(name, function)
            known[name] = Method(name, guarded, label=name, family="your own", source="supplied by the user")
    return known, faults


def _guarded(name: str, function: Callable[..., Bounds]) -> Callable[..., Bounds]:
    """The function, with whatever it raises turned into a fault that names it: a stranger's error is not ours."""

    @functools.wraps(function)
    def call(*columns: object) -> Bounds:
        try:
            return function(*columns)
        except Exception as error:
            reason = " ".join(f"{type(error).__name__}: {error}".split())
            raise InputFault(f"method {name!r} failed: {reason}") from error

    return call


def _own_fault(name: object, function: object, known: Mapping[str, Method]) -> str | None:
    """Why a function cannot be taken as a method under that name."""
    if not (isinstance(name, str) and name.strip() and name.isprintable()):
        return expected("one line of text as the name of a method of your own", name, "name")
    if name in known:
        return f"method {name!r} of your own: expected a name that is not taken"
    return None if callable(function) else expected("a function (events, trials, tail)", function, f"method {name!r}")
