"""`coverage-lab sample-size`: the questions people ask, each one short command answered on the first screen."""

import errno
import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner, Result
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st
from scipy import stats

import coverage_lab
from coverage_lab import study
from coverage_lab.checks import InputFault
from coverage_lab.cli import cli
from coverage_lab.plan import make_plan
from coverage_lab.records_sizing import Sizing
from coverage_lab.sizing import Interrupted

FEW = 'methods.only = ["wilson", "clopper-pearson", "wald"]\n'
RULE_OUT = ["--rule-out", "0.01", "--events", "1", "--hoped-for", "0.001"]
FLEET = ["--half-width", "0.02", "--assurance", "0.9", "--expected", "0.02", "--population", "6200", "--loss", "0.05"]
CLAIM = ["--goal", "0.9", "--believed", "0.97", "--power", "0.8"]


@pytest.fixture(autouse=True)
def _elsewhere(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    """Default folders are made in the working directory."""
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("COLUMNS", "80")


@pytest.fixture
def _no_page(monkeypatch: pytest.MonkeyPatch) -> None:
    """Leave the report out: it is tested elsewhere, and its figures take seconds."""
    monkeypatch.setattr(study, "write_sizing", lambda sizing, folder, **rest: Path(folder) / "report.html")


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli, ["sample-size", *arguments])


def plan_file(text: str, name: str = "plan.toml") -> str:
    Path(name).write_text(text + FEW, encoding="utf-8")
    return name


def never(*arguments: object, **keywords: object) -> None:
    raise AssertionError("the long work must not begin")


def reached(*arguments: object, **keywords: object) -> None:
    raise InputFault("reached the work")


# --- the three questions


@pytest.mark.usefixtures("_no_page")
def test_rule_out_one_per_cent_with_at_most_one_failure() -> None:
    done = run(*RULE_OUT)
    assert (done.exit_code, done.stderr) == (0, "")
    assert len(done.stdout.splitlines()) <= 25
    said = " ".join(done.stdout.split())
    assert said.startswith("n = 473 units.")
    assert stats.binom.cdf(1, 473, 0.01) <= 0.05 < stats.binom.cdf(1, 472, 0.01)
    assert "(one-sided)" in said
    assert "probability 91.7 %" in said
    assert 0.917 <= stats.binom.cdf(1, 473, 0.001) < 0.918
    assert "sample-size/report.html" in said


@pytest.mark.usefixtures("_no_page")
def test_two_points_either_way_in_a_fleet(monkeypatch: pytest.MonkeyPatch) -> None:
    """380, then 380/(1 + 379/6200) = 358.1, then over .95: 376.96."""
    text = "[outcome]\nexpected = 0.02\n[precision]\nhalf_width = 0.02\nassurance = 0.9\n"
    text += "[design]\npopulation = 6200\n[design.loss]\nrate = 0.05\n[methods]\n"
    Path("plan.toml").write_text(text + FEW.removeprefix("methods."))
    done = run("plan.toml")
    assert (done.exit_code, done.stderr) == (0, "")
    assert len(done.stdout.splitlines()) <= 25
    said = " ".join(done.stdout.split())
    assert said.startswith("n = 380 units; then 359 in the finite population, 377 to make up for losses.")
    assert "finite population of 6 200: 359, losses 5 %: 377" in said
    assert "Wilson score 380 (380) 380 (380) 316 (302) 103 (1)" in said
    assert wilson_half_width(380, 0.04) <= 0.02 < wilson_half_width(379, 0.04)

    seen = []
    monkeypatch.setattr(study, "sample_size", lambda plan, **rest: seen.append(plan) or reached())
    assert run(*FLEET).stderr == "reached the work\n"
    given, written = seen[0].document, coverage_lab.read_plan("plan.toml").document
    for table in ("outcome", "precision", "design"):
        assert given[table] == written[table], "one command, or a plan of a few lines"


def wilson_half_width(n: int, p: float) -> float:
    """E[half-width] of Wilson's interval at p, from its textbook form."""
    z, x = stats.norm.ppf(0.975), np.arange(n + 1)
    half = z / (1 + z**2 / n) * np.sqrt(x / n * (1 - x / n) / n + z**2 / (4 * n**2))
    centre = (x + z**2 / 2) / (n + z**2)
    inside = (np.minimum(centre + half, 1) - np.maximum(centre - half, 0)) / 2
    return float(stats.binom.pmf(x, n, p) @ inside)


