"""`coverage-lab methods`: the catalogue of interval methods."""

from typing import TYPE_CHECKING, Any

import click

from coverage_lab.cli import options
from coverage_lab.cli.tables import show_json, show_table

if TYPE_CHECKING:
    from coverage_lab.records import Method

WORDS = ("name", "label", "family", "source", "formula", "ends", "faults")

EXAMPLES = """\b
Examples:
  coverage-lab methods
  coverage-lab methods --json        (also formulas, behaviour at 0 and n events, known faults)
"""


@click.command(epilog=EXAMPLES, short_help="List the interval methods, with their sources.")
@options.as_json
def methods(as_json: bool) -> None:
    """List the interval methods, best standing first, with the sides they can give, their limits and their sources."""
    from coverage_lab.plan import available

    listed = list(available().values())
    if as_json:
        show_json({"methods": [_entry(method) for method in listed]})
    else:
        show_table(("name", "label", "sides", "needs", "largest n", "source"), [_row(method) for method in listed])


def _entry(method: "Method") -> dict[str, Any]:
    """Everything that the catalogue says."""
    words = {name: getattr(method, name) for name in WORDS}
    return {**words, "sides": list(method.sides), "needs": list(method.needs), "largest_n": method.largest_n}


def _row(method: "Method") -> tuple[str, ...]:
    """What fits on a line."""
    sides, needs = ", ".join(method.sides), ", ".join(method.needs)
    largest = "any" if method.largest_n is None else str(method.largest_n)
    return method.name, method.label, sides, needs, largest, method.source
