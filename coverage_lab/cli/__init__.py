"""The command line: each command asks for its own work inside itself, so that help appears at once."""

import sys

import click

from coverage_lab.cli.audit import audit
from coverage_lab.cli.designs import designs
from coverage_lab.cli.door import Door
from coverage_lab.cli.interval import interval
from coverage_lab.cli.methods import methods
from coverage_lab.cli.page import page
from coverage_lab.cli.plan import plan
from coverage_lab.cli.sample_size import sample_size

__all__ = ["cli", "main"]


FIRST_STEPS = """\b
See it at work on an invented study:  coverage-lab audit
Ask about a study of your own:        coverage-lab audit --n 250 --range 0.005 0.05
Write a plan file to fill in:         coverage-lab plan plan.toml
Audit it:                             coverage-lab audit plan.toml
Choose n for it:                      coverage-lab sample-size plan.toml
Later, with the data in hand:         coverage-lab interval 7 250 --from plan-report"""


@click.group(cls=Door, epilog=FIRST_STEPS, context_settings={"help_option_names": ["-h", "--help"]})
@click.version_option(package_name="coverage-lab", message="%(prog)s %(version)s")
def cli() -> None:
    """Choose an interval method for a proportion, and defend it.

    You plan to examine n units and to report a proportion with an interval. Which interval really covers the truth as
    often as it says, at your n, in the range where your proportion should lie? This program works that out by exact
    probabilities and by simulation, names a method, and writes the report. And how many units does it take?

    Exit codes: 0 done; 1 done, but no method is recommended, or no n is found; 2 unusable input, a line for each fault;
    130 interrupted.
    """


for command in (audit, sample_size, interval, methods, designs, plan, page):
    cli.add_command(command)


def main() -> None:
    """Run the command line; letters that the terminal cannot show are spelled out instead of failing."""
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")
    cli(prog_name="coverage-lab")
