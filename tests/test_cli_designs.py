"""Designs end to end: audits of every kind and layer, their reports, and the catalogue on the command line."""

import json
from pathlib import Path
from typing import Any

import pytest
from click.testing import CliRunner, Result

import coverage_lab as cl
from coverage_lab.cli import cli
from coverage_lab.records import Audit
from coverage_lab.report import rewrite

CLUSTERS = {"kind": "clustered", "cluster_size": 25, "icc": 0.02}
STRATA = [{"name": "a", "weight": 0.4, "n": 100}, {"name": "b", "weight": 0.6, "n": 150, "odds_ratio": 2.0}]
TEST = {"sensitivity": 0.95, "specificity": 0.99}
LOSS = {"rate": 0.05}

# design, the methods that are measured, what the first one's minimum is
AUDITS = [
    ({"kind": "finite", "population": 6200}, ["wilson-fpc", "hypergeometric-exact", "wald"], "certified"),
    (CLUSTERS, ["wilson-deff-estimated", "korn-graubard", "wald"], "searched"),
    ({**CLUSTERS, "cluster_cv": 0.4}, ["wilson-deff-estimated", "korn-graubard", "wald"], "simulated"),
    ({"kind": "stratified", "strata": STRATA}, ["stratified-wilson", "stratified-korn-graubard", "wald"], "searched"),
    ({"classification": TEST}, ["corrected-wilson", "corrected-clopper-pearson", "wald"], "certified"),
    (
        {"classification": {**TEST, "diseased_tested": 50, "healthy_tested": 100}},
        ["corrected-adjusted", "corrected-wilson", "wald"],
        "searched",
    ),
    ({"loss": LOSS}, ["wilson", "clopper-pearson", "wald"], "certified"),
    ({"loss": {"rate_events": 0.2, "rate_others": 0.0}}, ["wilson", "clopper-pearson", "wald"], "searched"),
    (
        {**CLUSTERS, "population": 6200, "classification": TEST, "loss": LOSS},
        ["corrected-wilson-deff-estimated", "corrected-korn-graubard", "wald"],
        "simulated",
    ),
]


def run(*arguments: str) -> Result:
    return CliRunner().invoke(cli, list(arguments))


def audited(design: dict[str, Any], only: list[str]) -> Audit:
    plan = {
        "outcome": {"range": [0.005, 0.05]},
        "sample": {"n": 250},
        "design": design,
        "methods": {"only": only},
        "simulation": {"replicates": 1000, "grid": [0.005, 0.02, 0.05]},
    }
    return cl.audit(cl.make_plan(plan))


@pytest.mark.parametrize(("design", "only", "kind"), AUDITS)
def test_every_kind_and_layer_is_audited(design: dict[str, Any], only: list[str], kind: str) -> None:
    found = audited(design, only)
    rows = found.methods.set_index("method")
    assert rows["applies"].all()
    assert rows.loc[only[0], "minimum_is"] == kind
    if found.verdict.method is not None:
        certain = rows.loc[found.verdict.method, "minimum_is"] == "certified"
        assert ("interval coverage is at least" in found.verdict.sentence) == certain


def test_the_whole_story_becomes_a_page_that_can_be_made_again(tmp_path: Path) -> None:
    design, only, _ = AUDITS[-1]
    page = cl.write_report(audited(design, only), tmp_path / "report")
    text = page.read_text(encoding="utf-8")
    assert "whole clusters of 25 units with intraclass correlation 0.02" in text
    assert "sensitivity 95" in text
    before = page.read_bytes()
    rewrite(tmp_path / "report", None)
    assert page.read_bytes() == before


def test_designs_are_listed_with_their_keys_and_sources() -> None:
    listed = json.loads(run("designs", "--json").stdout)["designs"]
    assert [entry["name"] for entry in listed if entry["kind"]] == ["simple", "finite", "clustered", "stratified"]
    assert [entry["name"] for entry in listed if not entry["kind"]] == ["classification", "loss"]
    assert all(entry["source"] and entry["label"] and entry["keys"] for entry in listed)
    table = run("designs").stdout.splitlines()
    assert [line.split()[0] for line in table[1:]] == [entry["name"] for entry in listed]


def test_a_design_that_cannot_be_is_exit_2(tmp_path: Path) -> None:
    file = tmp_path / "plan.toml"
    file.write_text("[outcome]\nexpected = 0.02\n[sample]\nn = 250\n[design]\nkind = 'finite'\npopulation = 100\n")
    done = run("audit", str(file))
    assert done.exit_code == 2
    assert done.stderr == f"{file}:4: [sample] n = 250: expected at most the population of 100\n"
    assert not list(tmp_path.glob("*report*"))


def test_data_of_clusters_gives_the_methods_own_limits(tmp_path: Path) -> None:
    file = tmp_path / "data.csv"
    file.write_text("cluster,events,trials\na,3,20\nb,0,25\na,1,5\nc,2,24\n")
    given = json.loads(run("interval", "--data", str(file), "--json").stdout)
    limits = {row["method"]: (row["lower"], row["upper"]) for row in given["intervals"]}
    assert (given["events"], given["trials"]) == (6, 74)
    lower, upper = cl.intervals.korn_graubard(6, 74, 3, 16 + 4, 100 + 48, 625 + 625 + 576, 0.025)
    assert limits["korn-graubard"] == (float(lower), float(upper))
    assert "wilson" in limits
    assert "stratified-wilson" not in limits


def test_data_of_strata_gives_the_methods_own_limits(tmp_path: Path) -> None:
    file = tmp_path / "data.csv"
    file.write_text("stratum,weight,events,trials\na,0.4,3,100\nb,0.6,5,150\n")
    given = json.loads(run("interval", "--data", str(file), "--method", "stratified-wilson", "--json").stdout)
    lower, upper = cl.intervals.stratified_wilson([3, 5], [100, 150], [0.4, 0.6], 0.025)
    assert (given["intervals"][0]["lower"], given["intervals"][0]["upper"]) == (float(lower), float(upper))


def test_a_population_and_a_test_add_their_methods() -> None:
    options = ["--population", "6200", "--sensitivity", "48/50", "--specificity", "99/100"]
    given = json.loads(run("interval", "7", "250", *options, "--json").stdout)
    names = {row["method"] for row in given["intervals"]}
    assert {"wilson", "wilson-fpc", "hypergeometric-exact", "corrected-wilson", "corrected-adjusted"} <= names
    plain = json.loads(run("interval", "7", "250", "--json").stdout)
    assert not {row["method"] for row in plain["intervals"]} & {"wilson-fpc", "corrected-wilson"}


@pytest.mark.parametrize(
    ("options", "line"),
    [
        (["--population", "100"], "--population 100: expected at least the 250 trials"),
        (["--sensitivity", "0.9"], "expected --sensitivity and --specificity together"),
        (["--sensitivity", "0.5", "--specificity", "0.5"], "--sensitivity + --specificity = 1: expected more than 1"),
        (
            ["--sensitivity", "0/0", "--specificity", "0.9"],
            "--sensitivity 0/0: expected a number from 0 to 1, or COUNT",
        ),
        (["--sensitivity", "9/10", "--specificity", "0.9"], "expected --sensitivity and --specificity both as numbers"),
    ],
)
def test_unusable_options_are_exit_2(options: list[str], line: str) -> None:
    done = run("interval", "7", "250", *options)
    assert done.exit_code == 2
    assert done.stderr.startswith(line)