@pytest.mark.usefixtures("_no_page")
def test_reliability_above_ninety_per_cent() -> None:
    done = run(*CLAIM)
    assert (done.exit_code, done.stderr) == (0, "")
    assert len(done.stdout.splitlines()) <= 25
    said = " ".join(done.stdout.split())
    assert said.startswith("n = 114 units. Claim that the proportion is above 90 % at 109 events or more")
    powers = {n: power(n) for n in range(95, 200)}
    assert min(n for n in powers if powers[n] >= 0.8) == 100
    assert max(n for n in powers if powers[n] < 0.8) == 113
    assert "n = 114 (first 100)" in said
    assert "exact test 109 or more 2.4 % 87.1 %" in said
    assert "plus-or-minus (Wald) 108 or more 5.5 % 94.3 %" in said


def power(n: int) -> float:
    """Of the exact test of 90 % against 97 %, one-sided 2.5 %."""
    critical = int(np.argmax(stats.binom.sf(np.arange(n + 2) - 1, n, 0.9) <= 0.025))
    return float(stats.binom.sf(critical - 1, n, 0.97))


# --- the answer


EVERYTHING = """\
outcome.range = [0.005, 0.05]
outcome.expected = 0.02
sample.n = 250
sample.horizon = 700
precision.half_width = 0.02
precision.assurance = 0.9
rare.limit = 0.05
rare.events = [0, 1, 2]
rare.hoped_for = 0.005
rare.see_at_least = 1
rare.at_rate = 0.01
decision.goal = 0.05
decision.believed = 0.02
"""


@pytest.mark.usefixtures("_no_page")
def test_all_targets_at_once_still_fit_the_first_screen() -> None:
    done = run(plan_file(EVERYTHING), "--n", "250")
    lines = done.stdout.splitlines()
    assert done.exit_code == 0
    assert len(lines) == 25
    assert max(len(line) for line in lines) <= 80
    said = " ".join(done.stdout.split())
    for words in (
        "Holds from n on (first n)",
        "To rule out 5 %",
        "Claim below 5 %",
        "plus-or-minus (Wald) 10 or fewer",
    ):
        assert words in said
    assert lines[-1] == "Report           plan-sample-size/report.html"


@pytest.mark.usefixtures("_no_page")
def test_what_the_plans_own_n_gives() -> None:
    asked = "outcome.range = [0.005, 0.05]\nprecision.half_width = 0.03\nsample.horizon = 300\n"
    said = " ".join(run(plan_file(asked), "--n", "250").stdout.split())
    assert "n = 250 gives Wilson score: worst interval coverage 92.7 % at p = 0.624 %, expected half-width 2.75" in said
    assert wilson_half_width(250, 0.05) == pytest.approx(0.0274, abs=5e-6)
    said = " ".join(run("--rule-out", "0.01", "--n", "20").stdout.split())
    assert "n = 20 gives 0 events, upper bound 0.1392 (one-sided)" in said, "1 - 0.05^(1/20) = .13911, rounded up"
    said = " ".join(run(*CLAIM, "--n", "100").stdout.split())
    assert "n = 100 gives the exact test claims wrongly in at most 2.4 %, rightly in 81.7 %" in said
    assert power(100) == pytest.approx(0.8179, abs=5e-5)


@pytest.mark.usefixtures("_no_page")
def test_the_taught_formula_and_what_it_delivers() -> None:
    """z²/(4·.02²) = 2400.9, and at 4 % 368.8."""
    said = " ".join(run(plan_file("outcome.expected = 0.02\nprecision.half_width = 0.02\n")).stdout.split())
    assert "Taught formula 2 401 for p = ½, 369 for p = 4 %; plus-or-minus then covers 85.2 % at worst" in said


@pytest.mark.usefixtures("_no_page")
def test_one_sided_plans_speak_of_a_distance() -> None:
    done = run(
        plan_file("side = 'upper'\noutcome.range = [0.1, 0.1]\nprecision.half_width = 0.1\nsample.horizon = 90\n")
    )
    assert "P(" not in done.stdout, "no assurance is asked"
    assert "distance" in done.stdout
    assert "Clopper–Pearson" in done.stdout


