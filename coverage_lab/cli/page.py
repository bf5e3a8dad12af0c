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
    """Make the figures and report.html of FOLDER again from its audit.json and CSV files; nothing is computed anew.

    The same files and the same version of the libraries give the same page, byte for byte.
    """
    from coverage_lab.report import rewrite

    if not (folder / "audit.json").is_file():
        raise InputFault(f"{folder}: expected the report folder of an audit, but it holds no audit.json")
    with progress(quiet) as report:
        try:
            written = rewrite(folder, report)
        except (KeyError, IndexError, TypeError, AttributeError) as error:
            raise InputFault(
                f"{folder}: expected the saved files of one audit, but they are damaged or do not belong together "
                f"({type(error).__name__}: {error}); run the audit again"
            ) from None
    if not quiet:
        click.echo(written)
