"""`coverage-lab interval`: limits for data in hand, from numbers, a file, or by the method an audit fixed."""

import json
from pathlib import Path

import pytest
from click.testing import CliRunner, Result

from coverage_lab.cli import cli
from coverage_lab.intervals import CATALOGUE, EVERY

KNOWN = "events, trials, cluster, stratum, weight"


@pytest.fixture(autouse=True)
def _elsewhere(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.chdir(tmp_path)


def run(*arguments: object) -> Result:
    return CliRunner().invoke(cli, ["interval", *(str(argument) for argument in arguments)])


def answer(*arguments: object) -> dict:
    done = run(*arguments, "--json")
    assert done.exit_code == 0, done.output
    return json.loads(done.stdout)


def limits(method: str, *arguments: object) -> tuple[float, float]:
    [found] = answer(*arguments, "--method", method)["intervals"]
    assert found["method"] == method
    return found["lower"], found["upper"]


# Newcombe 1998, Stat. Med. 17:857, Table I: wilson as printed, the others from memory.
NEWCOMBE = [
    ("wilson", 81, 263, 0.2553, 0.3662),
    ("wilson", 15, 148, 0.0624, 0.1605),
    ("wilson", 0, 20, 0, 0.1611),
    ("wilson", 1, 29, 0.0061, 0.1718),
    ("wald", 81, 263, 0.2522, 0.3638),
    ("clopper-pearson", 81, 263, 0.2527, 0.3676),
    ("clopper-pearson", 0, 20, 0, 0.1684),
    ("mid-p", 1, 29, 0.0017, 0.1585),
    ("likelihood-ratio", 0, 20, 0, 0.0916),
]


@pytest.mark.parametrize(("method", "events", "trials", "lower", "upper"), NEWCOMBE)
def test_published_intervals(method: str, events: int, trials: int, lower: float, upper: float) -> None:
    assert limits(method, events, trials) == pytest.approx((lower, upper), abs=5e-5)


@pytest.mark.parametrize(("trials", "upper"), [(14, 0.1926), (112, 0.02639), (167, 0.01778)])
def test_published_bounds_for_zero_events(trials: int, upper: float) -> None:
    """Hanley & Lippman-Hand 1983, JAMA 249:1743: one-sided 95 % upper bounds."""
    assert limits("clopper-pearson", 0, trials, "--side", "upper") == pytest.approx((0.0, upper), rel=4e-4)


def test_the_json_document() -> None:
    found = answer(0, 20, "--confidence", "0.9")
    assert list(found) == ["events", "trials", "confidence", "side", "intervals"]
    assert (found["events"], found["trials"], found["confidence"], found["side"]) == (0, 20, 0.9, "two-sided")
    assert [item["method"] for item in found["intervals"]] == [
        k for k, m in CATALOGUE.items() if "two-sided" in m.sides
    ]
    for item in found["intervals"]:
        assert list(item) == ["method", "lower", "upper", "raw_lower", "raw_upper"]
        assert 0 <= item["lower"] <= item["upper"] <= 1
    raw = {item["method"]: item["raw_lower"] for item in found["intervals"]}
    assert raw["agresti-coull"] < 0


def test_the_table_is_rounded_outward() -> None:
    exact = {item["method"]: item for item in answer(7, 250)["intervals"]}
    lines = run(7, 250).stdout.splitlines()
    assert lines[0] == "7 events in 250 trials, 95 % two-sided interval"
    starts = [lines[1].index(word) for word in ("lower", "upper")]
    assert len(lines) - 2 == len(exact)
    for line in lines[2:]:
        method = line.split()[0]
        lower, upper = (float(line[start:].split()[0]) for start in starts)
        assert exact[method]["lower"] - 1e-4 < lower <= exact[method]["lower"]
        assert exact[method]["upper"] <= upper < exact[method]["upper"] + 1e-4


def test_formulas_that_leave_the_scale_are_marked() -> None:
    """0 of 20, Agresti-Coull: -.0287 .1898 as the formula gives it."""
    marked = [line for line in run(0, 20).stdout.splitlines() if "the formula gives" in line]
    assert [line.split()[0] for line in marked] == ["agresti-coull", "plus-four", "wald-cc"]
    assert "the formula gives -0.02869 to 0.1899" in marked[0]


def test_methods_are_given_in_the_order_asked_for_and_once() -> None:
    named = ["--method", "wald", "--method", "wilson", "--method", "wald"]
    assert [item["method"] for item in answer(7, 250, *named)["intervals"]] == ["wald", "wilson"]


def test_methods_that_do_not_apply_are_named_on_stderr() -> None:
    done = run(7, 2000, "--side", "upper")
    assert done.exit_code == 0
    assert done.stderr.splitlines() == [
        f"method '{name}' does not apply: two-sided only"
        for name in ("blaker", "shortest-exact", "sterne", "jeffreys-hpd")
    ]
    assert run(7, 2000, "--side", "upper", "--quiet").stderr == ""
    done = run(7, 2000, "--method", "shortest-exact", "--method", "wilson", "--json")
    assert done.exit_code == 0
    assert done.stderr == "method 'shortest-exact' does not apply: computed only up to n = 1000\n"
    assert len(json.loads(done.stdout)["intervals"]) == 1


def test_when_no_method_applies() -> None:
    done = run(7, 250, "--side", "upper", "--method", "blaker")
    assert (done.exit_code, done.stdout) == (2, "")
    assert done.stderr == "method 'blaker' does not apply: two-sided only\n"


WHOLE = "expected a whole number of at least 0"


@pytest.mark.parametrize(
    ("arguments", "lines"),
    [
        ([], ["expected EVENTS and TRIALS, two whole numbers, or --data FILE.csv"]),
        ([5], ["expected EVENTS and TRIALS, two whole numbers, or --data FILE.csv"]),
        ([6, 5], ["EVENTS 6: expected at most the 5 of TRIALS"]),
        ([1.5, 5], [f"EVENTS 1.5: {WHOLE}"]),
        (["x", 5.5], [f"EVENTS x: {WHOLE}", "TRIALS 5.5: expected a whole number from 1 to 10000000"]),
        ([0, 0], ["TRIALS 0: expected a whole number from 1 to 10000000"]),
        ([0, 10_000_001], ["TRIALS 10000001: expected a whole number from 1 to 10000000"]),
        ([-1, 5], ["'-1': expected EVENTS and TRIALS, whole numbers of at least 0"]),
        ([1, -5], ["'-5': expected EVENTS and TRIALS, whole numbers of at least 0"]),
        (["--", -1, 5], [f"EVENTS -1: {WHOLE}"]),
        (["nan", "inf"], [f"EVENTS nan: {WHOLE}", "TRIALS inf: expected a whole number from 1 to 10000000"]),
        ([1, 5, "--method", "wilsn"], ["""unknown method 'wilsn': did you mean "wilson"?"""]),
        (
            [6, 5, "--confidence", 95, "--side", "up", "--method", "zz", "--from", "nowhere"],
            [
                "EVENTS 6: expected at most the 5 of TRIALS",
                "--confidence 95: expected a number strictly between 0 and 1 (95 % is written 0.95)",
                "--side up: expected two-sided, upper or lower",
                f"unknown method 'zz': must be one of {', '.join(EVERY)}",
                "nowhere: expected the report folder of an audit, with its audit.json (format 'coverage-lab/audit/1')",
            ],
        ),
    ],
)
def test_unusable_questions(arguments: list, lines: list[str]) -> None:
    done = run(*arguments)
    assert (done.exit_code, done.stdout) == (2, "")
    assert done.stderr.splitlines() == lines


# --- from a file


def csv(text: str | bytes) -> str:
    Path("data.csv").write_bytes(text if isinstance(text, bytes) else text.encode())
    return "data.csv"


@pytest.mark.parametrize(
    "text",
    [
        "events,trials\n7,250\n",
        "trials, events\n100,3\n\n150,4\n",
        "\ufeffevents,trials\r\n7,200\r\n0,50\r\n",
        '"events","trials"\n7,250',
    ],
)
def test_rows_are_added_up(text: str) -> None:
    found = answer("--data", csv(text))
    assert (found["events"], found["trials"]) == (7, 250)


@pytest.mark.parametrize(
    ("text", "lines"),
    [
        ("", ["data.csv:1: headings = '': expected the columns events and trials, each once"]),
        ("7,250\n", [f"data.csv:1: unknown column '{name}': must be one of {KNOWN}" for name in (7, 250)]),
        ("event,trials\n7,9\n", ["""data.csv:1: unknown column 'event': did you mean "events"?"""]),
        (
            "events,trials,cluster\n7,9,a\n",
            ["data.csv: clusters = 1: expected at least 2 clusters with trials"],
        ),
        ("events,trials\n7,9\n9,7\n", ["data.csv:3: row = '9,7': expected whole numbers, 0 <= events <= trials"]),
        (
            "events,trials\n1.5,9\n-1,7\n1\n,\n2,3,4\n",
            [
                f"data.csv:{line}: row = '{row}': expected whole numbers, 0 <= events <= trials"
                for line, row in ((2, "1.5,9"), (3, "-1,7"), (4, "1"), (6, "2,3,4"))
            ],
        ),
        ("events,trials\n0,0\n", ["data.csv: the sum of trials = 0: expected a whole number from 1 to 10000000"]),
        (
            "events,trials\n0,9999999\n0,2\n",
            ["data.csv: the sum of trials = 10000001: expected a whole number from 1 to 10000000"],
        ),
        (b"\xff\xfe\x00", ["data.csv: expected a CSV file, but byte 1 is not text in UTF-8"]),
        ('events,trials\n"7,9\n', ["data.csv: expected a CSV file, but: unexpected end of data"]),
    ],
)
def test_unusable_files(text: str | bytes, lines: list[str]) -> None:
    done = run("--data", csv(text))
    assert (done.exit_code, done.stdout) == (2, "")
    headings = "expected the columns events and trials, each once"
    assert [line for line in done.stderr.splitlines() if headings not in line or line in lines] == lines


def test_many_bad_rows_are_counted() -> None:
    done = run("--data", csv("events,trials\n" + "x,y\n" * 50))
    assert len(done.stderr.splitlines()) == 21
    assert done.stderr.splitlines()[-1] == "data.csv: 30 more rows like these"


def test_no_file_and_two_sources() -> None:
    assert (
        run("--data", "none.csv").stderr
        == "none.csv: expected a CSV file, but it cannot be read: No such file or directory\n"
    )
    assert run("--data", ".").stderr == ".: expected a CSV file, but it cannot be read: Is a directory\n"
    assert run(1, 2, "--data", "x.csv").stderr == "--data: expected EVENTS and TRIALS or --data FILE.csv, not both\n"


# --- from an audit


def folder(name: str = "report", **changes: object) -> str:
    verdict = {"method": "clopper-pearson", "n": 250}
    document = {"format": "coverage-lab/audit/1", "confidence": 0.9, "side": "two-sided", "verdict": verdict}
    Path(name).mkdir(exist_ok=True)
    Path(name, "audit.json").write_text(json.dumps({**document, **changes}))
    return name


def test_the_method_fixed_in_advance_comes_first() -> None:
    found = answer(7, 250, "--from", folder())
    names = [item["method"] for item in found["intervals"]]
    assert names[:2] == ["clopper-pearson", "wilson"]
    assert len(set(names)) == len(names) == len(answer(7, 250)["intervals"])
    assert (found["confidence"], found["side"]) == (0.9, "two-sided")
    assert found["intervals"][0]["upper"] == limits("clopper-pearson", 7, 250, "--confidence", 0.9)[1]


def test_the_rest_is_for_comparison_only() -> None:
    done = run(7, 250, "--from", folder(), "--method", "wald", "--method", "clopper-pearson")
    first, second = done.stdout.splitlines()[2:]
    assert first.startswith("clopper-pearson")
    assert first.endswith("fixed in advance")
    assert second.startswith("wald")
    assert second.endswith("for comparison only")
    assert done.stderr == ""


def test_another_n_than_planned_is_said() -> None:
    done = run(7, 240, "--from", folder())
    assert done.exit_code == 0
    assert done.stderr.splitlines()[0] == (
        "240 trials, but n = 250 was planned: the figures of the audit are for that n; "
        "the method stays the one that was fixed in advance"
    )


def test_options_that_depart_from_the_plan_are_refused() -> None:
    assert run(7, 250, "--from", folder(), "--confidence", "0.9", "--side", "two-sided").exit_code == 0
    done = run(7, 250, "--from", folder(), "--confidence", "0.95", "--side", "upper")
    assert done.exit_code == 2
    assert done.stderr.splitlines() == [
        "--confidence 0.95: expected 0.9, which was fixed in advance, or the option left out",
        "--side upper: expected two-sided, which was fixed in advance, or the option left out",
    ]


def test_an_audit_that_names_no_method() -> None:
    done = run(7, 250, "--from", folder(verdict={"method": None, "n": 250}))
    assert (done.exit_code, done.stdout) == (2, "")
    assert done.stderr == "report: expected an audit that names a method, but this one names none\n"


def test_an_audit_by_a_method_that_is_not_here() -> None:
    done = run(7, 250, "--from", folder(verdict={"method": "house-rule", "n": 250}))
    assert done.exit_code == 2
    assert done.stderr == "method 'house-rule', fixed in advance, is one of your own, and is not installed here\n"


@pytest.mark.parametrize(
    "content",
    [
        "",
        "[1]",
        "{}",
        "[" * 100_000,
        '{"format": "other"}',
        b"\xff",
        json.dumps({"format": "coverage-lab/audit/1", "verdict": 3}),
    ],
)
def test_folders_that_are_no_report(content: str | bytes) -> None:
    Path("report").mkdir()
    Path("report/audit.json").write_bytes(content if isinstance(content, bytes) else content.encode())
    done = run(7, 250, "--from", "report")
    assert (done.exit_code, done.stdout) == (2, "")
    assert done.stderr.startswith("report: expected the report folder of an audit")


@pytest.mark.parametrize(
    "change", [{"confidence": 95}, {"confidence": "x"}, {"side": "up"}, {"side": []}, {"verdict": {}}]
)
def test_reports_that_were_tampered_with(change: dict) -> None:
    done = run(7, 250, "--from", folder(**change))
    assert done.exit_code == 2
    assert "expected the report folder of an audit" in done.stderr
