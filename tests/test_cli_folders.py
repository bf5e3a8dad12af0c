"""Where a report goes when the user names no folder: a quick question never meets the answer to an earlier one."""

from pathlib import Path

import pytest
from click.testing import CliRunner

from coverage_lab.checks import InputFault
from coverage_lab.cli import cli
from coverage_lab.cli.folders import first_free


def refuse(*taken: str):
    def check(folder: Path) -> None:
        if folder.name in taken:
            raise InputFault(f"{folder}: taken")

    return check


def test_the_first_free_folder_is_taken() -> None:
    assert first_free(Path("x/answer"), refuse()) == Path("x/answer")
    assert first_free(Path("x/answer"), refuse("answer", "answer-2")) == Path("x/answer-3")


def test_two_quick_questions_have_a_folder_each(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)
    few = ["--replicates", "200", "--quiet"]
    for n in ("40", "60", "40"):
        done = CliRunner().invoke(cli, ["audit", "--n", n, "--range", "0.1", "0.3", *few])
        assert done.exit_code == 0, done.output
    assert sorted(path.name for path in tmp_path.iterdir()) == ["audit-report", "audit-report-2"]
