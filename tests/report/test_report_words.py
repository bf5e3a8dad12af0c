"""Numbers as words, and the protocol text."""

import re
from typing import Any

import pytest
from hypothesis import given
from hypothesis import strategies as st
from report_audits import finished

from coverage_lab.report import audit_document
from coverage_lab.report.chapters import chapters, harmless, markdown, protocol_title
from coverage_lab.report.protocol import one_line, pieces, protocol_parts
from coverage_lab.report.words import (
    count,
    how_sure,
    joined,
    least,
    limit,
    limit_places,
    place,
    points,
    range_words,
    share,
    times,
)


@pytest.mark.parametrize(
    ("value", "towards", "words"),
    [
        (0.93412, "nearest", "93.4 %"),
        (0.93499, "down", "93.4 %"),
        (0.93401, "up", "93.5 %"),
        (0.9499999999999998, "down", "95 %"),  # an exact method's minimum, less the last digits of a double
        (0.0500000000000001, "up", "5 %"),
        (0.9499, "down", "94.9 %"),
        (1.0, "down", "100 %"),
        (0.0, "up", "0 %"),
        (0.99985, "nearest", "99.985 %"),
        (None, "nearest", "–"),
    ],
)
def test_shares(value: float | None, towards: Any, words: str) -> None:
    assert share(value, towards) == words


@pytest.mark.parametrize(
    ("p", "words"),
    [
        (0.005, "0.5 %"),
        (0.0062392, "0.624 %"),
        (0.0365, "3.65 %"),
        (0.23456, "23.5 %"),
        (0.5, "50 %"),
        (0.0, "0 %"),
        (1.0, "100 %"),
        (1.2345e-5, "0.00123 %"),
        (0.9937608, "99.376 %"),
        (None, "–"),
    ],
)
def test_proportions(p: float | None, words: str) -> None:
    assert place(p) == words


@pytest.mark.parametrize(
    ("value", "words"),
    [
        (0.05234, "5.23 points"),
        (0.041, "4.10 points"),
        (0.4, "40.0 points"),
        (0.0017, "0.170 points"),
        (2.83e-5, "0.00283 points"),
        (-0.01234, "-1.23 points"),
        (0.0, "0 points"),
        (None, "–"),
    ],
)
def test_widths(value: float | None, words: str) -> None:
    assert points(value) == words


@pytest.mark.parametrize(
    ("ratio", "words"),
    [(1.0, "equal"), (1.0529, "5.3 % wider"), (0.916, "8.4 % narrower"), (1.49, "49 % wider"), (None, "–")],
)
def test_relative_widths(ratio: float | None, words: str) -> None:
    assert times(ratio) == words


def test_small_phrases() -> None:
    assert [joined(["a", "b", "c"][:k]) for k in range(4)] == ["", "a", "a and b", "a, b and c"]
    assert count(20000) == "20\u202f000"
    assert range_words(0.02, 0.02) == "2 %"
    assert range_words(0.005, 0.05) == "0.5 % to 5 %"


@given(value=st.floats(0, 1), n=st.integers(1, 10_000_000))
def test_limits_are_rounded_outward_and_never_long(value: float, n: int) -> None:
    places = limit_places(n)
    low, high = (limit(value, towards, places) for towards in ("down", "up"))
    unit = 10.0 ** -(places + 2)
    assert -1e-15 <= value - float(low.removesuffix(" %")) / 100 <= unit * (1 + 1e-6)
    assert -1e-15 <= float(high.removesuffix(" %")) / 100 - value <= unit * (1 + 1e-6)
    assert len(high) <= 14


def test_limits_tell_neighbouring_outcomes_apart() -> None:
    assert [limit_places(n) for n in (1, 9, 30, 250, 1000, 1_000_000)] == [1, 1, 1, 2, 3, 6]


def row(**changes: Any) -> dict[str, Any]:
    simulated = {"coverage_min": 0.94, "coverage_min_at": 0.03, "coverage_mean": 0.95, "standard_error": 0.0015}
    found = {"minimum_coverage": 0.9271, "minimum_at": 0.00624, "minimum_is": "certified", "simulated": simulated}
    return {**found, **changes}


