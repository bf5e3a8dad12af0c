"""Options that several commands share. Values arrive as typed; the plan's schema judges them all at once."""

from collections.abc import Callable
from pathlib import Path
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


n = click.option("--n", type=number, multiple=True, metavar="N", help="Planned units; may be repeated.")
planned_range = click.option(
    "--range",
    type=number,
    nargs=2,
    metavar="LOW HIGH",
    help="Planned range of the true proportion; a plan's own grid gives way to 11 points over it.",
)
expected = click.option("--expected", type=number, metavar="P", help="The likeliest true proportion.")
confidence = click.option("--confidence", type=number, metavar="C", help="How sure: between 0 and 1. [default: 0.95]")
side = click.option(
    "--side", metavar="SIDE", help="two-sided, upper (an upper bound) or lower (a lower bound). [default: two-sided]"
)
replicates = click.option("--replicates", type=number, metavar="R", help="Simulated studies for each true proportion.")
seed = click.option("--seed", type=number, metavar="S", help="Seed of the simulation.")
out = click.option(
    "--out", type=click.Path(path_type=Path), metavar="DIR", help="Report folder. [default: named after PLAN]"
)
overwrite = click.option("--overwrite", is_flag=True, help="Replace what the report folder holds, whatever it is.")
workers = click.option("--workers", type=number, default=1, metavar="N", help="Processes for large work. [default: 1]")
as_json = click.option("--json", "as_json", is_flag=True, help="Print the answer as JSON, and nothing else.")
quiet = click.option("--quiet", is_flag=True, help="No progress, no remarks; faults are still said.")


def watched(stream: TextIO | None) -> bool:
    """Whether a person is looking at the stream; a closed one is None."""
    return stream is not None and stream.isatty()


def processes(given: object) -> int:
    """The number of workers.

    Raises:
        InputFault: not a whole number of at least 1.
    """
    from coverage_lab.plan import of_option

    if isinstance(given, int) and given >= 1:
        return given
    raise InputFault(of_option("--workers", given, "a whole number of at least 1"))


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
