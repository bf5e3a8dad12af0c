"""Words to paste in Markdown and Word, the box's answers, columns, notebooks, and where cautions stand."""

import io
import json
import re
import subprocess
import sys
import zipfile
from collections.abc import Callable
from dataclasses import replace
from pathlib import Path

import pandas as pd
import pytest
from report_audits import PLANS, finished, page_of

from coverage_lab.report import audit_document, box, load, word_file
from coverage_lab.report.chapters import chapters, markdown, protocol_title
from coverage_lab.report.columns import common, share_decimals
from coverage_lab.report.narrative import answers, summary
from coverage_lab.report.words import limit, limit_places
from coverage_lab.rounding import percent
from coverage_lab.sentences import OF_ZERO, of_side

Report = Callable[[str], Path]
NAMES = sorted(PLANS)


def told(name: str) -> dict[str, str]:
    return dict(answers(audit_document(finished(name))))


def test_a_reviewer_is_told_what_plus_or_minus_would_have_done() -> None:
    rows = {row["method"]: row for row in audit_document(finished("two-sided"))["methods"]}
    said = told("two-sided")["Why not the usual plus-or-minus interval?"]
    for method in ("wald", "wilson"):
        assert percent(rows[method]["minimum_coverage"], "down") in said
    assert "it does not meet the standard" in said


def test_a_reviewer_is_told_the_price_of_a_guarantee() -> None:
    said = told("two-sided")["The worst interval coverage is below 95 %. Is that good enough?"]
    assert "the Clopper–Pearson exact interval never falls below 95 % in the planned range" in said
    assert not [question for question in told("upper") if "below 95 %" in question], (
        "an exact method falls below nothing"
    )


def test_without_a_recommendation_a_reviewer_hears_of_none() -> None:
    said = told("none")
    assert "Closest, not recommended" in said["Why is no method named?"]
    assert not [answer for answer in said.values() if "report the" in answer]


@pytest.mark.parametrize("name", NAMES)
def test_texts_are_whole_sentences_with_short_numbers(name: str) -> None:
    audit = finished(name)
    document = audit_document(audit)
    text = markdown(protocol_title(document), chapters(document, audit.table))
    text = text.replace(document["provenance"]["plan_sha256"], "")
    for wrong in ("None", "nan", "{", "}", "..", " ,", "  "):
        assert wrong not in text, wrong
    assert not re.search(r"\d\.\d{7,}", text)


@pytest.mark.parametrize(("name", "phrase"), [("two-sided", " to "), ("upper", "at most "), ("hostile", " to ")])
def test_the_plain_summary_gives_examples_from_the_interval_table(name: str, phrase: str) -> None:
    audit = finished(name)
    text = " ".join(summary(audit_document(audit), audit.table))
    zero = audit.table.iloc[0]
    n = audit.verdict.n
    assert f"if no unit has the outcome, {'0.0 % to ' if phrase == ' to ' else phrase}" in text
    assert limit(zero["upper"], "up", limit_places(n)) in text
    assert "No events found does not mean no risk." in text


def test_without_a_table_the_summary_gives_no_examples() -> None:
    audit = finished("none")
    assert len(summary(audit_document(audit), audit.table)) == 1


# --- Word

needs_word = pytest.mark.skipif(not word_file.installed(), reason="python-docx is not installed (extra docx)")


def word_text(content: bytes) -> str:
    import docx

    return "\n".join(paragraph.text for paragraph in docx.Document(io.BytesIO(content)).paragraphs)


@needs_word
@pytest.mark.parametrize("name", ["two-sided", "hostile"])
def test_the_word_file_says_what_the_markdown_says(name: str, report: Report) -> None:
    content = (report(name) / "protocol.docx").read_bytes()
    audit = finished(name)
    document = audit_document(audit)
    said = word_text(content)
    assert said.startswith(protocol_title(document))
    for chapter in chapters(document, audit.table):
        assert chapter.heading in said
        for lead, text in chapter.parts:
            assert f"{lead} {text}".strip() in said
    assert document["cautions"][-1] in said


@needs_word
def test_the_same_words_give_the_same_word_file() -> None:
    audit = finished("upper")
    document = audit_document(audit)
    made = [word_file.word_file("T", chapters(document, audit.table)) for _ in range(2)]
    assert made[0] is not None
    assert made[0] == made[1]
    with zipfile.ZipFile(io.BytesIO(made[0])) as archive:
        assert {member.date_time for member in archive.infolist()} == {word_file.LONG_AGO}


@needs_word
def test_blanks_are_marked_and_letters_that_xml_forbids_replaced() -> None:
    import docx
    from docx.enum.text import WD_COLOR_INDEX

    document = audit_document(finished("upper"))
    document["plan"]["outcome"] = {**document["plan"]["outcome"], "name": "a\x01b"}
    content = word_file.word_file("t\x00", chapters(document, finished("upper").table))
    assert content is not None
    assert "a\ufffdb" in word_text(content)
    runs = [run for paragraph in docx.Document(io.BytesIO(content)).paragraphs for run in paragraph.runs]
    marked = [run.text for run in runs if run.font.highlight_color == WD_COLOR_INDEX.YELLOW]
    assert marked[0] == "[population: to be stated]"


