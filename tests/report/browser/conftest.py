"""One real headless browser for all tests of this directory; they skip, and say why, where there is none."""

import os
import shutil
from collections.abc import Iterator
from pathlib import Path

import pytest
from browsing import Browser

FLAGS = (
    *("--headless=new", "--no-sandbox", "--disable-gpu", "--disable-dev-shm-usage", "--disable-quic", "--no-first-run"),
    *("--disable-background-networking", "--disable-component-update", "--disable-sync"),
)


@pytest.fixture(scope="session")
def browser(tmp_path_factory: pytest.TempPathFactory) -> Iterator[Browser]:
    """Chromium, driven without downloading anything."""
    webdriver = pytest.importorskip("selenium.webdriver", reason="selenium is not installed (extra test)")
    binary, driver = shutil.which("chromium"), shutil.which("chromedriver")
    if binary is None or driver is None:
        pytest.skip("chromium and chromedriver are not installed")
    options = webdriver.ChromeOptions()
    options.binary_location = binary
    for flag in (*FLAGS, f"--user-data-dir={tmp_path_factory.mktemp('profile')}"):
        options.add_argument(flag)
    options.set_capability("goog:loggingPrefs", {"browser": "ALL", "performance": "ALL"})
    service = webdriver.ChromeService(executable_path=driver)
    with webdriver.Chrome(options=options, service=service) as opened:
        opened.set_page_load_timeout(30)
        yield Browser(opened)


@pytest.fixture(scope="session")
def axe() -> str:
    """The source of axe-core, which is not part of this project."""
    path = os.environ.get("COVERAGE_LAB_AXE")
    if not path:
        pytest.skip("COVERAGE_LAB_AXE does not name axe-core's axe.min.js")
    return Path(path).read_text(encoding="utf-8")
