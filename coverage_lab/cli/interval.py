"""`coverage-lab interval`: the interval for data in hand."""

import math
import re
from collections.abc import Mapping, Sequence
from pathlib import Path
from typing import TYPE_CHECKING, Any, NamedTuple

import click

from coverage_lab.checks import InputFault, expected, unknown
from coverage_lab.cli import options
from coverage_lab.cli.tables import show_json, show_table

if TYPE_CHECKING:
    from coverage_lab.cli.planned import Planned
    from coverage_lab.records import Limits, Method, Side

KINDS = {"two-sided": "two-sided interval", "upper": "one-sided upper bound", "lower": "one-sided lower bound"}
LIMITS = ("lower", "upper", "raw_lower", "raw_upper")


class Question(NamedTuple):
    """What is asked, once it is known to be sound."""

    events: int
    trials: int
    confidence: float
    side: "Side"
    methods: "list[Method]"  # in the order of the answer
    planned: "Planned | None"
    columns: dict[str, Any]  # what the design gives beside events and trials


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


EXAMPLES = """\b
Examples:
  coverage-lab interval 7 250
  coverage-lab interval 7 250 --method wilson --method clopper-pearson --confidence 0.99
  coverage-lab interval 0 60 --side upper
  coverage-lab interval 7 250 --from plan-report
  coverage-lab interval --data counts.csv --json
  coverage-lab interval 7 250 --population 6200 --sensitivity 0.95 --specificity 0.99
"""


@click.command(cls=WithCounts, epilog=EXAMPLES, short_help="Give the interval for data in hand.")
@click.argument("events", type=options.number, required=False)
@click.argument("trials", type=options.number, required=False)
@click.option(
    "--data",
    type=click.Path(path_type=Path),
    metavar="FILE.csv",
    help="Columns events and trials, and if needed cluster, or stratum and weight.",
)
@click.option(
    "--from",
    "folder",
    type=click.Path(path_type=Path),
    metavar="FOLDER",
    help="An audit's report folder: its method first, at its confidence and side; the rest for comparison only.",
)
@click.option(
    "--population", type=options.number, metavar="N", help="Units in all, where the sample is a part of them."
)
@click.option(
    "--sensitivity", metavar="S", help="Of the test behind the events: a number, or COUNT/TESTED if estimated."
)
@click.option("--specificity", metavar="S", help="Likewise.")
@click.option("--method", multiple=True, metavar="NAME", help="Only this method; may be repeated. [default: all]")
@options.confidence
@options.side
@options.as_json
@options.quiet
def interval(as_json: bool, quiet: bool, **asked: object) -> None:
    """Give the interval for EVENTS events in TRIALS trials, by every method that applies or by those named.

    Limits are rounded outward. Report the method that was fixed before the data were seen: --from FOLDER puts it first.
    """
    question = _question(asked)
    answers, left_out = _answers(question)
    if not quiet:
        for line in [*_remarks(question), *left_out]:
            click.echo(line, err=True)
    if as_json:
        show_json(_document(question, answers))
    else:
        _show(question, answers)


def _question(asked: Mapping[str, Any]) -> Question:
    """Everything that was typed, checked together."""
    from coverage_lab.cli.counts import read_counts
    from coverage_lab.cli.designed import columns_of_options
    from coverage_lab.cli.planned import departures, read_planned
    from coverage_lab.plan import make_level, of_option

    (events, trials, own), (confidence, side), (named, known), planned, added = options.together(
        lambda: read_counts(asked["events"], asked["trials"], asked["data"]),
        lambda: make_level({"confidence": asked["confidence"], "side": asked["side"]}),
        lambda: _named(asked["method"]),
        lambda: None if asked["folder"] is None else read_planned(asked["folder"]),
        lambda: columns_of_options(asked["population"], asked["sensitivity"], asked["specificity"]),
    )
    if "population" in added and added["population"][0] < trials:
        raise InputFault(of_option("--population", asked["population"], f"at least the {trials} trials"))
    columns = {**own, **added}
    given = {"events", "trials", *columns}
    answering = [method for method in known.values() if set(method.needs) <= given]
    if planned is None:
        return Question(events, trials, confidence, side, named or answering, None, columns)
    faults = departures(planned, known, asked["confidence"], asked["side"])
    if faults:
        raise InputFault(*faults)
    first = known[planned.method]
    rest = [other for other in named or answering if other is not first]
    return Question(events, trials, planned.confidence, planned.side, [first, *rest], planned, columns)


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

    columns = {"events": np.array([question.events]), "trials": np.array([question.trials]), **question.columns}
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
        f"{question.trials} trials, but n = {planned.n} was planned: the figures of the audit are for that n; "
        "the method stays the one that was fixed in advance"
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

    level = f"{percent(question.confidence)} {KINDS[question.side]}"
    click.echo(f"{question.events} events in {question.trials} trials, {level}")
    show_table(("method", "", "lower", "upper", ""), [_row(question, answer) for answer in answers])


def _row(question: Question, answer: Answer) -> tuple[str, ...]:
    """One method's line."""
    limits = _limits(answer)
    remarks = []
    if question.planned is not None:
        fixed = answer.method.name == question.planned.method
        remarks.append("fixed in advance" if fixed else "for comparison only")
    raw = limits["raw_lower"], limits["raw_upper"]
    if any(limit is None or not 0 <= limit <= 1 for limit in raw):
        remarks.append(f"the formula gives {' to '.join(_outward(*raw))}")
    shown = _outward(limits["lower"], limits["upper"])
    return answer.method.name, answer.method.label, *shown, "; ".join(remarks)


def _outward(lower: float | None, upper: float | None) -> tuple[str, str]:
    """Limits rounded so that the interval shown holds the interval computed."""
    from coverage_lab.rounding import proportion

    return (
        "-infinity" if lower is None else proportion(lower, "down"),
        "infinity" if upper is None else proportion(upper, "up"),
    )
