"""The audit's verdict and the plan's [precision]: the smallest n that is narrow enough, and a word when none is."""

from pathlib import Path

import numpy as np
import pytest
from click.testing import CliRunner
from scipy import stats

import coverage_lab as cl
from coverage_lab import study, verdict
from coverage_lab.cli import cli
from coverage_lab.records import Audit, Verdict

FEW = {"only": ["wilson", "clopper-pearson"]}
QUICK = {"replicates": 200, "grid": [0.02]}


def audited(candidates: list[int], precision: dict | None, **head: str) -> Audit:
    mapping = {
        **head,
        "outcome": {"range": [0.005, 0.05], "expected": 0.02},
        "sample": {"candidates": candidates},
        "simulation": QUICK,
        "methods": FEW,
    }
    return cl.audit(cl.make_plan(mapping | ({"precision": precision} if precision is not None else {})))


def wilson(n: int) -> np.ndarray:
    """The half-width for every count, from the textbook form."""
    z, x = stats.norm.ppf(0.975), np.arange(n + 1)
    half = z / (1 + z**2 / n) * np.sqrt(x / n * (1 - x / n) / n + z**2 / (4 * n**2))
    centre = (x + z**2 / 2) / (n + z**2)
    return (np.minimum(centre + half, 1) - np.maximum(centre - half, 0)) / 2


def test_the_smallest_n_that_is_precise_enough_is_the_verdict() -> None:
    found = audited([520, 250, 480], {"half_width": 0.02, "assurance": 0.8})
    assert found.verdict.n == 480
    assert [(item.n, item.status, item.precision["meets"]) for item in found.by_n] == [
        (520, "recommended", True),
        (250, "recommended", False),
        (480, "recommended", True),
    ]
    assert "less precise" not in found.verdict.sentence


def test_what_is_measured() -> None:
    precision = audited([250], {"half_width": 0.025, "assurance": 0.8}).verdict.precision
    counts = np.arange(251)
    expected = stats.binom.pmf(counts, 250, 0.05) @ wilson(250)
    probability = stats.binom.pmf(counts, 250, 0.02)[wilson(250) <= 0.025].sum()
    assert precision["expected_half_width"] == pytest.approx(expected, rel=1e-12)
    assert precision["probability"] == pytest.approx(probability, rel=1e-12)
    assert (precision["half_width"], precision["assurance"], precision["meets"]) == (0.025, 0.8, False)


def test_a_miss_is_said_in_the_verdict() -> None:
    found = audited([100, 250], {"half_width": 0.02, "assurance": 0.8})
    assert found.verdict.n == 100, "none is precise enough: the smallest with a recommendation"
    assert found.by_n[1].sentence.endswith(
        "This is less precise than the plan asks: its expected half-width at the worst proportion of the range is 2.75 "
        "points, against 2 points; at 2 % its half-width keeps within that with probability 61.5 %, against 80 %."
    )


def test_assurance_alone_can_be_missed() -> None:
    found = audited([480], {"half_width": 0.0197, "assurance": 0.99999}).verdict
    assert found.precision["expected_half_width"] <= 0.0197
    assert found.precision["meets"] is False


def test_a_bound_is_measured_by_its_distance() -> None:
    found = audited([300], {"half_width": 0.02}, side="upper").verdict
    counts = np.arange(301)
    limits = np.append(stats.beta.isf(0.05, counts[:-1] + 1, 300 - counts[:-1]), 1.0)
    expected = stats.binom.pmf(counts, 300, 0.05) @ (limits - counts / 300)
    assert found.precision["expected_half_width"] == pytest.approx(expected, rel=1e-9)
    assert found.precision["probability"] is None
    assert "its expected distance from the true proportion at the worst proportion of the range is 2.58 points" in (
        found.sentence
    )


def test_without_a_target_nothing_is_measured() -> None:
    assert audited([250], None).verdict.precision is None


def test_the_first_screen_says_which_n_are_too_wide(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(study, "write_report", lambda audit, folder, **rest: Path(folder) / "report.html")
    text = "outcome.range = [0.005, 0.05]\nsample.candidates = [250, 480]\nprecision.half_width = 0.02\n"
    path = tmp_path / "plan.toml"
    path.write_text(f"{text}simulation.replicates = 200\nmethods.only = ['wilson']\n", encoding="utf-8")
    done = CliRunner().invoke(cli, ["audit", str(path), "--out", str(tmp_path / "new")])
    said = " ".join(done.stdout.split())
    assert said.startswith("At n = 480, report the Wilson score interval")
    assert "By n 250: wilson (too wide), 480: wilson" in said
    assert "Precision expected half-width 1.97 points at worst, 2 points asked: met" in said
    again = CliRunner().invoke(cli, ["audit", str(path), "--n", "250", "--out", str(tmp_path / "new")])
    assert "Precision expected half-width 2.75 points at worst, 2 points asked: not met" in " ".join(
        again.stdout.split()
    )


def decided(n: int, status: str, meets: bool | None) -> Verdict:
    precision = None if meets is None else {"meets": meets}
    return Verdict(n, status, None, "", (), (), (), None, None, None, None, (), precision)


@pytest.mark.parametrize(
    ("by_n", "n"),
    [
        ([(300, "recommended", True), (200, "recommended", False), (100, "none", None)], 300),
        ([(300, "recommended", False), (200, "recommended", False), (100, "none", None)], 200),
        ([(300, "recommended", None), (200, "recommended", None)], 200),
        ([(100, "none", None), (200, "undecided", None), (300, "none", None)], 200),
        ([(300, "none", None), (200, "none", None)], 300),
    ],
)
def test_which_of_several_n_is_the_verdict(by_n: list[tuple], n: int) -> None:
    assert verdict.overall([decided(*item) for item in by_n]).n == n
