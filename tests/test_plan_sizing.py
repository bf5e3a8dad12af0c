"""Plans that ask for n: their targets, what stands in for what is left out, and every fault as one exact line."""

from pathlib import Path

import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

import coverage_lab as cl
from coverage_lab.checks import InputFault
from coverage_lab.plan import DEMONSTRATION, audit_faults, make_plan, read_plan
from coverage_lab.plan_text import plan_digest, plan_text
from coverage_lab.records import Decision, Precision, Rare
from coverage_lab.sizing import size

RULE_OUT = {"rare": {"limit": 0.01}}
NARROW = {"outcome": {"expected": 0.02}, "precision": {"half_width": 0.02}}
CLAIM = {"decision": {"goal": 0.9, "believed": 0.97}}


# --- what a plan says, and what is filled in


def test_a_rate_to_be_ruled_out_is_a_plan() -> None:
    plan = make_plan(RULE_OUT)
    assert plan.rare == Rare(0.01, (0,), None)
    assert (plan.sizes, plan.precision, plan.decision, plan.horizon) == ((), None, None, None)
    assert plan.document["rare"] == {"limit": 0.01, "events": [0]}
    assert "sample" not in plan.document


def test_what_is_expected_is_hoped_for() -> None:
    plan = make_plan({**RULE_OUT, "outcome": {"range": [0.001, 0.003]}})
    assert plan.rare == Rare(0.01, (0,), 0.002)
    assert plan.document["rare"]["hoped_for"] == 0.002


def test_what_is_hoped_for_is_expected() -> None:
    plan = make_plan({"rare": {"limit": 0.01, "hoped_for": 0.001}, "precision": {"half_width": 0.01}})
    assert (plan.outcome.expected, plan.outcome.low, plan.outcome.high) == (0.001, 0.0005, 0.002)
    assert "expected" not in plan.document["outcome"], "a stand-in is no statement of the plan's"


def test_what_is_believed_is_expected() -> None:
    plan = make_plan(CLAIM)
    assert (plan.outcome.expected, plan.outcome.low, plan.outcome.high) == (0.97, 0.94, 0.985)


@pytest.mark.parametrize(
    ("head", "alpha"), [({}, 0.025), ({"side": "upper"}, 0.05), ({"confidence": 0.9, "side": "lower"}, 0.1)]
)
def test_a_claim_may_be_as_wrong_as_the_confidence_leaves_on_one_side(head: dict, alpha: float) -> None:
    assert make_plan({**head, **CLAIM}).decision == Decision(0.9, 0.97, alpha, 0.8)
    given = {"decision": {**CLAIM["decision"], "alpha": 0.01, "power": 0.9}}
    assert make_plan({**head, **given}).decision == Decision(0.9, 0.97, 0.01, 0.9)


def test_events_to_be_seen() -> None:
    plan = make_plan({"rare": {"see_at_least": 2, "at_rate": 0.01}})
    assert plan.rare == Rare(None, (), None, 2, 0.01, 0.95)
    assert plan.document["rare"] == {"see_at_least": 2, "at_rate": 0.01, "with_probability": 0.95}


def test_precision_and_horizon() -> None:
    plan = make_plan({**NARROW, "sample": {"horizon": 900}})
    assert plan.precision == Precision(0.02, None)
    assert (plan.sizes, plan.horizon) == ((), 900)
    assert plan.document["precision"] == {"half_width": 0.02}
    assert plan.document["sample"] == {"horizon": 900}


def test_the_demonstration_has_a_precision_and_a_rate_to_rule_out() -> None:
    plan = read_plan(DEMONSTRATION)
    assert plan.precision == Precision(0.02, 0.8)
    assert plan.rare == Rare(0.05, (0, 1, 2), 0.005)
    assert plan.decision is None


def test_the_tables_of_a_saved_plan_stand_in_their_order() -> None:
    design = {"population": 6200, "loss": {"rate": 0.05}}
    plan = make_plan({**NARROW, **CLAIM, "rare": {"limit": 0.1}, "design": design, "sample": {"n": 9}})
    targets = ["precision", "rare", "decision"]
    tables = ["outcome", "sample", *targets, "standard", "design", "simulation", "methods"]
    assert list(plan.document) == ["title", "confidence", "side", *tables]
    loss = {"rate": 0.05, "treat_as": "excluded"}
    assert plan.document["design"] == {"kind": "simple", "population": 6200, "loss": loss}
    assert "[design.loss]\nrate = 0.05\n" in plan_text(plan.document)