@pytest.mark.usefixtures("_no_page")
def test_quiet_prints_nothing() -> None:
    done = run(*RULE_OUT, "--quiet")
    assert (done.exit_code, done.output) == (0, "")


@pytest.mark.usefixtures("_no_page")
def test_json_has_the_stable_keys() -> None:
    done = run(plan_file(EVERYTHING), "--json")
    document = json.loads(done.stdout)
    assert set(document) >= {"methods", "formula", "rare", "seen", "decision", "inflated", "verdict"}
    first = document["methods"][0]
    assert set(first) >= {"method", "first_n", "safe_n", "by"}
    assert set(first["by"]) == {"expected_width", "assurance", "coverage"}
    assert set(first["by"]["coverage"]) >= {"first_n", "safe_n"}
    assert set(document["formula"]) >= {"worst_case", "guess"}
    assert set(document["rare"][0]) >= {"events", "n", "bound", "probability_at_hoped_for"}
    assert set(document["seen"]) >= {"events", "n", "probability"}
    assert set(document["decision"]) >= {"first_n", "safe_n", "critical", "size", "power", "by_method"}
    assert set(document["decision"]["by_method"][0]) >= {"method", "critical", "worst_size", "power"}
    assert set(document["inflated"]) >= {"design_effect", "finite", "loss", "whole_clusters", "units"}
    assert [row["n"] for row in document["rare"]] == [59, 93, 124], "one-sided 95 %, 5 %: exact"
    assert document["seen"]["n"] == 299, "1 - .99^299 = .9505"
    assert document["plan"]["sample"] == {"n": 250, "horizon": 700}


# --- exit codes


@pytest.mark.usefixtures("_no_page")
def test_no_n_within_the_horizon_is_exit_1() -> None:
    done = run(plan_file("outcome.range = [0.01, 0.04]\nprecision.half_width = 0.02\n"), "--horizon", "200")
    assert done.exit_code == 1
    assert "No n up to 200 meets the targets for the interval there and at every larger n." in " ".join(
        done.stdout.split()
    )
    assert "closest is" in done.stdout
    done = run("--goal", "0.5", "--believed", "0.6", "--horizon", "100", "--json")
    assert done.exit_code == 1
    assert json.loads(done.stdout)["verdict"]["status"] == "none"


SHARE = "expected a number strictly between 0 and 1"


@pytest.mark.parametrize(
    ("arguments", "line"),
    [
        (
            ["--half-width", "0.02", "--expected", "0.02", "--assurance", "1"],
            f"--assurance 1: {SHARE}; no sample short of the whole population is certain",
        ),
        (
            ["--rule-out", "0.01", "--hoped-for", "0.02"],
            "--hoped-for 0.02: expected a rate below the 0.01 that is to be ruled out",
        ),
        (
            ["--rule-out", "0.01", "--expected", "0.02"],
            "--rule-out 0.01: expected a rate above the expected proportion, 0.02, or the key hoped_for with a rate "
            "below this one",
        ),
        (
            ["--rule-out", "0.01", "--events", "3", "--n", "3"],
            "--events 3: expected fewer than the 3 units of [sample]",
        ),
        (
            ["--rule-out", "0.01", "--events", "1", "--population", "100"],
            "rare.events = 1: expected fewer than 1, which is 1 % of the population of 100",
        ),
        (
            ["--half-width", "0.02"],
            "[outcome]: expected the key range or expected, or [rare] limit, or [decision] goal; or give --range, "
            "--expected, --rule-out or --goal",
        ),
        (
            ["--expected", "0.1", "--assurance", "0.8"],
            "[precision]: expected the key half_width, came only assurance; or give --half-width",
        ),
        (
            ["--hoped-for", "0.1", "--goal", "0.3", "--believed", "0.2"],
            "[rare]: expected the key limit or see_at_least, came only hoped_for; or give --rule-out",
        ),
        (
            ["--goal", "0.9"],
            "[decision]: expected the keys goal and believed, came only goal; or give --goal and --believed",
        ),
        (["--goal", "0.9", "--believed", "0.9"], "--believed 0.9: expected a proportion other than the goal, 0.9"),
        (
            ["--expected", "0.1", "--loss", "5"],
            "--loss 5: expected a number of at least 0 and below 1 (5 % is written 0.05)",
        ),
        ([*CLAIM, "--workers", "0"], "--workers 0: expected a whole number of at least 1"),
        (["none.toml"], "none.toml: expected a plan file, but there is no such file"),
    ],
)
def test_bad_input_is_one_clear_line_and_writes_nothing(arguments: list[str], line: str) -> None:
    done = run(*arguments)
    assert (done.exit_code, done.stdout, done.stderr) == (2, "", line + "\n")
    assert not list(Path.cwd().iterdir())


