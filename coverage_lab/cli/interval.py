"""`coverage-lab interval`: the interval for data in hand."""

import math
import re
from collections.abc import Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, NamedTuple

import click

from coverage_lab.checks import InputFault, expected, unknown
from coverage_lab.cli import options
from coverage_lab.cli.tables import show_json, show_table

if TYPE_CHECKING:
    from coverage_lab.cli.planned import Planned
    from coverage_lab.records import Limits, Method, Side
    from coverage_lab.rounding import Towards

KINDS = {"two-sided": "two-sided interval", "upper": "one-sided upper bound", "lower": "one-sided lower bound"}
LIMITS = ("lower", "upper", "raw_lower", "raw_upper")
OUTWARD: tuple["Towards", "Towards"] = ("down", "up")


class Question(NamedTuple):
    """What is asked, once it is known to be sound."""

    events: int
    trials: int
    confidence: float
    side: "Side"
    methods: "list[Method]"  # in the order of the answer
    planned: "Planned | None"


class Answer(NamedTuple):
    """One method's limits."""

    method: "Method"
    limits: "Limits"


class WithCounts(click.Command):
    """A command whose arguments are counts: a negative one is unusable input, not an unknown option."""

    def parse_args(self, ctx: click.Context, args: list[str]) -> list[str]:
        """As usual, but for numbers with a minus in front."""
        typed = list(args)
        try:
            return super().parse_args(ctx, args)
        except click.NoSuchOption:
            for word in typed:
                if re.match(r"-[\d.]", word):
                    raise InputFault(expected("EVENTS and TRIALS, whole numbers of at least 0", word)) from None
            raise


@click.command(cls=WithCounts)
@click.argument("events", type=options.NUMBER, required=False)
@click.argument("trials", type=options.NUMBER, required=False)
@click.option(
    "--data", type=click.Path(path_type=Path), metavar="FILE.csv", help="Columns events and trials, added up."
)
@click.option(
    "--from",
    "folder",
    type=click.Path(path_type=Path),
    metavar="FOLDER",
    help="An audit's report folder: its method first, at its confidence and side; the rest for comparison only.",
)
@click.option("--method", multiple=True, metavar="NAME", help="Only this method; may be repeated. [default: all]")
@options.confidence
@options.side
@options.as_json
@options.quiet
def interval(as_json: bool, quiet: bool, **asked: Any) -> None:  # noqa: ANN401 - click hands over what was typed
    """Give the interval for EVENTS events in TRIALS trials, by every method that applies or by those named.

    Limits are rounded outward. Report the method that was fixed before the data were seen: --from FOLDER puts it first.

    \b
    Examples:
      coverage-lab interval 7 250
      coverage-lab interval 7 250 --method wilson --method clopper-pearson --confidence 0.99
      coverage-lab interval 0 60 --side upper
      coverage-lab interval 7 250 --from plan-report
      coverage-lab interval --data counts.csv --json
    """
    question = _question(**asked)
    answers, left_out = _answers(question)
    if not quiet:
        for line in [*_remarks(question), *left_out]:
            click.echo(line, err=True)
    if as_json:
        show_json(_document(question, answers))
    else:
        _show(question, answers)


def _question(
    events: object,
    trials: object,
    data: Path | None,
    folder: Path | None,
    method: Sequence[str],
    confidence: object,
    side: object,
) -> Question:
    """Everything that was typed, checked together."""
    from coverage_lab.cli.counts import read_counts
    from coverage_lab.cli.planned import departures, read_planned
    from coverage_lab.plan import make_level

    found, level, (named, known), planned = options.together(
        lambda: read_counts(events, trials, data),
        lambda: make_level({"confidence": confidence, "side": side}),
        lambda: _named(method),
        lambda: read_planned(folder) if folder is not None else None,
    )
    if planned is None:
        return Question(*found, *level, named or list(known.values()), None)
    faults = departures(planned, known, confidence, side)
    if faults:
        raise InputFault(*faults)
    first = known[planned.method]
    rest = [other for other in named or known.values() if other is not first]
    return Question(*found, planned.confidence, planned.side, [first, *rest], planned)


def _named(names: Sequence[str]) -> "tuple[list[Method], dict[str, Method]]":
    """The methods asked for by name, each once, and all that there are.

    Raises:
        InputFault: names that are no method's.
    """
    from coverage_lab.plan import available

    known = available()
    faults = [unknown("method", name, known) for name in names if name not in known]
    if faults:
        raise InputFault(*faults)
    return [known[name] for name in dict.fromkeys(names)], known


def _answers(question: Question) -> tuple[list[Answer], list[str]]:
    """The limits of every method that applies, and a line for each that does not.

    Raises:
        InputFault: none applies.
    """
    import numpy as np

    from coverage_lab.engine.bounds import evaluate, inapplicable
    from coverage_lab.records import tail_of

    columns = {"events": np.array([question.events]), "trials": np.array([question.trials])}
    tail = tail_of(question.confidence, question.side)
    answers, left_out = [], []
    for method in question.methods:
        reason = inapplicable(method, tuple(columns), question.trials, question.side)
        if reason is None:
            answers.append(Answer(method, evaluate(method, columns, question.side, tail)))
        else:
            left_out.append(f"method {method.name!r} does not apply: {reason}")
    if not answers:
        raise InputFault(*left_out)
    return answers, left_out


def _remarks(question: Question) -> list[str]:
    """What has to be said beside the figures."""
    planned = question.planned
    if planned is None or planned.n == question.trials:
        return []
    return [
        f"TRIALS is {question.trials}, but the audit was made for n = {planned.n}: its figures hold for that n, and the "
        "method stays the one fixed in advance"
    ]


def _document(question: Question, answers: list[Answer]) -> dict[str, Any]:
    """The answer in full digits; a raw limit that is not finite is null."""
    asked = {name: getattr(question, name) for name in ("events", "trials", "confidence", "side")}
    return {**asked, "intervals": [{"method": answer.method.name, **_limits(answer)} for answer in answers]}


def _limits(answer: Answer) -> dict[str, float | None]:
    """Limits as used, and as the formula gave them."""
    values = {name: float(getattr(answer.limits, name)[0]) for name in LIMITS}
    return {name: value if math.isfinite(value) else None for name, value in values.items()}


def _show(question: Question, answers: list[Answer]) -> None:
    """For people: limits rounded outward, formulas that leave [0, 1] marked."""
    from coverage_lab.rounding import percent

    kind = KINDS[question.side]
    click.echo(f"{question.events} events in {question.trials} trials, {percent(question.confidence)} {kind}")
    headings = ("method", "", "lower", "upper", "")
    rows = [_row(question, answer) for answer in answers]
    show_table(headings, rows)


def _row(question: Question, answer: Answer) -> tuple[str, ...]:
    """One method's line."""
    from coverage_lab.rounding import proportion

    limits = {name: value for name, value in _limits(answer).items() if value is not None}
    raw = [limits.get(name) for name in ("raw_lower", "raw_upper")]
    remarks = []
    if question.planned is not None:
        fixed = answer.method.name == question.planned.method
        remarks.append("fixed in advance" if fixed else "for comparison only")
    if any(value is None or not 0 <= value <= 1 for value in raw):
        shown = [
            "infinite" if value is None else proportion(value, towards)
            for value, towards in zip(raw, OUTWARD, strict=True)
        ]
        remarks.append(f"the formula gives {shown[0]} to {shown[1]}")
    lower, upper = (
        proportion(limits[name], towards) for name, towards in zip(("lower", "upper"), OUTWARD, strict=True)
    )
    return answer.method.name, answer.method.label, lower, upper, "; ".join(remarks)