RATES = st.floats(1e-6, 0.3)
COUNTS = st.lists(st.integers(0, 50), min_size=1, max_size=4, unique=True)


@st.composite
def mappings(draw: st.DrawFn) -> dict:
    hoped, limit, expected = sorted(draw(st.lists(RATES, min_size=3, max_size=3, unique=True)))
    targets = {
        "precision": st.fixed_dictionaries({"half_width": RATES}, optional={"assurance": st.floats(0.01, 0.99)}),
        "rare": st.fixed_dictionaries(
            {"limit": st.just(limit), "hoped_for": st.just(hoped)}, optional={"events": COUNTS}
        )
        | st.fixed_dictionaries(
            {"see_at_least": st.integers(1, 9), "at_rate": RATES}, optional={"with_probability": st.just(0.9)}
        ),
        "decision": st.fixed_dictionaries(
            {"goal": st.just(limit), "believed": st.just(hoped)}, optional={"alpha": st.just(0.01)}
        ),
        "sample": st.fixed_dictionaries({"n": st.integers(60, 900)}, optional={"horizon": st.integers(1, 10**7)}),
        "design": st.fixed_dictionaries(
            {},
            optional={"population": st.integers(1, 10**9), "loss": st.just({"rate": 0.1}), "cluster_size": st.just(7)},
        ),
    }
    return draw(st.fixed_dictionaries({"outcome": st.just({"expected": expected})}, optional=targets)) | {
        "side": draw(st.sampled_from(["two-sided", "upper", "lower"])),
        "methods": {"only": ["wilson"]},
    }


