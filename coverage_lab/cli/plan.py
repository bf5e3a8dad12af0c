"""`coverage-lab plan`: a starter plan to fill in."""

import shlex
from pathlib import Path

import click

from coverage_lab.checks import InputFault

EXAMPLES = """\b
Examples:
  coverage-lab plan plan.toml
  coverage-lab audit plan.toml
"""


@click.command(epilog=EXAMPLES, short_help="Write a commented plan to start from.")
@click.argument("file", type=click.Path(path_type=Path))
def plan(file: Path) -> None:
    """Write a commented plan to FILE, ready to be changed and audited. An existing file is never overwritten."""
    from coverage_lab.plan import STARTER

    try:
        _write_new(file, STARTER.read_bytes())
    except FileExistsError:
        raise InputFault(f"{file}: expected a new file, but this one is there already and stays as it is") from None
    click.echo(f"{file} is written. Change it to your study, then run: coverage-lab audit {shlex.quote(str(file))}")


def _write_new(file: Path, content: bytes) -> None:
    """A new file, whole or not at all."""
    with file.open("xb") as target:
        try:
            target.write(content)
            target.flush()
        except BaseException:
            file.unlink(missing_ok=True)
            raise
