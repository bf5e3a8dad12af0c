"""The command line: answers on stdout, messages on stderr, exit codes, and never a traceback."""

import errno
import json
import os
import subprocess
import sys
from pathlib import Path

import click
import pytest
from click.testing import CliRunner, Result
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import coverage_lab
from coverage_lab import study
from coverage_lab.checks import InputFault
from coverage_lab.cli import cli
from coverage_lab.cli.answer import MOST_LINES
from coverage_lab.intervals import CATALOGUE, EVERY
from coverage_lab.plan import STARTER, read_plan

QUICK = ["--n", "60", "--range", "0.005", "0.05", "--replicates", "200"]
HEAVY = ("numpy", "scipy", "pandas", "matplotlib", "pydantic", "rich", "joblib", "jinja2")


@pytest.fixture(autouse=True)
def _elsewhere(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Default folders are made in the working directory."""
    monkeypatch.chdir(tmp_path)


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli, list(arguments))


def process(*arguments: str, **keywords) -> subprocess.CompletedProcess:
    """The command in a process of its own, from the package that is tested here."""
    path = os.pathsep.join([str(Path(coverage_lab.__file__).parents[1]), os.environ.get("PYTHONPATH", "")])
    environment = {**os.environ, "PYTHONPATH": path}
    command = [sys.executable, "-m", "coverage_lab", *arguments]
    return subprocess.run(
        command, capture_output=True, text=True, env=environment, timeout=120, check=False, **keywords
    )


def no_page(monkeypatch: pytest.MonkeyPatch) -> None:
    """Leave the report out: it is tested elsewhere, and its figures take seconds."""
    monkeypatch.setattr(study, "write_report", lambda audit, folder, **rest: Path(folder) / "report.html")


def never(*arguments: object, **keywords: object) -> None:
    raise AssertionError("the long work must not begin")


# --- help


@pytest.mark.parametrize(
    "arguments",
    [["--help"], *([name, "-h"] for name in ("audit", "sample-size", "interval", "methods", "page", "plan"))],
)
def test_help_loads_nothing_heavy(arguments: list[str]) -> None:
    code = (
        "import sys\nfrom coverage_lab.cli import cli\n"
        f"try:\n    cli({arguments!r})\nexcept SystemExit as end:\n    assert end.code == 0\n"
        f"print('loaded:', [name for name in {HEAVY!r} if name in sys.modules])"
    )
    path = str(Path(coverage_lab.__file__).parents[1])
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, cwd=path, check=True)
    assert "loaded: []" in done.stdout
    assert "coverage-lab" in done.stdout


@pytest.mark.parametrize("name", ["audit", "sample-size", "interval", "methods", "page", "plan"])
def test_every_command_shows_examples(name: str) -> None:
    shown = run(name, "--help").output
    assert "Examples:" in shown
    assert f"coverage-lab {name}" in shown


def test_every_example_of_the_help_is_understood(monkeypatch: pytest.MonkeyPatch, tmp_path: Path) -> None:
    """Each line of the examples, up to the work itself."""
    run("plan", "plan.toml")
    monkeypatch.setattr(study, "audit", lambda *a, **k: (_ for _ in ()).throw(InputFault("reached the work")))
    for line in run("audit", "--help").output.splitlines():
        if line.strip().startswith("coverage-lab audit"):
            arguments = line.split(" > ")[0].split()[1:]
            assert run(*arguments).stderr == "reached the work\n", line


@pytest.mark.parametrize("name", ["replay", "check-values", "audits"])
def test_unknown_commands_are_unknown(name: str) -> None:
    done = run(name)
    assert done.exit_code == 2
    assert f"No such command '{name}'" in done.stderr


@pytest.mark.parametrize("arguments", [["methods", "--jso"], ["audit", "a", "b"], ["plan"], ["audit", "--n"]])
def test_wrong_usage_is_exit_2(arguments: list[str]) -> None:
    done = run(*arguments)
    assert done.exit_code == 2
    assert done.stdout == ""
    assert "Error:" in done.stderr


# --- plan


def test_plan_writes_the_starter_and_never_overwrites() -> None:
    done = run("plan", "my plan.toml")
    assert done.exit_code == 0
    assert "coverage-lab audit 'my plan.toml'" in done.stdout
    assert Path("my plan.toml").read_bytes() == STARTER.read_bytes()
    assert read_plan("my plan.toml").sizes == (250,)
    Path("my plan.toml").write_text("mine")
    again = run("plan", "my plan.toml")
    assert again.exit_code == 2
    assert again.stderr == "my plan.toml: expected a new file, but this one is there already and stays as it is\n"
    assert Path("my plan.toml").read_text() == "mine"


def test_plan_where_nothing_can_be_written() -> None:
    done = run("plan", "no/such/folder/plan.toml")
    assert done.exit_code == 2
    assert done.stderr == "no/such/folder/plan.toml: cannot be read or written: No such file or directory\n"


# --- methods


def test_methods_lists_the_catalogue_in_its_order() -> None:
    lines = run("methods").stdout.splitlines()
    assert lines[0].split() == ["name", "label", "sides", "needs", "largest", "n", "source"]
    assert [line.split()[0] for line in lines[1:]] == list(EVERY)
    for line, method in zip(lines[1:], EVERY.values(), strict=True):
        assert method.label in line
        assert line.endswith(method.source)


def test_methods_as_json() -> None:
    listed = json.loads(run("methods", "--json").stdout)["methods"]
    assert [entry["name"] for entry in listed] == list(EVERY)
    blaker = next(entry for entry in listed if entry["name"] == "blaker")
    assert blaker["sides"] == ["two-sided"]
    assert next(entry for entry in listed if entry["name"] == "shortest-exact")["largest_n"] == 1000


# --- audit


def test_the_answer_is_short_and_says_why(monkeypatch: pytest.MonkeyPatch) -> None:
    no_page(monkeypatch)
    done = run("audit", "--replicates", "200")
    assert done.exit_code == 0
    assert done.stderr == ""
    lines = done.stdout.splitlines()
    assert len(lines) <= MOST_LINES == 25
    answer = " ".join(done.stdout.split())
    for words in (
        "n = 250",
        "Worst interval coverage",
        "exact minimum",
        "Mean interval coverage",
        "Mean width",
        "plus-or-minus (Wald)",
        "Cross-check of the two routes",
        "demonstration-report/report.html",
    ):
        assert words in answer


def test_several_n_one_sided(monkeypatch: pytest.MonkeyPatch) -> None:
    no_page(monkeypatch)
    done = run("audit", "--n", "20", *QUICK, "--side", "upper")
    assert done.exit_code == 0
    answer = " ".join(done.stdout.split())
    assert "By n 20: clopper-pearson, 60: clopper-pearson" in answer
    assert "Bound by events 0.1392 at 0" in answer, (
        "0 of 20, one-sided 95 %: 1 - 0.05^(1/20) = .1391083, rounded outward"
    )
    assert len(done.stdout.splitlines()) <= 25


def test_json_is_all_there_is_on_stdout(monkeypatch: pytest.MonkeyPatch) -> None:
    no_page(monkeypatch)
    done = run("audit", *QUICK, "--json")
    document = json.loads(done.stdout)
    assert document["format"] == "coverage-lab/audit/1"
    assert document["plan"]["sample"] == {"n": 60}
    assert document["plan"]["title"] == "Untitled plan"
    assert document["verdict"]["status"] == "recommended"
    assert done.exit_code == 0


def test_quiet_prints_nothing(monkeypatch: pytest.MonkeyPatch) -> None:
    no_page(monkeypatch)
    done = run("audit", *QUICK, "--quiet")
    assert (done.exit_code, done.output) == (0, "")


def test_no_recommendation_is_exit_1(monkeypatch: pytest.MonkeyPatch) -> None:
    no_page(monkeypatch)
    text = "outcome.range = [0.005, 0.05]\nsample.n = 60\nsimulation.replicates = 200\nmethods.prefer = ['wald']\n"
    Path("plan.toml").write_text(text)
    done = run("audit", "plan.toml")
    assert done.exit_code == 1
    assert "Closest, not recommended" in done.stdout
    assert json.loads(run("audit", "plan.toml", "--json").stdout)["verdict"]["status"] == "none"


@pytest.mark.parametrize(
    ("arguments", "folder"),
    [
        ([], "demonstration-report"),
        (["--confidence", "0.9"], "demonstration-report"),
        (["--n", "60", "--range", "0.01", "0.05"], "audit-report"),
        (["--n", "60", "--expected", "0.01"], "audit-report"),
        (["plans/jackets.toml"], "jackets-report"),
        (["plans/jackets.toml", "--out", "here"], "here"),
    ],
)
def test_where_the_report_goes(arguments: list[str], folder: str, monkeypatch: pytest.MonkeyPatch) -> None:
    Path("plans").mkdir()
    Path("plans/jackets.toml").write_text("outcome.expected = 0.1\nsample.n = 20\n")
    written = []
    monkeypatch.setattr(study, "audit", lambda plan, **keywords: plan)
    monkeypatch.setattr(study, "write_report", lambda audit, folder, **rest: written.append(folder) or 1 / 0)
    with pytest.raises(ZeroDivisionError):
        CliRunner().invoke(cli, ["audit", *arguments], catch_exceptions=False)
    assert written == [Path(folder)]


def test_options_reach_the_work(monkeypatch: pytest.MonkeyPatch) -> None:
    seen = {}

    def work(plan, workers, progress, keep):
        seen.update(plan=plan, workers=workers, progress=progress, keep=keep)
        raise InputFault("reached the work")

    monkeypatch.setattr(study, "audit", work)
    options = [
        "--confidence",
        "0.9",
        "--side",
        "lower",
        "--seed",
        "7",
        "--workers",
        "2",
        "--n",
        "30",
        "--expected",
        "0.9",
    ]
    assert run("audit", *options, "--out", "deep/er").stderr == "reached the work\n"
    plan = seen["plan"]
    assert (plan.confidence, plan.side, plan.simulation.seed, plan.sizes) == (0.9, "lower", 7, (30,))
    assert (plan.outcome.expected, plan.outcome.low, plan.outcome.high) == (0.9, 0.8, 0.95)
    assert (seen["workers"], seen["progress"]) == (2, None), "progress goes to a terminal only"
    assert seen["keep"] == Path.cwd() / ".er.kept", "beside the report, where a folder exists already"


def test_all_faults_of_the_command_line_at_once(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(study, "audit", never)
    done = run("audit", "--n", "0", "--range", "0.5", "x", "--confidence", "95", "--workers", "0", "--side", "up")
    assert done.exit_code == 2
    assert done.stdout == ""
    assert done.stderr.splitlines() == [
        "--confidence 95: expected a number strictly between 0 and 1 (95 % is written 0.95)",
        "--side up: expected two-sided, upper or lower",
        "--range 0.5 x: expected [low, high] with 0 <= low <= high <= 1, not [0, 0] or [1, 1]",
        "--n 0: expected a whole number from 1 to 10000000",
        "--workers 0: expected a whole number of at least 1",
    ]
    assert not list(Path.cwd().iterdir()), "nothing is written"


@pytest.mark.parametrize(
    ("arguments", "line"),
    [
        (
            ["--n", "60"],
            "[outcome]: expected the key range or expected, which an audit needs; or give --range or --expected",
        ),
        (["--expected", "0.1"], "[sample]: expected the key n or candidates, which an audit needs; or give --n"),
        (["--expected", "0", "--n", "9"], "--expected 0: expected a number strictly between 0 and 1"),
        (["none.toml"], "none.toml: expected a plan file, but there is no such file"),
        (["."], ".: expected a plan file, but this is a folder"),
        (["--n", "-5", "--expected", "0.1"], "--n -5: expected a whole number from 1 to 10000000"),
        (["--replicates", "-1"], "--replicates -1: expected a whole number from 1 to 1000000000"),
        (["--seed", "1.5"], "--seed 1.5: expected a whole number from 0 to 9223372036854775807"),
    ],
)
def test_unusable_plans(arguments: list[str], line: str, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(study, "audit", never)
    done = run("audit", *arguments)
    assert (done.exit_code, done.stdout, done.stderr) == (2, "", line + "\n")


def test_another_plans_report_is_refused_before_the_work(monkeypatch: pytest.MonkeyPatch) -> None:
    Path("taken").mkdir()
    other = {"format": "coverage-lab/audit/1", "plan": {"title": "Other"}, "provenance": {"plan_sha256": "0"}}
    Path("taken/audit.json").write_text(json.dumps(other))
    monkeypatch.setattr(study, "audit", never)
    done = run("audit", *QUICK, "--out", "taken")
    assert done.exit_code == 2
    assert "'Other'" in done.stderr
    assert "--overwrite" in done.stderr
    assert len(done.stderr.splitlines()) == 1
    monkeypatch.setattr(study, "audit", lambda *a, **k: (_ for _ in ()).throw(InputFault("reached the work")))
    assert run("audit", *QUICK, "--out", "taken", "--overwrite").stderr == "reached the work\n"


def test_folders_that_cannot_be_are_refused_before_the_work(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(study, "audit", never)
    Path("file").write_text("")
    done = run("audit", *QUICK, "--out", "file/below")
    assert (done.exit_code, done.stderr) == (
        2,
        f"file/below: expected a folder for the report, but {Path.cwd() / 'file'} is a file\n",
    )
    monkeypatch.setattr(os, "access", lambda path, mode: False)
    done = run("audit", *QUICK, "--out", "new/below")
    assert (done.exit_code, done.stderr) == (
        2,
        f"new/below: expected a folder for the report, but {Path.cwd()} is not writable\n",
    )


def test_a_full_disk_is_said_and_the_answer_is_not_lost(monkeypatch: pytest.MonkeyPatch) -> None:
    def full(audit, folder, **rest):
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC), str(folder))

    monkeypatch.setattr(study, "write_report", full)
    done = run("audit", *QUICK)
    assert done.exit_code == 2
    assert done.stderr == "audit-report: cannot be read or written: No space left on device\n"
    assert "Worst interval coverage" in done.stdout
    assert "report.html" not in done.stdout


def test_work_that_cannot_be_kept_is_said(monkeypatch: pytest.MonkeyPatch) -> None:
    import sqlite3

    monkeypatch.setattr(study, "audit", lambda *a, **k: (_ for _ in ()).throw(sqlite3.OperationalError("disk is full")))
    done = run("audit", *QUICK)
    assert done.exit_code == 2
    assert done.stderr.endswith(
        ".audit-report.kept: cannot be read or written: finished work cannot be kept: disk is full\n"
    )
    assert len(done.stderr.splitlines()) == 1


@pytest.mark.parametrize("kept", [True, False])
def test_an_interrupted_run_says_how_to_go_on(kept: bool, monkeypatch: pytest.MonkeyPatch) -> None:
    def interrupted(plan, workers, progress, keep):
        if kept:
            keep.write_bytes(b"")
        raise KeyboardInterrupt

    monkeypatch.setattr(study, "audit", interrupted)
    done = run("audit", *QUICK, "--out", "my report")
    assert done.exit_code == 130
    state = f"finished work is kept in {Path.cwd()}/.my report.kept" if kept else "nothing was written"
    assert done.stderr.splitlines() == [
        f"interrupted: {state}; to go on, run again:",
        f"  coverage-lab audit {' '.join(QUICK)} --out 'my report'",
    ]


# --- in a process of its own


def test_the_whole_job_in_a_process(tmp_path: Path) -> None:
    done = process("audit", *QUICK, "--json", cwd=tmp_path)
    assert done.returncode == 0
    assert done.stderr == ""
    assert json.loads(done.stdout) == json.loads((tmp_path / "audit-report" / "audit.json").read_text(encoding="utf-8"))
    assert (tmp_path / "audit-report" / "report.html").is_file()
    assert [path.name for path in tmp_path.iterdir()] == ["audit-report"], "nothing else is left behind"


@pytest.mark.parametrize(
    ("arguments", "code"),
    [
        (["methods"], 0),
        (["audit", "none.toml"], 2),
        (["interval", "9", "5"], 2),
        (["interval", "-1", "5"], 2),
        (["x"], 2),
    ],
)
def test_exit_codes_of_processes(arguments: list[str], code: int, tmp_path: Path) -> None:
    done = process(*arguments, cwd=tmp_path)
    assert done.returncode == code
    assert "Traceback" not in done.stderr
    assert (done.stdout == "") == (code != 0)
    assert (done.stderr == "") == (code == 0)


def test_a_reader_that_stops_is_no_fault(tmp_path: Path) -> None:
    path = str(Path(coverage_lab.__file__).parents[1])
    command = f"{sys.executable} -m coverage_lab methods | head -n 1"
    environment = {**os.environ, "PYTHONPATH": path}
    done = subprocess.run(
        command, shell=True, capture_output=True, text=True, env=environment, check=True, cwd=tmp_path
    )
    assert done.stdout.startswith("name")
    assert done.stderr == ""


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs a device that is always full")
def test_a_full_standard_output_is_one_line(tmp_path: Path) -> None:
    path = str(Path(coverage_lab.__file__).parents[1])
    with Path("/dev/full").open("w") as full:
        command = [sys.executable, "-m", "coverage_lab", "methods"]
        environment = {**os.environ, "PYTHONPATH": path}
        done = subprocess.run(command, stdout=full, stderr=subprocess.PIPE, text=True, env=environment, check=False)
    assert done.returncode == 2
    assert done.stderr == "output: cannot be read or written: No space left on device\n"


def test_letters_that_a_terminal_cannot_show(tmp_path: Path) -> None:
    environment = {
        **os.environ,
        "PYTHONPATH": str(Path(coverage_lab.__file__).parents[1]),
        "PYTHONIOENCODING": "latin-1",
    }
    command = [sys.executable, "-m", "coverage_lab", "methods"]
    done = subprocess.run(command, capture_output=True, encoding="latin-1", env=environment, check=True)
    assert "Clopper\\u2013Pearson" in done.stdout


# --- names handed on


def test_the_package_hands_on_its_public_names() -> None:
    for name in coverage_lab.__all__:
        assert getattr(coverage_lab, name) is not None
        assert name in dir(coverage_lab)
    assert coverage_lab.InputFault is InputFault
    assert coverage_lab.audit is study.audit
    assert coverage_lab.intervals.CATALOGUE is CATALOGUE
    with pytest.raises(AttributeError, match="has no attribute 'audits'"):
        coverage_lab.audits  # noqa: B018


def test_importing_the_package_loads_nothing_heavy() -> None:
    code = f"import sys, coverage_lab; print([name for name in {HEAVY!r} if name in sys.modules])"
    path = str(Path(coverage_lab.__file__).parents[1])
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, cwd=path, check=True)
    assert done.stdout == "[]\n"


# --- no arguments end in a traceback (no system lets one hold a NUL)

OPTIONS = "--n --range --expected --confidence --side --replicates --seed --workers --out --json --method --data --from"
VALUES = "--quiet --overwrite upper two-sided 0.95 95 0 -1 7 250 nan inf 1e400 wilson blaker plan.toml . é -- - 1.5"
WORDS = st.sampled_from([*OPTIONS.split(" "), *VALUES.split(" "), ""])
ARGUMENTS = st.lists(
    WORDS | st.text(st.characters(exclude_categories=("Cs",), exclude_characters="\0"), max_size=4), max_size=7
)


@settings(deadline=None, max_examples=150, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(command=st.sampled_from(["audit", "interval", "methods"]), arguments=ARGUMENTS)
def test_no_arguments_end_in_a_traceback(command: str, arguments: list[str], monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(study, "audit", lambda *a, **k: (_ for _ in ()).throw(InputFault("reached the work")))
    done = run(command, *arguments)
    assert done.exception is None or isinstance(done.exception, SystemExit), done.exc_info
    assert done.exit_code in (0, 2)
    assert (done.stdout == "") == (done.exit_code == 2)
    if done.exit_code == 2:
        assert done.stderr.strip()


def test_commands_are_click_commands_with_help() -> None:
    for name, command in cli.commands.items():
        assert isinstance(command, click.Command)
        assert command.get_short_help_str(limit=200), name