@settings(deadline=None, max_examples=100, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(mapping=mappings(), stated=st.booleans())
def test_every_plan_comes_back_from_its_own_text(mapping: dict, stated: bool, tmp_path: Path) -> None:
    if not stated and ("decision" in mapping or "limit" in mapping.get("rare", {})):
        mapping = {name: table for name, table in mapping.items() if name != "outcome"}
    plan = make_plan(mapping)
    path = tmp_path / "saved.toml"
    path.write_text(plan_text(plan.document), encoding="utf-8")
    again = read_plan(path)
    assert again == plan
    assert plan_digest(again.document) == plan_digest(plan.document)


# --- unusable plans

GOOD = """\
confidence = 0.95

[outcome]
expected = 0.002

[sample]
n = 500

[precision]
half_width = 0.02
assurance = 0.9

[rare]
limit = 0.01
events = [0, 1]
hoped_for = 0.001
see_at_least = 1
at_rate = 0.01
with_probability = 0.9

[decision]
goal = 0.01
believed = 0.002
alpha = 0.05
power = 0.8

[design]
population = 6200
design_effect = 1.5
cluster_size = 5

[design.loss]
rate = 0.05
"""
SHARE = "expected a number strictly between 0 and 1"
CERTAIN = f"{SHARE}; no sample short of the whole population is certain"
SIZE = "expected a whole number from 1 to 10000000"
SIZES = f"{SIZE}, or a list of such numbers, one a cluster"
EVENTS = "expected a whole number from 0 to 1000000"
RATE = "expected a number of at least 0 and below 1"

# What is replaced in the good plan, by what, and the fault without the file's name.
CHANGES = [
    # a half-width and an assurance that no interval can have
    ("half_width = 0.02", "half_width = 0", f":10: [precision] half_width = 0: {SHARE}"),
    ("half_width = 0.02", "half_width = 2", f":10: [precision] half_width = 2: {SHARE} (2 % is written 0.02)"),
    ("half_width = 0.02", "", ":9: [precision]: expected the key half_width, came only assurance"),
    ("assurance = 0.9", "assurance = 1", f":11: [precision] assurance = 1: {CERTAIN}"),
    ("assurance = 0.9", "assurance = 1.0", f":11: [precision] assurance = 1.0: {CERTAIN}"),
    ("assurance = 0.9", "assurance = 90", f":11: [precision] assurance = 90: {CERTAIN} (90 % is written 0.9)"),
    ("assurance = 0.9", "assured = 0.9", """:11: [precision]: unknown key 'assured': did you mean "assurance"?"""),
    # a rate to rule out that is hoped for, or expected
    (
        "hoped_for = 0.001",
        "hoped_for = 0.02",
        ":16: [rare] hoped_for = 0.02: expected a rate below the 0.01 that is to be ruled out",
    ),
    (
        "hoped_for = 0.001",
        "hoped_for = 0.01",
        ":16: [rare] hoped_for = 0.01: expected a rate below the 0.01 that is to be ruled out",
    ),
    ("hoped_for = 0.001", "hoped_for = -0.1", f":16: [rare] hoped_for = -0.1: {RATE}"),
    (
        "limit = 0.01\nevents = [0, 1]\nhoped_for = 0.001",
        "limit = 0.001",
        ":14: [rare] limit = 0.001: expected a rate above the expected proportion, 0.002, or the key hoped_for with a "
        "rate below this one",
    ),
    ("limit = 0.01", "limit = 0.0", f":14: [rare] limit = 0.0: {SHARE}"),
    ("limit = 0.01", "limit = 1", f":14: [rare] limit = 1: {SHARE}"),
    # as many events as units
    ("n = 500", "n = 1", ":15: [rare] events, item 2 = 1: expected fewer than the 1 units of [sample]"),
    ("[0, 1]", "[0, 500]", ":15: [rare] events, item 2 = 500: expected fewer than the 500 units of [sample]"),
    ("[0, 1]", "[0, -1]", f":15: [rare] events, item 2 = -1: {EVENTS}"),
    ("[0, 1]", "[0, 1.0]", f":15: [rare] events, item 2 = 1.0: {EVENTS}"),
    (
        "[0, 1]",
        "[1, 1]",
        ":15: [rare] events = [1, 1]: expected a list of different whole numbers from 0 to 1000000, at least one",
    ),
    (
        "[0, 1]",
        "1",
        ":15: [rare] events = 1: expected a list of different whole numbers from 0 to 1000000, at least one",
    ),
    # keys that need each other
    ("limit = 0.01\n", "", ":14: [rare] events = [0, 1]: expected to be left out unless limit is given"),
    ("see_at_least = 1\n", "", ":17: [rare] at_rate = 0.01: expected to be left out unless see_at_least is given"),
    (
        "at_rate = 0.01\nwith_probability = 0.9",
        "",
        ":13: [rare]: expected the key at_rate, since see_at_least is given, came only limit, events, hoped_for, "
        "see_at_least",
    ),
    ("see_at_least = 1", "see_at_least = 0", ":17: [rare] see_at_least = 0: expected a whole number from 1 to 1000000"),
    ("with_probability = 0.9", "with_probability = 1.0", f":19: [rare] with_probability = 1.0: {CERTAIN}"),
    # claims
    (
        "believed = 0.002",
        "believed = 0.01",
        ":23: [decision] believed = 0.01: expected a proportion other than the goal, 0.01",
    ),
    (
        "believed = 0.002",
        "believed = 97",
        ":23: [decision] believed = 97: expected a number from 0 to 1 (97 % is written 0.97)",
    ),
    ("goal = 0.01\n", "", ":21: [decision]: expected the keys goal and believed, came only believed, alpha, power"),
    ("goal = 0.01\n", "goal = 1.0\n", f":22: [decision] goal = 1.0: {SHARE}"),
    ("alpha = 0.05", "alpha = 0.5", ":24: [decision] alpha = 0.5: expected a number strictly between 0 and 0.5"),
    ("power = 0.8", "power = 0.04", ":25: [decision] power = 0.04: expected a number above alpha, 0.05"),
    ("power = 0.8", "power = 1.0", f":25: [decision] power = 1.0: {SHARE}"),
    # what the sample has to make up for
    (
        "population = 6200",
        "population = 0",
        ":28: [design] population = 0: expected a whole number from 1 to 1000000000",
    ),
    (
        "design_effect = 1.5",
        "design_effect = 0",
        ":29: [design] design_effect = 0: expected a number above 0, at most 10000",
    ),
    (
        "design_effect = 1.5",
        "design_effect = inf",
        ":29: [design] design_effect = inf: expected a number above 0, at most 10000",
    ),
    ("cluster_size = 5", "cluster_size = 2.5", f":30: [design] cluster_size = 2.5: {SIZES}"),
    ("rate = 0.05", "rate = 1.0", f":33: [design.loss] rate = 1.0: {RATE}"),
    ("rate = 0.05", "rate = 5", f":33: [design.loss] rate = 5: {RATE} (5 % is written 0.05)"),
    ("rate = 0.05", "", ":32: [design.loss]: expected the key rate, or both rate_events and rate_others, came nothing"),
    ("rate = 0.05", "rte = 0.05", """:33: [design.loss]: unknown key 'rte': did you mean "rate"?"""),
    ("[design.loss]\nrate = 0.05", "loss = 0.05", ":32: [design] loss = 0.05: expected a table [design.loss]"),
    ("n = 500", "horizon = 0", f":7: [sample] horizon = 0: {SIZE}"),
    ("confidence", "rate = 0.05\nconfidence", ":1: unknown key 'rate': it belongs in [design.loss]"),
]


def faults_of(path: Path, text: str, **keywords) -> list[str]:
    path.write_text(text, encoding="utf-8")
    with pytest.raises(InputFault) as caught:
        read_plan(path, **keywords)
    return [line.replace(str(path), "") for line in caught.value.faults]


def test_the_good_plan_is_good(tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    path.write_text(GOOD, encoding="utf-8")
    assert read_plan(path).rare == Rare(0.01, (0, 1), 0.001, 1, 0.01, 0.9)


@pytest.mark.parametrize(("old", "new", "line"), CHANGES, ids=[f"{old} -> {new}"[:60] for old, new, _ in CHANGES])
def test_one_fault_is_one_exact_line(old: str, new: str, line: str, tmp_path: Path) -> None:
    assert old in GOOD
    faults = faults_of(tmp_path / "plan.toml", GOOD.replace(old, new, 1))
    assert line in faults
    if "unknown key" not in line:
        assert faults == [line]


def test_all_faults_come_at_once_in_the_order_of_the_file(tmp_path: Path) -> None:
    text = (
        GOOD.replace("0.02\n", "0\n").replace("hoped_for = 0.001", "hoped_for = 0.5").replace("rate = 0.05", "rate = 2")
    )
    assert faults_of(tmp_path / "plan.toml", text.replace("n = 500", "n = 0")) == [
        f":7: [sample] n = 0: {SIZE}",
        f":10: [precision] half_width = 0: {SHARE}",
        ":16: [rare] hoped_for = 0.5: expected a rate below the 0.01 that is to be ruled out",
        f":33: [design.loss] rate = 2: {RATE} (2 % is written 0.02)",
    ]


@pytest.mark.parametrize(
    ("mapping", "line"),
    [
        (
            {"precision": {"half_width": 0.02}},
            "[outcome]: expected the key range or expected, or [rare] limit, or [decision] goal",
        ),
        (
            {"precision": {"half_width": 0.02}, **RULE_OUT},
            "[outcome]: expected the key range or expected, since [precision] is given",
        ),
        (
            {"design": {"population": 5}},
            "[outcome]: expected the key range or expected, or [rare] limit, or [decision] goal",
        ),
        ({**NARROW, "precision": {}}, "[precision]: expected the key half_width, came nothing"),
        ({**NARROW, "rare": {}}, "[rare]: expected the key limit or see_at_least, came nothing"),
        ({**NARROW, "decision": {}}, "[decision]: expected the keys goal and believed, came nothing"),
        ({**NARROW, "precision": 0.02}, "precision = 0.02: expected a table [precision]"),
        (
            {"confidence": 0.4, "side": "upper", **CLAIM},
            "[decision]: expected the key alpha, since 0.6, which the confidence leaves, "
            "is not below 0.5 and the power",
        ),
        (
            {**RULE_OUT, "simulation": {"grid": [0.1]}},
            "[simulation] grid = [0.1]: expected to be left out where no range is planned",
        ),
    ],
)
def test_a_plan_that_says_too_little(mapping: dict, line: str) -> None:
    with pytest.raises(InputFault) as caught:
        make_plan(mapping)
    assert caught.value.faults == (line,)


def test_faults_of_options_name_the_option(tmp_path: Path) -> None:
    overrides = {
        "half_width": 2,
        "assurance": 1,
        "rule_out": "much",
        "events": (0, -1),
        "goal": 0.9,
        "population": 0,
        "loss": 1,
        "design_effect": -1,
        "cluster_size": 0,
        "horizon": 0.5,
    }
    assert faults_of(tmp_path / "plan.toml", "outcome.expected = 0.1\n", overrides=overrides) == [
        f"--horizon 0.5: {SIZE}",
        f"--half-width 2: {SHARE} (2 % is written 0.02)",
        f"--assurance 1: {CERTAIN}",
        f"--rule-out much: {SHARE}",
        f"--events -1: {EVENTS}",
        ": [decision]: expected the keys goal and believed, came only goal; or give --goal and --believed",
        "--population 0: expected a whole number from 1 to 1000000000",
        "--design-effect -1: expected a number above 0, at most 10000",
        f"--cluster-size 0: {SIZES}",
        f"--loss 1: {RATE}",
    ]


def test_options_replace_keys() -> None:
    overrides = {"rule_out": 0.05, "events": (2,), "believed": 0.95, "loss": 0.1, "population": 80, "half_width": None}
    plan = make_plan({**CLAIM, **RULE_OUT}, overrides=overrides)
    assert plan.rare == Rare(0.05, (2,), None)
    assert plan.decision == Decision(0.9, 0.95, 0.025, 0.8)
    loss = {"rate": 0.1, "treat_as": "excluded"}
    assert plan.document["design"] == {"kind": "simple", "population": 80, "loss": loss}
    assert plan.precision is None


# --- audits


NEEDS = ("[outcome]: expected the key range or expected, which an audit needs",)
NEEDS_N = ("[sample]: expected the key n or candidates, which an audit needs",)
NOT_AUDITED = (
    "expected to be left out of an audit of a simple random sample; sample-size takes it, or another kind of design"
)


@pytest.mark.parametrize(
    ("mapping", "lines"),
    [
        (RULE_OUT, (*NEEDS, *NEEDS_N)),
        ({**CLAIM, "sample": {"n": 9}}, NEEDS),
        ({"rare": {"limit": 0.01, "hoped_for": 0.001}, "sample": {"candidates": [90]}}, NEEDS),
        (NARROW, NEEDS_N),
        (
            {**NARROW, "sample": {"n": 9}, "design": {"population": 6200, "loss": {"rate": 0.05}}},
            (f"[design] population = 6200: {NOT_AUDITED}",),  # losses are audited
        ),
    ],
)
def test_an_audit_says_what_it_lacks(mapping: dict, lines: tuple[str, ...]) -> None:
    plan = make_plan(mapping)
    assert audit_faults(plan) == lines
    with pytest.raises(InputFault) as caught:
        cl.audit(plan)
    assert caught.value.faults == lines
    with pytest.raises(InputFault) as caught:
        make_plan(mapping, audited=True)
    assert caught.value.faults == lines


def test_a_plan_with_everything_is_audited_and_sized() -> None:
    assert audit_faults(read_plan(DEMONSTRATION)) == ()


# --- the record that is asked for in Python


def test_what_the_plan_makes_up_for_reaches_the_ladder() -> None:
    design = {"design_effect": 2, "cluster_size": 7, "population": 10**6, "loss": {"rate": 0.0}}
    found = cl.sample_size(make_plan({"rare": {"limit": 0.0307}, "design": design}))
    ladder = found.inflated
    assert ladder is not None
    assert [rung.name for rung in ladder.rungs] == ["base", "design_effect", "finite", "loss", "units"]
    assert ladder.rungs[1].value == 2 * ladder.rungs[0].value
    assert ladder.clusters == -(-ladder.rungs[1].ceiling // 7)
    assert ladder.units == 7 * ladder.clusters


def test_the_process_behind_the_units_has_no_population() -> None:
    mapping = {"rare": {"limit": 0.05}, "design": {"population": 100}}
    assert cl.sample_size(make_plan(mapping)).verdict.n == 45, (
        "hypergeometric: 45 of 100 units exclude 5 events among them"
    )
    assert cl.sample_size(make_plan({**mapping, "study": {"target": "process"}})).verdict.n == 59


def test_python_and_the_engine_agree() -> None:
    plan = make_plan({"outcome": {"range": [0.1, 0.3]}, "sample": {"horizon": 60}, "methods": {"only": ["wilson"]}})
    assert cl.sample_size(plan).document() == size(plan).document()
    assert "percentage points" in (cl.sample_size.__doc__ or ""), "units are stated"


def test_a_rule_of_ones_own_is_sized() -> None:
    asked = {"outcome": {"range": [0.1, 0.1]}, "precision": {"half_width": 0.1}, "sample": {"horizon": 120}}
    plan = make_plan({**asked, "methods": {"only": ["wilson"]}})
    found = cl.sample_size(plan, extra={"house-rule": cl.intervals.wilson}).methods.set_index("method")
    assert found.loc["house-rule", "expected_width_safe_n"] == found.loc["wilson", "expected_width_safe_n"]
