"""`coverage-lab audit`: the main job."""

from collections.abc import Callable, Mapping
from pathlib import Path
from typing import TYPE_CHECKING, Any

import click

from coverage_lab.cli import options
from coverage_lab.cli.door import KEPT, NO_RECOMMENDATION
from coverage_lab.cli.folders import check_place, chosen_folder, existing
from coverage_lab.cli.progress import progress
from coverage_lab.cli.tables import show_json

if TYPE_CHECKING:
    from coverage_lab.records import Audit, Plan

DEFINING = ("n", "range", "expected")  # options that make a plan without a file
FROM_OPTIONS = "audit"  # the name of a plan made of options alone

EXAMPLES = """\b
Examples:
  coverage-lab audit
  coverage-lab audit plan.toml
  coverage-lab audit --n 250 --range 0.005 0.05
  coverage-lab audit --n 100 --n 150 --n 250 --expected 0.02 --side upper --out upper-report
  coverage-lab audit plan.toml --replicates 100000 --workers 2 --json > answer.json
"""


@click.command(epilog=EXAMPLES, short_help="Recommend a method for a planned study, and write the report.")
@click.argument("plan", type=click.Path(path_type=Path), required=False)
@options.n
@options.planned_range
@options.expected
@options.confidence
@options.side
@options.replicates
@options.seed
@options.out
@options.overwrite
@options.workers
@options.as_json
@options.quiet
def audit(
    plan: Path | None,
    out: Path | None,
    overwrite: bool,
    workers: object,
    as_json: bool,
    quiet: bool,
    **overrides: object,
) -> None:
    """Measure every interval method for PLAN, recommend one, and write the report folder.

    Options replace what the plan says. Without PLAN, --n with --range or --expected make a plan of their own; without
    these, too, the built-in demonstration is audited. The same plan and seed give the same figures, whatever --workers.
    """
    read, name = _plan_of(plan, overrides)
    chosen, processes = options.together(read, lambda: options.processes(workers))
    unnamed = name == FROM_OPTIONS and not overwrite
    folder = chosen_folder(out, Path(f"{name}-report"), unnamed, lambda at: _check_folder(at, chosen, overwrite))
    done = _computed(chosen, processes, folder, quiet)
    page, failure = _written(done, folder, overwrite, quiet)
    _show(done, page, as_json, quiet)
    if failure is not None:
        raise failure
    if done.verdict.status != "recommended":
        click.get_current_context().exit(NO_RECOMMENDATION)


def _plan_of(path: Path | None, overrides: Mapping[str, Any]) -> "tuple[Callable[[], Plan], str]":
    """How the plan is had, and the name of its report: from the file, from options alone, or the demonstration."""
    from coverage_lab.plan import DEMONSTRATION, make_plan, read_plan

    if path is not None:
        return lambda: read_plan(path, overrides=overrides, audited=True), path.stem
    if any(overrides[name] not in (None, ()) for name in DEFINING):
        return lambda: make_plan({}, overrides=overrides, audited=True), FROM_OPTIONS
    return lambda: read_plan(DEMONSTRATION, overrides=overrides, audited=True), DEMONSTRATION.stem


def _check_folder(folder: Path, plan: "Plan", overwrite: bool) -> None:
    """Refuse before the long work what could not be written after it.

    Raises:
        InputFault: the folder holds something else, or nothing can be written there.
    """
    from coverage_lab.report.folder import check_target

    check_target(folder, plan.document, overwrite)
    check_place(folder)


def _computed(plan: "Plan", workers: int, folder: Path, quiet: bool) -> "Audit":
    """The audit; finished draws are kept beside the report until it is done, so that an interrupted run can go on."""
    import sqlite3

    from coverage_lab import study

    target = folder.absolute()
    keep = existing(target.parent) / f".{target.name}.kept"
    click.get_current_context().meta[KEPT] = keep
    with progress(quiet) as report:
        try:
            return study.audit(plan, workers=workers, progress=report, keep=keep)
        except sqlite3.Error as error:
            raise OSError(0, f"finished work cannot be kept: {error}", str(keep)) from error


def _written(done: "Audit", folder: Path, overwrite: bool, quiet: bool) -> tuple[Path | None, OSError | None]:
    """The report's page; or why it could not be written, after which the answer is still shown."""
    from coverage_lab import study

    try:
        with progress(quiet) as report:
            return study.write_report(done, folder, overwrite=overwrite, progress=report), None
    except OSError as error:
        return None, error


def _show(done: "Audit", page: Path | None, as_json: bool, quiet: bool) -> None:
    """The answer on stdout."""
    from coverage_lab.cli.answer import answer
    from coverage_lab.report.document import audit_document

    document = audit_document(done)
    if as_json:
        show_json(document)
    elif not quiet:
        click.echo("\n".join(answer(document, page)))
