"""The page in a real browser: sealed, quiet, usable by keyboard, on a narrow screen, without scripts, on paper."""

import json
import math
import re
from collections.abc import Callable
from pathlib import Path

import pytest
from browsing import Browser
from click.testing import CliRunner
from report_audits import PLANS, finished

from coverage_lab.cli import cli
from coverage_lab.report import load
from coverage_lab.report.words import limit, limit_places

Report = Callable[[str], Path]
TAB, ENTER, SPACE = "\ue004", "\ue007", " "
PHONE = (320, 700)


@pytest.fixture
def opened(browser: Browser, report: Report) -> Browser:
    """The two-sided report on a wide screen."""
    browser.open(report("two-sided") / "report.html")
    return browser


@pytest.mark.parametrize("name", ["two-sided", "several", "upper", "none", "hostile"])
def test_nothing_is_asked_for_and_nothing_is_complained_of(name: str, browser: Browser, report: Report) -> None:
    page = report(name) / "report.html"
    browser.open(page)
    asked = [url for url in browser.requests() if not url.startswith("data:image/png;base64,")]
    assert asked == [page.as_uri()]
    assert browser.js("return performance.getEntriesByType('resource').map((e) => e.name)") == []
    assert browser.complaints() == []


def test_a_request_and_a_complaint_would_be_noticed(browser: Browser, report: Report, tmp_path: Path) -> None:
    text = (report("enumerated") / "report.html").read_text(encoding="utf-8")
    leaky = re.sub(r'<meta http-equiv="Content-Security-Policy"[^>]*>', "", text)
    (tmp_path / "leaky.html").write_text(leaky.replace("</main>", '<img src="other.png" alt=""></main>'), "utf-8")
    browser.open(tmp_path / "leaky.html")
    assert [url for url in browser.requests() if url.endswith("other.png")]
    assert browser.complaints()


def test_the_policy_stops_what_is_not_the_pages_own(browser: Browser, report: Report, tmp_path: Path) -> None:
    text = (report("enumerated") / "report.html").read_text(encoding="utf-8")
    foreign = '<script>window.reached = 1</script><img src="other.png" alt="" onerror="window.reached = 2"></main>'
    (tmp_path / "foreign.html").write_text(text.replace("</main>", foreign), "utf-8")
    browser.open(tmp_path / "foreign.html")
    assert browser.js("return window.reached ?? null") is None
    assert any("Content Security Policy" in words for words in browser.complaints())


def test_hostile_words_are_words(browser: Browser, report: Report) -> None:
    browser.open(report("hostile") / "report.html")
    title = str(PLANS["hostile"]["title"])
    assert " ".join(browser.js("return document.querySelector('h1').textContent").split()) == " ".join(title.split())
    assert browser.js("return document.querySelectorAll('main b, h1 *').length > 0 && document.scripts.length") == 2
    assert not browser.all("img[src='x']")
    assert browser.js("return [...document.querySelectorAll('b')].some((e) => e.textContent === 'bold')") is False


@pytest.mark.parametrize("name", ["two-sided", "several", "upper", "none", "hostile"])
def test_no_sideways_scroll_on_a_narrow_screen(name: str, browser: Browser, report: Report) -> None:
    browser.open(report(name) / "report.html", size=PHONE)
    for button in browser.all("#t-methods tbody button")[:2]:
        browser.js("arguments[0].click()", button)
    assert browser.js("return document.documentElement.scrollWidth") <= PHONE[0]


def test_sideways_scroll_would_be_noticed(browser: Browser, report: Report) -> None:
    browser.open(report("enumerated") / "report.html", size=PHONE)
    browser.js("document.querySelector('h1').innerHTML = '<pre>' + 'x'.repeat(90) + '</pre>'")
    browser.js("document.querySelector('h1 pre').style = 'overflow: visible'")
    assert browser.js("return document.documentElement.scrollWidth") > PHONE[0]


# --- sorting, narrowing down, opening


def shown_methods(browser: Browser) -> list[str]:
    return browser.js(
        "return [...document.querySelectorAll('#t-methods tbody tr:not(.detail)')].filter((row) => !row.hidden)"
        ".map((row) => row.cells[0].textContent.trim())"
    )


