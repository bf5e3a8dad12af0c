"""The README's commands and its Python run as printed, and its figures are the program's.

The two lines that make an environment are run whole by .ci/run; here their last command runs in this environment.
"""

import json
import os
import re
import shlex
import subprocess
import sys
from pathlib import Path

import pytest

ROOT = Path(__file__).parents[1]
README = (ROOT / "README.md").read_text(encoding="utf-8")
SHELL = [line for block in re.findall(r"```sh\n(.*?)```", README, re.S) for line in block.splitlines()]
PYTHON = re.findall(r"```python\n(.*?)```", README, re.S)


def run(words: list[str], folder: Path) -> subprocess.CompletedProcess[str]:
    environment = {**os.environ, "PYTHONWARNINGS": "error::UserWarning"}
    return subprocess.run(words, cwd=folder, env=environment, capture_output=True, text=True, timeout=240, check=False)


def commands() -> list[list[str]]:
    """Every coverage-lab command that the README prints, as words for this interpreter."""
    last = [line.split("&&")[-1].strip().removeprefix(".venv/bin/") for line in SHELL]
    return [[sys.executable, "-m", "coverage_lab", *shlex.split(line)[1:]] for line in last if "coverage-lab" in line]


def test_every_command_runs_in_the_order_printed(tmp_path: Path) -> None:
    assert len(commands()) == 9
    sizes = []
    for words in commands():
        done = run(words, tmp_path)
        assert done.returncode == 0, (words, done.stderr)
        assert "Traceback" not in done.stderr
        sizes += re.findall(r"^n = (\d+) units", done.stdout) if "sample-size" in words else []
    assert sizes == ["473", "380", "114"]
    assert all(f" {n}" in README for n in sizes)
    assert (tmp_path / "demonstration" / "report.html").exists()


def test_two_whole_commands_for_a_fresh_machine() -> None:
    whole = [line for line in SHELL if line.startswith("python3 -m venv")]
    assert len(whole) == 2
    assert whole[1].endswith("-m pytest")


def test_the_python_example_prints_what_it_says(tmp_path: Path) -> None:
    (tmp_path / "example.py").write_text(PYTHON[0], encoding="utf-8")
    done = run([sys.executable, "example.py"], tmp_path)
    assert done.returncode == 0, done.stderr
    promised = re.search(r"# (0\.\d+ at p = 0\.\d+)", PYTHON[0])
    assert promised is not None
    assert done.stdout.strip() == promised.group(1)


def test_the_table_is_the_committed_report() -> None:

    rows = {
        row["label"]: row
        for row in json.loads((ROOT / "reports/demonstration/audit.json").read_text(encoding="utf-8"))["methods"]
    }
    printed = re.findall(r"^\| (.+?)(?: \(named\))? \| ([\d.]+) % \| ([\d.]+) % \| ([\d.]+) \|$", README, re.M)
    assert len(printed) == 3
    for label, worst, mean, width in printed:
        row = rows[label]
        assert float(worst) == pytest.approx(100 * row["minimum_coverage"], abs=0.1)
        assert float(mean) == pytest.approx(100 * row["mean_coverage"], abs=0.1)
        assert float(width) == pytest.approx(100 * row["mean_width"], abs=0.0051)


def test_length_and_opening() -> None:
    assert 60 <= len(README.splitlines()) <= 100
    assert README.splitlines()[2].startswith("You plan a study whose main result is one proportion")
