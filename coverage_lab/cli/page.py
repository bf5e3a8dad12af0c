"""`coverage-lab page`: a report's figures and page again, from its saved files alone."""

from pathlib import Path

import click

from coverage_lab.checks import InputFault
from coverage_lab.cli import options
from coverage_lab.cli.progress import progress

EXAMPLES = """\b
Examples:
  coverage-lab page plan-report
"""


@click.command(epilog=EXAMPLES, short_help="Rebuild a report's figures and page from its saved files.")
@click.argument("folder", type=click.Path(path_type=Path))
@options.quiet
def page(folder: Path, quiet: bool) -> None:
    """Make the figures and report.html of FOLDER again from its saved files alone; nothing is computed anew.

    FOLDER holds the report of an audit or of a sample size.

    The same files and the same version of the libraries give the same page, byte for byte.
    """
    from coverage_lab.report import rewrite, rewrite_sizing

    kinds = {"audit.json": rewrite, "sample-size.json": rewrite_sizing}
    again = next((function for name, function in kinds.items() if (folder / name).is_file()), None)
    if again is None:
        raise InputFault(f"{folder}: expected a report folder, but it holds neither {' nor '.join(kinds)}")
    with progress(quiet) as report:
        try:
            written = again(folder, report)
        except (KeyError, IndexError, TypeError, AttributeError) as error:
            raise InputFault(
                f"{folder}: expected the saved files of one report, but they are damaged or do not belong together "
                f"({type(error).__name__}: {error}); run the command again that made it"
            ) from None
    if not quiet:
        click.echo(written)
