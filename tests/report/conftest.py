"""Report folders for the tests of this directory."""

from collections.abc import Callable
from functools import cache
from pathlib import Path

import pytest
from report_audits import finished

from coverage_lab.report import write


@pytest.fixture(scope="session")
def report(tmp_path_factory: pytest.TempPathFactory) -> Callable[[str], Path]:
    """Report folders by the name of their plan, each written once and not to be changed."""
    root = tmp_path_factory.mktemp("reports")

    @cache
    def written(name: str) -> Path:
        return write(finished(name), root / name).parent

    return written
