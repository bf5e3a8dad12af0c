"""`coverage-lab sample-size`: how many units, and which method with them."""

from collections.abc import Callable, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from coverage_lab.cli import options
from coverage_lab.cli.door import NO_RECOMMENDATION
from coverage_lab.cli.folders import check_place, chosen_folder
from coverage_lab.cli.progress import progress
from coverage_lab.cli.tables import show_json

if TYPE_CHECKING:
    from coverage_lab.records import Plan
    from coverage_lab.records_sizing import Sizing

MODIFYING = ("confidence", "side", "horizon", "replicates", "seed")  # these change a plan; all others make one
FROM_OPTIONS = Path("sample-size")  # the folder of a plan made of options alone

EXAMPLES = """\b
Examples:
Rule out 1 % with at most 1 failure, hoping for 0.1 %:
  coverage-lab sample-size --rule-out 0.01 --events 1 --hoped-for 0.001
2 points either way, with 90 % assurance around 2 %, in a fleet of 6200 of which 5 % will be lost:
  coverage-lab sample-size --half-width 0.02 --assurance 0.9 --expected 0.02 --population 6200 --loss 0.05
Show that reliability is above 90 %, believing 97 %, with power 80 %:
  coverage-lab sample-size --goal 0.9 --believed 0.97 --power 0.8
What a plan file asks:
  coverage-lab sample-size plan.toml
"""


def _number(name: str, metavar: str, words: str) -> Callable[[Callable[..., Any]], Callable[..., Any]]:
    """An option for one number."""
    return click.option(name, type=options.number, metavar=metavar, help=words)


@click.command(name="sample-size", epilog=EXAMPLES, short_help="Choose n for a planned study, and the method with it.")
@click.argument("plan", type=click.Path(path_type=Path), required=False)
@_number("--half-width", "D", "A narrow interval: its expected half-width, 0.02 for 2 points either way …")
@_number("--assurance", "G", "… and the probability that it is at most that wide.")
@options.expected
@options.planned_range
@_number("--rule-out", "P", "A rate to be ruled out, one-sided, by few events or none …")
@click.option("--events", type=options.number, multiple=True, metavar="C", help="… events allowed; may be repeated …")
@_number("--hoped-for", "P", "… and the rate hoped for, to tell the chance of success. [default: the expected one]")
@_number("--goal", "P", "A claim that the proportion is on one side of this goal …")
@_number("--believed", "P", "… the side on which the believed proportion lies …")
@_number("--alpha", "A", "… the chance of a wrong claim … [default: 1 - confidence, half of it if two-sided]")
@_number("--power", "G", "… and that of a right one. [default: 0.8]")
@_number("--population", "N", "Units that there are in all.")
@_number("--loss", "L", "Share of units that will yield no result.")
@_number("--design-effect", "F", "Variance of the sample's design over that of a simple random sample.")
@_number("--cluster-size", "M", "Units that come together; whole clusters are counted.")
@_number("--horizon", "N", "How far every larger n is looked at. [default: 1.5 times the largest n, 2000 to 20000]")
@options.confidence
@options.side
@click.option("--n", type=options.number, multiple=True, metavar="N", help="Also say what this n gives; repeatable.")
@click.option("--replicates", type=options.number, hidden=True)
@click.option("--seed", type=options.number, hidden=True)
@options.out
@options.overwrite
@options.workers
@options.as_json
@options.quiet
def sample_size(
    plan: Path | None,
    out: Path | None,
    overwrite: bool,
    workers: object,
    as_json: bool,
    quiet: bool,
    **overrides: object,
) -> None:
    """Choose n for what PLAN asks, name the method with it, and write the report folder.

    A plan or the options ask for a narrow interval, for a rate to be ruled out, for a claim about a goal, or for any of
    these together. Coverage and power go up and down as n grows: for every target you see the first n that meets it and
    the n from which every larger one does, and the second is recommended. Then the units are counted that it takes:
    design effect, population, losses, whole clusters.

    Options replace what the plan says. Without PLAN they make a plan of their own; without them, too, the built-in
    demonstration is sized. The folder is named PLAN-sample-size.
    """
    read, usual = _plan_of(plan, overrides)
    chosen, processes = options.together(read, lambda: options.processes(workers))
    unnamed = usual == FROM_OPTIONS and not overwrite
    folder = chosen_folder(out, usual, unnamed, lambda at: _check_folder(at, chosen, overwrite))
    done = _computed(chosen, processes, quiet)
    page, failure = _written(done, folder, overwrite, quiet)
    _show(done, page, as_json, quiet)
    if failure is not None:
        raise failure
    if done.verdict.status != "recommended":
        click.get_current_context().exit(NO_RECOMMENDATION)


def _plan_of(path: Path | None, overrides: Mapping[str, Any]) -> "tuple[Callable[[], Plan], Path]":
    """How the plan is had, and its folder: from the file, from options alone, or the demonstration.

    No folder's name ends like that of an audit.
    """
    from coverage_lab.plan import DEMONSTRATION, make_plan, read_plan

    if path is None and any(value not in (None, ()) for name, value in overrides.items() if name not in MODIFYING):
        return lambda: make_plan({}, overrides=overrides), FROM_OPTIONS
    file = path if path is not None else DEMONSTRATION
    return lambda: read_plan(file, overrides=overrides), Path(f"{file.stem}-sample-size")


def _check_folder(folder: Path, plan: "Plan", overwrite: bool) -> None:
    """Refuse before the long work what could not be written after it.

    Raises:
        InputFault: the folder holds something else, or nothing can be written there.
    """
    from coverage_lab.report import check_sizing_target

    check_sizing_target(folder, plan.document, overwrite)
    check_place(folder)


def _computed(plan: "Plan", workers: int, quiet: bool) -> "Sizing":
    """The answer, with progress on a terminal."""
    from coverage_lab import study

    with progress(quiet) as report:
        return study.sample_size(plan, workers=workers, progress=report)


def _written(done: "Sizing", folder: Path, overwrite: bool, quiet: bool) -> tuple[Path | None, OSError | None]:
    """The report's page; or why it could not be written, after which the answer is still shown."""
    from coverage_lab import study

    try:
        with progress(quiet) as report:
            return study.write_sizing(done, folder, overwrite=overwrite, progress=report), None
    except OSError as error:
        return None, error


def _show(done: "Sizing", page: Path | None, as_json: bool, quiet: bool) -> None:
    """The answer on stdout."""
    from coverage_lab.cli.answer_size import answer

    if as_json:
        show_json(done.document())
    elif not quiet:
        click.echo("\n".join(answer(done, page)))