def column(browser: Browser, k: int) -> list[float]:
    return browser.js(
        "return [...document.querySelectorAll('#t-methods tbody tr:not(.detail)')]"
        ".map((row) => row.cells[arguments[0]].dataset.sort).filter((v) => v !== undefined).map(Number)",
        k,
    )


def test_the_method_table_is_sorted_by_every_column(browser: Browser, report: Report) -> None:
    browser.open(report("hostile") / "report.html")
    before = shown_methods(browser)
    for k, button in enumerate(browser.all("#t-methods thead button")):
        for direction in ("ascending", "descending"):
            browser.js("arguments[0].click()", button)
            assert browser.js("return arguments[0].closest('th').getAttribute('aria-sort')", button) == direction
            assert len(browser.all("#t-methods [aria-sort]")) == 1
            values = column(browser, k)
            assert values == sorted(values, reverse=direction == "descending")
            assert sorted(shown_methods(browser)) == sorted(before)
            if 0 < k < 9:
                assert shown_methods(browser)[-1] == "second-order corrected", "without a figure: last, either way"
    assert shown_methods(browser) != before


def test_the_method_table_is_narrowed_down_by_words_and_by_the_standard(browser: Browser, report: Report) -> None:
    browser.open(report("hostile") / "report.html")
    labels = list(finished("hostile").methods["label"])
    browser.type("#filter-words", "WILSON")
    assert shown_methods(browser) == [label for label in labels if "wilson" in label.lower()]
    assert browser.text("#filter-said") == f"2 of {len(labels)} methods shown"
    browser.type("#filter-words", " ")
    browser.one("#filter-passes").click()
    table = finished("hostile").methods
    assert shown_methods(browser) == list(table.loc[table["passes"].eq(True), "label"])
    browser.type("#filter-words", "no such method")
    assert shown_methods(browser) == []
    browser.one("#filter-passes").click()
    browser.type("#filter-words", " ")
    assert shown_methods(browser) == labels
    assert browser.text("#filter-said") == ""


def test_a_row_opens_to_what_the_method_is_and_stays_with_it(opened: Browser) -> None:
    button = opened.all("#t-methods tbody button")[0]
    assert button.get_attribute("aria-expanded") == "false"
    button.click()
    assert button.get_attribute("aria-expanded") == "true"
    said = opened.text("#t-methods tr.detail")
    for words in ("Standard met yes: worst miss", "Formula", "Known faults", "Source E. B. Wilson"):
        assert words in said
    opened.js("arguments[0].click()", opened.all("#t-methods thead button")[1])
    assert opened.js(
        "return document.querySelector('tr.detail').previousElementSibling.cells[0].textContent.includes('Wilson')"
    )
    opened.type("#filter-words", "wald")
    assert not opened.all("#t-methods tr.detail")
    assert button.get_attribute("aria-expanded") == "false"


# --- the keyboard alone


def test_the_first_key_offers_to_skip_to_the_verdict(opened: Browser) -> None:
    opened.press(TAB)
    assert opened.focused("e.textContent") == "Skip to the verdict"
    assert opened.focused("e.getBoundingClientRect().left") >= 0
    opened.press(ENTER)
    assert opened.focused("e.id") == "verdict"


def test_every_control_is_reached_seen_and_works_by_keyboard(opened: Browser) -> None:
    reachable = "a[href], button, input, summary, [tabindex='0']"
    controls = opened.js(
        f'return [...document.querySelectorAll("{reachable}")].filter((e) => e.checkVisibility()).length'
    )
    seen, unseen = 0, []
    for _ in range(controls + 5):
        opened.press(TAB)
        if opened.focused("e === document.body"):
            break
        seen += 1
        if not opened.focused(
            "getComputedStyle(e).outlineStyle !== 'none' && parseFloat(getComputedStyle(e).outlineWidth) >= 2"
        ):
            unseen.append(opened.focused("e.outerHTML.slice(0, 80)"))
    assert unseen == []
    assert seen == controls
    sort = opened.all("#t-methods thead button")[1]
    opened.js("arguments[0].focus()", sort)
    opened.press(ENTER)
    assert opened.js("return arguments[0].closest('th').ariaSort", sort) == "ascending"
    row = opened.all("#t-methods tbody button")[0]
    opened.js("arguments[0].focus()", row)
    opened.press(SPACE)
    assert opened.all("tr.detail")
    opened.js("document.querySelector('summary').focus()")
    opened.press(ENTER)
    assert opened.js("return document.querySelector('details').open") is True


