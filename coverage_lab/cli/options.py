"""Options that several commands share. Values arrive as typed; the plan's schema judges them all at once."""

from collections.abc import Callable
from typing import Any, TextIO

import click

from coverage_lab.checks import InputFault


def number(text: str) -> int | float | str:
    """A number as typed: whole, decimal or, when it is none, the text itself, to be refused with everything else."""
    for kind in (int, float):
        try:
            return kind(text)
        except ValueError:
            continue
    return text


confidence = click.option("--confidence", type=number, metavar="C", help="How sure: between 0 and 1. [default: 0.95]")
side = click.option(
    "--side", metavar="SIDE", help="two-sided, upper (an upper bound) or lower (a lower bound). [default: two-sided]"
)
as_json = click.option("--json", "as_json", is_flag=True, help="Print the answer as JSON, and nothing else.")
quiet = click.option("--quiet", is_flag=True, help="No progress, no remarks; faults are still said.")


def watched(stream: TextIO | None) -> bool:
    """Whether a person is looking at the stream; a closed one is None."""
    return stream is not None and stream.isatty()


def together(*steps: Callable[[], Any]) -> list[Any]:
    """The results of all steps.

    Raises:
        InputFault: the faults of every step that has some, at once.
    """
    results: list[Any] = []
    faults: list[str] = []
    for step in steps:
        try:
            results.append(step())
        except InputFault as fault:
            faults += fault.faults
    if faults:
        raise InputFault(*faults)
    return results