def test_how_sure_never_calls_a_search_exact() -> None:
    assert how_sure(row()) == "exact minimum, approached at p = 0.624 %"
    assert how_sure(row(minimum_is="searched")) == "lowest value found by search, not proven, at p = 0.624 %"
    assert how_sure(row(minimum_is="simulated")) == "lowest simulated value (± 2 standard errors), at p = 0.624 %"
    assert how_sure(row(minimum_is=None)) == "not measured"
    assert least(row()) == "92.7 %"
    assert least(row(minimum_is="simulated")) == "92.7 % ± 0.300 points"


def test_the_protocol_says_everything_that_a_protocol_needs() -> None:
    document = audit_document(finished("two-sided"))
    text = markdown(protocol_title(document), chapters(document, finished("two-sided").table))
    named = next(entry for entry in document["methods"] if entry["method"] == "wilson")
    for words in (
        "crack found",
        "Population: welds of one line. Unit: one weld.",
        "the process that produces such units",
        "95 % two-sided interval (α = 0.05, 0.025 per tail)",
        named["source"],
        f"At 0 and at n events: {named['ends']}.",
        "n = 60",
        "2 % to 10 %. Basis: pilot.",
        "at least 92.5 % at every true proportion in the planned range and of at least 94.5 % on average",
        f"the worst interval coverage is {share(named['minimum_coverage'], 'down')} (exact minimum, approached at p = ",
        f"and the mean is {share(named['mean_coverage'], 'down')} (exact, every proportion of the range weighing",
        "400 simulated studies at each of 11 true proportions",
        "fixed before data were seen",
        "coverage-lab 0.1.0 (python 3.11, numpy 2.0); seed 1",
        document["provenance"]["plan_sha256"],
        document["cautions"][-1],
    ):
        assert words in text, words
    assert "to be stated" not in text
    assert not re.search(r"\d\.\d{7,}", text.replace(document["provenance"]["plan_sha256"], ""))


def test_what_the_plan_leaves_open_is_a_marked_blank() -> None:
    parts = dict(protocol_parts(audit_document(finished("upper"))))
    blanks = [words for text in parts.values() for words, marked in pieces(text) if marked]
    assert blanks == [
        "[population: to be stated]",
        "[unit: to be stated]",
        "[target: to be stated, this population or the process behind it]",
        "[basis of the range: to be stated]",
    ]
    assert "α = 0.05, all on one side" in parts["Interval"]
    assert "mean excess of the bound over the true proportion" in parts["What the method delivers"]


def test_without_a_recommendation_the_protocol_names_no_method() -> None:
    parts = dict(protocol_parts(audit_document(finished("none"))))
    assert "[interval method: to be stated; this audit names none]" in parts["Interval"]
    assert parts["What the method delivers"] == "No method is named, so nothing is claimed here."
    assert "[Method: to be stated before data are seen.]" in parts["Fixed before data"]


def test_pieces_keep_every_letter() -> None:
    text = "a [b: to be stated] c [d] [e: to be stated, f]"
    assert "".join(words for words, _ in pieces(text)) == text
    assert [words for words, marked in pieces(text) if marked] == ["[b: to be stated]", "[e: to be stated, f]"]
    assert pieces("") == []


def test_the_users_words_stay_on_one_line() -> None:
    assert one_line("a\n# b <c>") == "a # b <c>"


@pytest.mark.parametrize(
    ("words", "written"),
    [
        ("<script>", r"\<script>"),
        ("![x](y)", r"!\[x\](y)"),
        ("[x](y)", r"[x\](y)"),
        ("*a* _b_ `c`", r"\*a\* \_b\_ \`c\`"),
        ("[population: to be stated]", "[population: to be stated]"),
        ("p ≤ 5 %, n = 250", "p ≤ 5 %, n = 250"),
    ],
)
def test_markdown_of_the_users_does_nothing(words: str, written: str) -> None:
    assert harmless(words) == written
