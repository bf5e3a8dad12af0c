"""axe-core finds nothing, in light and dark; and would find what is broken on purpose."""

from collections.abc import Callable
from pathlib import Path

import pytest
from browsing import Browser

Report = Callable[[str], Path]


@pytest.mark.parametrize("dark", [False, True], ids=["light", "dark"])
@pytest.mark.parametrize("name", ["two-sided", "several", "upper", "hostile"])
def test_nothing_is_found(name: str, dark: bool, browser: Browser, report: Report, axe: str) -> None:
    browser.open(report(name) / "report.html", dark=dark)
    browser.js("document.querySelector('#t-methods tbody button').click()")
    browser.type("#box-events", "0")
    browser.type("#filter-words", "wil")
    assert browser.js("return getComputedStyle(document.body).backgroundColor") == (
        "rgb(17, 23, 29)" if dark else "rgb(255, 255, 255)"
    )
    assert browser.faults(axe) == []


def test_nothing_is_found_on_a_narrow_screen(browser: Browser, report: Report, axe: str) -> None:
    browser.open(report("two-sided") / "report.html", size=(320, 700))
    assert browser.faults(axe) == []


@pytest.mark.parametrize(
    ("broken", "rule"),
    [
        ("document.querySelector('img').removeAttribute('alt')", "image-alt"),
        ("document.documentElement.removeAttribute('lang')", "html-has-lang"),
        ("document.querySelector('.sentence').style.color = '#b0b0b0'", "color-contrast"),
        ("document.querySelector('label[for=box-events]').remove()", "label"),
    ],
    ids=["no alt", "no lang", "grey text", "no label"],
)  # fmt: skip
def test_what_is_broken_is_found(broken: str, rule: str, browser: Browser, report: Report, axe: str) -> None:
    browser.open(report("two-sided") / "report.html")
    browser.js(broken)
    assert rule in {fault.split(":")[0] for fault in browser.faults(axe)}
