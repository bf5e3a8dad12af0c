"""`coverage-lab page`: the page again from saved files alone; folders that are no report."""

import json
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from coverage_lab import study
from coverage_lab.cli import cli
from coverage_lab.plan import make_plan

PLAN = {
    "outcome": {"range": [0.02, 0.1]},
    "sample": {"n": 30},
    "simulation": {"replicates": 100, "grid": [0.05]},
    "methods": {"only": ["wilson", "wald"]},
}


@pytest.fixture(scope="module")
def saved(tmp_path_factory: pytest.TempPathFactory) -> dict[str, bytes]:
    """A whole report folder."""
    folder = study.write_report(study.audit(make_plan(PLAN)), tmp_path_factory.mktemp("page") / "report").parent
    return {str(file.relative_to(folder)): file.read_bytes() for file in folder.rglob("*") if file.is_file()}


@pytest.fixture
def folder(saved: dict[str, bytes], tmp_path: Path) -> Path:
    """Its data alone, in a folder of its own."""
    for name, content in saved.items():
        if not name.startswith("figures") and name != "report.html":
            (tmp_path / name).write_bytes(content)
    return tmp_path


def run(*arguments: object) -> Result:
    return CliRunner().invoke(cli, ["page", *map(str, arguments)])


def test_the_page_is_rebuilt_byte_for_byte(folder: Path, saved: dict[str, bytes]) -> None:
    done = run(folder)
    assert (done.exit_code, done.stdout, done.stderr) == (0, f"{folder / 'report.html'}\n", "")
    assert {str(f.relative_to(folder)): f.read_bytes() for f in folder.rglob("*") if f.is_file()} == saved
    assert run(folder, "--quiet").output == ""


@pytest.mark.parametrize("name", ["nowhere", "empty", "file"])
def test_what_is_no_report_is_one_line(name: str, tmp_path: Path) -> None:
    (tmp_path / "empty").mkdir()
    (tmp_path / "file").write_text("")
    done = run(tmp_path / name)
    assert done.exit_code == 2
    neither = "expected a report folder, but it holds neither audit.json nor sample-size.json"
    assert done.stderr == f"{tmp_path / name}: {neither}\n"


@pytest.mark.parametrize(
    ("file", "change", "said"),
    [
        ("audit.json", "{}", "expected an audit saved by coverage-lab"),
        ("audit.json", '{"format": "coverage-lab/audit/1"}', "expected the keys plan, confidence"),
        ("cells.csv", "n,p\n1,2\n", "expected the columns n, p, method"),
        ("curve.csv", "n,p,method,coverage,mean_width\n30,x,wald,0.9,0.1\n", "expected the table that an audit saved"),
        ("steady.csv", "", "expected the table that an audit saved"),
        ("interval-table.csv", None, "cannot be read or written: No such file"),
    ],
)
def test_damaged_files_are_one_line_and_the_old_page_stays(
    file: str, change: str | None, said: str, folder: Path
) -> None:
    (folder / "report.html").write_text("old")
    if change is None:
        (folder / file).unlink()
    else:
        (folder / file).write_text(change)
    done = run(folder)
    assert done.exit_code == 2
    assert done.stdout == ""
    assert len(done.stderr.splitlines()) == 1
    assert file in done.stderr
    assert said in done.stderr
    assert (folder / "report.html").read_text() == "old"


def test_files_of_two_audits_are_one_line(folder: Path) -> None:
    document = json.loads((folder / "audit.json").read_text())
    del document["verdict"]["n"]
    (folder / "audit.json").write_text(json.dumps(document))
    done = run(folder)
    assert done.exit_code == 2
    assert "damaged or do not belong together" in done.stderr
    assert len(done.stderr.splitlines()) == 1
