"""How the command line ends: with its answer, or with one plain line for everything that is wrong."""

import errno
import shlex
from collections.abc import Iterable

import click

from coverage_lab.checks import InputFault

NO_RECOMMENDATION = 1
UNUSABLE = 2
INTERRUPTED = 130

ARGUMENTS = "coverage_lab.arguments"
KEPT = "coverage_lab.kept"  # a file of finished work, when there can be one


class Door(click.Group):
    """A group whose commands may raise `InputFault`, `OSError` or be interrupted; none ends in a traceback."""

    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        """Remember the command as typed, to tell how it is run again."""
        ctx.meta[ARGUMENTS] = list(args)
        return super().parse_args(ctx, args)

    def invoke(self, ctx: click.Context) -> object:
        """Run the command; faults go to stderr, a line each."""
        try:
            return super().invoke(ctx)
        except InputFault as fault:
            _say(fault.faults)
            ctx.exit(UNUSABLE)
        except KeyboardInterrupt as stop:
            _say(_interrupted(ctx, *stop.args[:1]))
            ctx.exit(INTERRUPTED)
        except OSError as error:
            if error.errno == errno.EPIPE:  # whoever was reading has stopped: click knows what to do
                raise
            _say([f"{error.filename or 'output'}: cannot be read or written: {error.strerror or error}"])
            ctx.exit(UNUSABLE)


def _interrupted(ctx: click.Context, finished: str = "") -> list[str]:
    """What was finished, what becomes of it, and the command that goes on with it."""
    kept = ctx.meta.get(KEPT)
    state = f"finished work is kept in {kept}" if kept is not None and kept.exists() else "nothing was written"
    said = "; ".join(part for part in (finished, state) if part)
    return [f"interrupted: {said}; to go on, run again:", f"  {shlex.join(['coverage-lab', *ctx.meta[ARGUMENTS]])}"]


def _say(lines: Iterable[str]) -> None:
    """Lines on stderr, letters that no terminal can show spelled out."""
    for line in lines:
        click.echo(line.encode("utf-8", "backslashreplace").decode("utf-8"), err=True)