def test_all_faults_of_the_command_line_come_at_once(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(study, "sample_size", never)
    done = run(
        "--rule-out", "1", "--events", "x", "--goal", "2", "--believed", "0.5", "--workers", "no", "--horizon", "0"
    )
    assert done.exit_code == 2
    assert done.stderr.splitlines() == [
        "--horizon 0: expected a whole number from 1 to 10000000",
        f"--rule-out 1: {SHARE}",
        "--events x: expected a whole number from 0 to 1000000",
        f"--goal 2: {SHARE} (2 % is written 0.02)",
        "--workers no: expected a whole number of at least 1",
    ]


@pytest.mark.usefixtures("_no_page")
@pytest.mark.parametrize(
    ("arguments", "said"),
    [
        (["--rule-out", "0.02", "--confidence", "0.999", "--population", "50"], "the answer is a census"),
        (["outcome.expected = 0.02\nprecision.half_width = 0.03\nsample.horizon = 400\n"], "reach beyond 0"),
    ],
)
def test_what_can_be_answered_but_needs_a_word(arguments: list[str], said: str) -> None:
    done = run(*(plan_file(text) if "\n" in text else text for text in arguments))
    assert done.exit_code == 0
    assert said in " ".join(done.stdout.split())


def test_interrupted_says_what_was_finished(monkeypatch: pytest.MonkeyPatch) -> None:
    def interrupted(plan, **keywords):
        raise Interrupted(3, "finished the scan up to n = 512 of 2000")

    monkeypatch.setattr(study, "sample_size", interrupted)
    done = run(*FLEET, "--out", "my report")
    assert done.exit_code == 130
    assert done.stderr.splitlines() == [
        "interrupted: finished the scan up to n = 512 of 2000; nothing was written; to go on, run again:",
        f"  coverage-lab sample-size {' '.join(FLEET)} --out 'my report'",
    ]
    assert not list(Path.cwd().iterdir())


# --- folders


@pytest.mark.parametrize(
    ("arguments", "folder"),
    [
        ([], "demonstration-sample-size"),
        (["--confidence", "0.9", "--horizon", "99"], "demonstration-sample-size"),
        (RULE_OUT, "sample-size"),
        (["--range", "0.01", "0.05"], "sample-size"),
        (["plans/jackets.toml"], "jackets-sample-size"),
        (["plans/jackets.toml", "--half-width", "0.1"], "jackets-sample-size"),
        (["plans/jackets.toml", "--out", "here"], "here"),
    ],
)
def test_where_the_report_goes(arguments: list[str], folder: str, monkeypatch: pytest.MonkeyPatch) -> None:
    Path("plans").mkdir()
    Path("plans/jackets.toml").write_text("outcome.expected = 0.1\n")
    written = []
    monkeypatch.setattr(study, "sample_size", lambda plan, **keywords: plan)
    monkeypatch.setattr(study, "write_sizing", lambda sizing, folder, **rest: written.append(folder) or 1 / 0)
    with pytest.raises(ZeroDivisionError):
        CliRunner().invoke(cli, ["sample-size", *arguments], catch_exceptions=False)
    assert written == [Path(folder)]
    assert not folder.endswith("-report"), "an audit's folder is named so"


def test_what_a_folder_holds_is_looked_at_before_the_work(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(study, "sample_size", never)
    Path("audited").mkdir()
    Path("audited/audit.json").write_text("{}")
    done = run(*RULE_OUT, "--out", "audited")
    assert done.exit_code == 2
    assert "--overwrite" in done.stderr
    assert len(done.stderr.splitlines()) == 1
    Path("file").write_text("")
    done = run(*RULE_OUT, "--out", "file/below")
    assert done.exit_code == 2
    assert "is a file" in done.stderr
    monkeypatch.setattr(study, "sample_size", reached)
    assert run(*RULE_OUT, "--out", "audited", "--overwrite").stderr == "reached the work\n"


def test_a_full_disk_is_said_and_the_answer_is_not_lost(monkeypatch: pytest.MonkeyPatch) -> None:
    def full(sizing, folder, **rest):
        raise OSError(errno.ENOSPC, os.strerror(errno.ENOSPC), str(folder))

    monkeypatch.setattr(study, "write_sizing", full)
    done = run(*RULE_OUT)
    assert done.exit_code == 2
    assert done.stderr == "sample-size: cannot be read or written: No space left on device\n"
    assert "n = 473 units" in done.stdout
    assert "report.html" not in done.stdout


# --- options and help


def test_options_reach_the_work(monkeypatch: pytest.MonkeyPatch) -> None:
    seen = {}

    def work(plan, **keywords):
        seen.update(plan=plan, **keywords)
        raise InputFault("reached the work")

    monkeypatch.setattr(study, "sample_size", work)
    others = ["--alpha", "0.01", "--horizon", "900", "--design-effect", "1.5", "--cluster-size", "5", "--workers", "2"]
    contract = [
        "--replicates",
        "10",
        "--seed",
        "3",
        "--n",
        "30",
        "--n",
        "40",
        "--side",
        "upper",
        "--range",
        "0.01",
        "0.2",
    ]
    done = run(
        *FLEET[:4], *FLEET[6:], *CLAIM, *others, *contract, "--rule-out", "0.3", "--events", "0", "--events", "2"
    )
    assert done.stderr == "reached the work\n"
    plan = seen["plan"]
    assert (plan.precision.half_width, plan.precision.assurance, plan.horizon) == (0.02, 0.9, 900)
    assert (plan.decision.goal, plan.decision.believed, plan.decision.alpha, plan.decision.power) == (
        0.9,
        0.97,
        0.01,
        0.8,
    )
    assert (plan.rare.limit, plan.rare.events, plan.rare.hoped_for) == (0.3, (0, 2), 0.105)
    assert plan.document["design"] == {
        "kind": "simple",
        "population": 6200,
        "design_effect": 1.5,
        "cluster_size": 5,
        "loss": {"rate": 0.05, "treat_as": "excluded"},
    }
    assert (plan.sizes, plan.simulation.replicates, plan.simulation.seed, plan.side) == ((30, 40), 10, 3, "upper")
    assert (seen["workers"], seen["progress"]) == (2, None), "progress goes to a terminal only"


def test_every_example_of_the_help_is_understood(monkeypatch: pytest.MonkeyPatch) -> None:
    plan_file("outcome.expected = 0.1\n")
    monkeypatch.setattr(study, "sample_size", reached)
    lines = [line.split() for line in run("--help").output.splitlines() if line.strip().startswith("coverage-lab")]
    assert len(lines) == 4
    for words in lines:
        assert words[1] == "sample-size"
        assert run(*words[2:]).stderr == "reached the work\n", words


# --- in a process of its own


def start(*arguments: str) -> subprocess.Popen:
    path = os.pathsep.join([str(Path(coverage_lab.__file__).parents[1]), os.environ.get("PYTHONPATH", "")])
    command = [sys.executable, "-m", "coverage_lab", "sample-size", *arguments]
    return subprocess.Popen(
        command, stdout=subprocess.PIPE, stderr=subprocess.PIPE, text=True, env={**os.environ, "PYTHONPATH": path}
    )


def test_the_whole_job_in_a_process(tmp_path: Path) -> None:
    done = start(*RULE_OUT, "--json")
    stdout, stderr = done.communicate(timeout=120)
    assert (done.returncode, stderr) == (0, "")
    document, saved = json.loads(stdout), json.loads(Path("sample-size/sample-size.json").read_text(encoding="utf-8"))
    assert {name: saved[name] for name in document if name != "cautions"} == {
        name: value for name, value in document.items() if name != "cautions"
    }
    assert set(document["cautions"]) <= set(saved["cautions"])
    assert coverage_lab.read_plan("sample-size/plan.toml").document == document["plan"]
    page = Path("sample-size/report.html").read_bytes()
    again = CliRunner().invoke(cli, ["page", "sample-size"])
    assert (again.exit_code, again.output) == (0, "sample-size/report.html\n"), again.exc_info
    assert Path("sample-size/report.html").read_bytes() == page, "from the saved files alone"
    assert [path.name for path in tmp_path.iterdir()] == ["sample-size"], "nothing else is left behind"


def test_ctrl_c_leaves_nothing_behind(tmp_path: Path) -> None:
    name = plan_file("outcome.range = [0.005, 0.5]\nsample.horizon = 20000\n")
    done = start(name)
    time.sleep(4)
    done.send_signal(signal.SIGINT)
    stdout, stderr = done.communicate(timeout=60)
    assert (done.returncode, stdout) == (130, "")
    first, again = stderr.splitlines()
    assert first.startswith("interrupted: finished the scan up to n = ")
    assert first.endswith(" of 20000; nothing was written; to go on, run again:")
    assert again == f"  coverage-lab sample-size {name}"
    assert [path.name for path in tmp_path.iterdir()] == [name]


def test_it_is_handed_on_to_python() -> None:
    found = coverage_lab.sample_size(make_plan({"rare": {"limit": 0.02}}))
    assert isinstance(found, Sizing)
    assert found.rare.loc[0, "n"] == 149, "one-sided in a two-sided plan too (exact: ln .05/ln .98)"


# --- no values end in a traceback

TARGETING = "--half-width --assurance --expected --rule-out --events --hoped-for --goal --believed --alpha --power"
OTHERS = "--population --loss --design-effect --cluster-size --horizon --confidence --side --n --workers"
OPTIONS = [*TARGETING.split(" "), *OTHERS.split(" ")]
NUMBERS = st.floats(0, 1).map(str) | st.integers(-2, 300).map(str) | st.floats().map(str)
VALUES = NUMBERS | st.sampled_from(
    ["upper", "two-sided", "0.5", "1e-12", "0.999999", "x", "1e400", "10000000", "1e-300"]
)
PAIRS = st.lists(st.tuples(st.sampled_from(OPTIONS), VALUES), max_size=6)


@settings(deadline=None, max_examples=150, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(pairs=PAIRS)
def test_no_values_end_in_a_traceback(pairs: list[tuple[str, str]], monkeypatch: pytest.MonkeyPatch) -> None:
    """Up to the work itself."""
    monkeypatch.setattr(study, "sample_size", reached)
    done = run(*(word for pair in pairs for word in pair))
    assert done.exception is None or isinstance(done.exception, SystemExit), done.exc_info
    assert (done.exit_code, done.stdout) == (2, "")
    assert done.stderr.strip()


SMALL = st.sampled_from(["0.001", "0.01", "0.05", "0.2", "0.5", "0.8", "0.99", "1e-9"])
TARGETS = st.sampled_from(
    [
        "--rule-out {} --hoped-for {}",
        "--rule-out {} --events 0 --events 3",
        "--goal {} --believed {}",
        "--rule-out {} --goal {} --believed {}",
    ]
)
MORE = st.sampled_from(
    [
        "",
        "--population 40",
        "--population 6200 --loss 0.3",
        "--side lower",
        "--confidence 0.999",
        "--design-effect 3 --cluster-size 9",
        "--n 30",
    ]
)


@pytest.mark.usefixtures("_no_page")
@settings(deadline=None, max_examples=40, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(words=TARGETS, values=st.tuples(SMALL, SMALL, SMALL), more=MORE)
def test_no_answer_ends_in_a_traceback(words: str, values: tuple[str, ...], more: str) -> None:
    """The work and the first screen, for targets that need no scan of intervals."""
    done = run(*words.format(*values).split(), *more.split(), "--horizon", "400")
    assert done.exception is None or isinstance(done.exception, SystemExit), done.exc_info
    assert done.exit_code in (0, 1, 2)
    assert (done.stdout == "") == (done.exit_code == 2)
    assert len(done.stdout.splitlines()) <= 25
    assert "nan" not in done.stdout