# --- the interval for a count


def test_the_box_equals_the_interval_command_for_50_counts(browser: Browser, report: Report) -> None:
    for name, phrase in (("two-sided", "{} to {}"), ("upper", "at most {1}")):
        folder = report(name)
        browser.open(folder / "report.html")
        n = load(folder).document["verdict"]["n"]
        for events in range(0, n + 1, math.ceil(n / 24)):
            asked = ["interval", str(events), str(n), "--from", str(folder), "--method", "wald", "--json"]
            first = json.loads(CliRunner().invoke(cli, asked).stdout)["intervals"][0]
            places = limit_places(n)
            shown = phrase.format(limit(first["lower"], "down", places), limit(first["upper"], "up", places))
            browser.type("#box-events", str(events))
            said = browser.text("#box-answer")
            assert said.startswith(f"{events} of {n}: {shown}."), said
            assert ("Zero events is not zero risk" in said) == (events == 0)
            assert ("not certainty" in said) == (events == n)


def test_the_box_refuses_another_n_with_the_command_that_answers(
    opened: Browser, report: Report, monkeypatch: pytest.MonkeyPatch
) -> None:
    opened.type("#box-events", "3")
    opened.type("#box-trials", "59")
    said = opened.text("#box-answer")
    assert said.startswith("This page answers for 60 trials only, not for 59.")
    command = opened.text("#box-answer code")
    assert command == "coverage-lab interval 3 59 --from ."
    monkeypatch.chdir(report("two-sided"))
    done = CliRunner().invoke(cli, command.split()[1:])
    assert done.exit_code == 0
    assert "3 events in 59 trials" in done.stdout
    assert "%" not in said


@pytest.mark.parametrize(
    ("events", "trials", "said"),
    [
        ("61", "60", "Events: a whole number from 0 to 60."),
        ("-1", "60", "Events: a whole number from 0 to 60."),
        ("2.5", "60", "Events: a whole number from 0 to 60."),
        ("<b>1</b>", "60", "Events: a whole number from 0 to 60."),
        ("3", " ", "Trials: a whole number."),
        ("3", "1e9", "Trials: a whole number."),
        (" ", "60", "Type the number of events."),
    ],
)
def test_the_box_says_what_it_wants(events: str, trials: str, said: str, opened: Browser) -> None:
    opened.type("#box-events", events)
    opened.type("#box-trials", trials)
    assert opened.text("#box-answer") == said


# --- without scripts, and on paper


def test_the_page_is_complete_without_scripts(browser: Browser, report: Report) -> None:
    browser.open(report("two-sided") / "report.html", scripts=False)
    for gone in ("#box", "#filter"):
        assert not browser.one(gone).is_displayed()
    assert not browser.all("th button")
    audit = finished("two-sided")
    assert audit.verdict.sentence.split(":")[0] in browser.text("#verdict").replace("\u202f", " ")
    described = browser.text(".described")
    for row in audit.methods.to_dict("records"):
        assert row["label"] in browser.text("#t-methods")
        assert " ".join(row["faults"].split()) in described
    rows = [int(e.text) for e in browser.all("#intervals tbody th")]
    assert rows == list(range(61))
    browser.do("Emulation.setScriptExecutionDisabled", value=False)


def test_the_page_prints(opened: Browser, tmp_path: Path) -> None:
    opened.type("#filter-words", "wald")  # what is hidden on the screen is on the paper all the same
    printed = opened.pdf()
    assert printed.startswith(b"%PDF-")
    pages = len(re.findall(rb"/Type\s*/Page\b", printed))
    assert 4 <= pages <= 14
    opened.do("Emulation.setEmulatedMedia", media="print")
    shown = {
        css: [e.is_displayed() for e in opened.all(css)]
        for css in ("nav", "#box", "#filter", "figure", ".cards article")
    }
    assert not any(shown["nav"] + shown["#box"] + shown["#filter"])
    assert all(shown["figure"] + shown[".cards article"])
    assert len(shown["figure"]) >= 5
    assert all(row.is_displayed() for row in opened.all("#t-methods tbody tr"))
    opened.do("Emulation.setEmulatedMedia", media="")