def test_without_the_extra_there_is_no_word_file_and_no_link(report: Report, tmp_path: Path) -> None:
    code = (
        "import sys\nfrom pathlib import Path\nfrom coverage_lab.report import rewrite, word_file\n"
        "import importlib.metadata as m\n"
        "def missing(name):\n    raise m.PackageNotFoundError(name)\n"
        "m.version = missing\nprint(word_file.word_file('t', ()), 'docx' in sys.modules)"
    )
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "None False"
    for file in report("enumerated").iterdir():
        if file.is_file() and file.name != "protocol.docx":
            (tmp_path / file.name).write_bytes(file.read_bytes())
    assert not load(tmp_path).word_file


# --- the box


@pytest.mark.parametrize("name", ["two-sided", "upper"])
def test_the_box_holds_the_limits_of_the_table(name: str, report: Report) -> None:
    saved = load(report(name))
    found = box.answers(saved)
    assert found is not None
    places = limit_places(saved.document["verdict"]["n"])
    for side, towards in (("lower", "down"), ("upper", "up")):
        assert [f"{word} %" for word in found[side].split(" ")] == [
            limit(v, towards, places) for v in saved.table[side]
        ]


def test_a_table_too_long_for_the_page_has_no_box(report: Report) -> None:
    saved = load(report("two-sided"))
    long = pd.DataFrame({"events": range(box.MOST_ANSWERS + 1), "lower": 0.0, "upper": 1.0})
    assert box.answers(replace(saved, table=long)) is None
    fits = box.answers(replace(saved, table=long.iloc[1:]))
    assert fits is not None
    assert fits["first"] == 1
    assert len(json.dumps(fits)) < 600_000


# --- columns


@pytest.mark.parametrize(("alpha", "decimals"), [(0.2, 1), (0.05, 1), (0.01, 1), (0.001, 2), (1e-6, 5)])
def test_a_coverage_shows_two_digits_of_alpha(alpha: float, decimals: int) -> None:
    assert share_decimals(alpha) == decimals


def test_decimals_are_common_unless_there_would_be_too_many() -> None:
    assert common([1, 3, 2], 1) == 3
    assert common([], 2) == 2
    assert common([1, 5], 1) is None


@pytest.mark.parametrize("name", ["two-sided", "several", "upper", "hostile"])
def test_every_column_of_the_page_has_the_same_decimals_from_top_to_bottom(name: str, report: Report) -> None:
    text = (report(name) / "report.html").read_text(encoding="utf-8").replace("\u00a0", " ")
    for table in ("t-methods", "t-instead"):
        body = text.split(f'id="{table}"')[1].split("</table>")[0].split("<tbody>")[1]
        rows = [re.findall(r'<td class="num[^>]*>([^<]*)</td>', row) for row in body.split("</tr>")]
        listed = [row for row in rows if row]
        assert len(listed) >= 2
        for column in zip(*listed, strict=True):
            figures = [words for words in column if re.fullmatch(r"[\d.]+ (%|points)", words)]
            assert len({len(words.split()[0].partition(".")[2]) for words in figures}) <= 1, column


# --- cautions where they belong


def test_a_one_sided_bound_is_set_beside_the_two_sided_interval() -> None:
    assert of_side(0.95, 0.05, "upper").startswith(
        "A one-sided 95 % bound is the matching limit of a two-sided 90 % interval"
    )
    two_sided = of_side(0.95, 0.05, "two-sided")
    assert "one-sided 97.5 % bound" in two_sided
    assert "two-sided 90 % interval" in two_sided
    assert "2.5 %" in two_sided
    assert "two-sided" not in of_side(0.4, 0.6, "upper"), "there is no two-sided interval of -20 %"


@pytest.mark.parametrize("name", NAMES)
def test_cautions_stand_beside_what_they_are_about(name: str, report: Report) -> None:
    audit, tree = finished(name), page_of(report(name))
    assert of_side(audit.plan.confidence, audit.plan.alpha, audit.plan.side) in tree.by_id("plan")
    assert "none says anything about bias" in tree.by_id("verdict")
    if not audit.table.empty:
        assert OF_ZERO in tree.by_id("intervals")
        assert "Not zero risk; no change of side afterwards." in tree.by_id("t-outcomes-0")
    for caution in audit.cautions:
        assert " ".join(caution.replace("\u00a0", " ").split()) in tree.by_id("cautions")


# --- notebooks


def test_notebooks_show_the_answer_and_nothing_that_runs() -> None:
    audit = finished("hostile")
    shown = audit._repr_html_()
    assert "&lt;script&gt;alert(1)&lt;/script&gt;" in shown
    assert "<script" not in shown
    assert "Wilson score" in shown
    assert "plus-or-minus (Wald)" in shown
    assert percent(audit.methods.set_index("method").loc["wald", "minimum_coverage"], "down") in shown
    assert audit.verdict._repr_html_() == audit.by_n[0]._repr_html_()
    assert "<strong>Recommended.</strong>" in audit.verdict._repr_html_()
    nothing = finished("none")._repr_html_()
    assert "<strong>None recommended.</strong>" in nothing
