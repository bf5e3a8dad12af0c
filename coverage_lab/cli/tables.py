"""Answers on stdout: tables for people, JSON for programs."""

import json
import sys
from collections.abc import Sequence

import click

from coverage_lab.cli.options import watched


def show_json(content: object) -> None:
    """One JSON document."""
    click.echo(json.dumps(content, indent=2, ensure_ascii=False, allow_nan=False))


def show_table(headings: Sequence[str], rows: Sequence[Sequence[str]]) -> None:
    """A table: drawn on a terminal, plain aligned text anywhere else."""
    if watched(sys.stdout):
        _drawn(headings, rows)
        return
    widths = [max(len(row[k]) for row in (headings, *rows)) for k in range(len(headings))]
    for row in (headings, *rows):
        click.echo("  ".join(cell.ljust(width) for cell, width in zip(row, widths, strict=True)).rstrip())


def _drawn(headings: Sequence[str], rows: Sequence[Sequence[str]]) -> None:
    """With rules and wrapped cells; colours only as NO_COLOR and the terminal allow."""
    from rich import box
    from rich.console import Console
    from rich.table import Table
    from rich.text import Text

    table = Table(box=box.SIMPLE_HEAD)
    for k, heading in enumerate(headings):
        table.add_column(heading, overflow="fold", no_wrap=k == 0)  # names are typed again: never cut
    for row in rows:
        table.add_row(*(Text(cell) for cell in row))
    Console().print(table)
