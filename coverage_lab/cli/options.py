"""Arguments and options that several commands share. Values arrive as typed: the plan's schema judges them all at once."""

from collections.abc import Callable
from typing import Any

import click

from coverage_lab.checks import InputFault


class Number(click.ParamType):
    """A number as typed: whole, decimal, or, when it is none, the text itself, to be refused with everything else."""

    name = "number"

    def convert(self, value: Any, param: click.Parameter | None, ctx: click.Context | None) -> int | float | str:  # noqa: ANN401
        """The value in the narrowest type that holds it."""
        for kind in (int, float):
            try:
                return kind(value) if isinstance(value, str) else value
            except ValueError:
                continue
        return str(value)


NUMBER = Number()

confidence = click.option("--confidence", type=NUMBER, metavar="C", help="How sure: between 0 and 1. [default: 0.95]")
side = click.option(
    "--side", metavar="SIDE", help="two-sided, upper (an upper bound) or lower (a lower bound). [default: two-sided]"
)
as_json = click.option("--json", "as_json", is_flag=True, help="Print the answer as JSON, and nothing else.")
quiet = click.option("--quiet", is_flag=True, help="No progress, no remarks; faults are still said.")


def together(*steps: Callable[[], Any]) -> list[Any]:
    """The results of all steps.

    Raises:
        InputFault: the faults of every step that has some, at once.
    """
    results, faults = [], []
    for step in steps:
        try:
            results.append(step())
        except InputFault as fault:
            faults += fault.faults
    if faults:
        raise InputFault(*faults)
    return results
