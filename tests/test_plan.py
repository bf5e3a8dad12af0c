"""Words in: what a plan may say, what it becomes, and how it comes back out."""

import json
import tomllib
from pathlib import Path

import numpy as np
import pytest
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from coverage_lab.checks import InputFault
from coverage_lab.designs import Simple
from coverage_lab.intervals import CATALOGUE, EVERY
from coverage_lab.plan import DEMONSTRATION, STARTER, available, make_level, make_plan, own_methods, read_plan
from coverage_lab.plan_text import plan_digest, plan_text
from coverage_lab.records import Plan

LEAST = {"outcome": {"range": [0.005, 0.05]}, "sample": {"n": 250}}


def file_of(folder: Path, text: str, name: str = "plan.toml") -> Path:
    path = folder / name
    path.write_bytes(text.encode("utf-8"))
    return path


def names(methods: tuple) -> list[str]:
    return [method.name for method in methods]


def rule(events, trials, tail):
    return events / trials, events / trials


# --- defaults


def test_what_is_left_out_is_filled_in() -> None:
    plan = make_plan(LEAST)
    assert (plan.title, plan.confidence, plan.side) == ("Untitled plan", 0.95, "two-sided")
    assert (plan.alpha, plan.tail) == (0.05, 0.025)
    assert (plan.outcome.name, plan.outcome.expected, plan.outcome.prior) == ("event", 0.0275, (1.0, 1.0))
    assert plan.sizes == (250,)
    assert (plan.standard.kind, plan.standard.worst_miss, plan.standard.mean_miss) == ("bradley", 1.5, 1.1)
    assert plan.design == Simple()
    assert (plan.simulation.replicates, plan.simulation.seed) == (20_000, 1)
    assert plan.simulation.routes == ("enumerated", "simulated")
    assert plan.simulation.grid == (0.005, 0.0095, 0.014, 0.0185, 0.023, 0.0275, 0.032, 0.0365, 0.041, 0.0455, 0.05)
    assert names(plan.methods) == list(CATALOGUE)
    assert names(plan.prefer) == ["wilson", "clopper-pearson"]
    assert plan.study.population is None


@pytest.mark.parametrize("side", ["upper", "lower"])
def test_one_sided_plans_prefer_the_exact_bound(side: str) -> None:
    assert names(make_plan({**LEAST, "side": side}).prefer) == ["clopper-pearson"]


@pytest.mark.parametrize(
    ("expected", "low", "high"),
    [(0.02, 0.01, 0.04), (0.5, 0.25, 0.75), (0.9, 0.8, 0.95), (0.98, 0.96, 0.99), (0.3, 0.15, 0.6)],
)
def test_the_range_follows_from_the_expected_proportion(expected: float, low: float, high: float) -> None:
    """[max(p/2, 2p - 1), min(2p, (1 + p)/2)]: half to double, mirrored above one half."""
    outcome = make_plan({"outcome": {"expected": expected}, "sample": {"n": 9}}).outcome
    assert (outcome.low, outcome.expected, outcome.high) == (low, expected, high)


def test_low_equal_to_high_is_one_proportion() -> None:
    plan = make_plan({"outcome": {"range": [0.02, 0.02]}, "sample": {"n": 9}})
    assert (plan.outcome.expected, plan.simulation.grid) == (0.02, (0.02,))


@pytest.mark.parametrize("ends", [[0, 0.01], [0.99, 1], [0, 1]])
def test_ranges_may_touch_the_ends_of_the_scale(ends: list[float]) -> None:
    outcome = make_plan({"outcome": {"range": ends}, "sample": {"n": 9}}).outcome
    assert [outcome.low, outcome.high] == ends


@pytest.mark.parametrize(
    ("standard", "worst", "mean"),
    [
        ({"kind": "guaranteed"}, 1 + 1e-9, 1 + 1e-9),
        ({"kind": "custom", "worst_miss": 2, "mean_miss": 1.2}, 2.0, 1.2),
    ],
)
def test_other_standards(standard: dict, worst: float, mean: float) -> None:
    found = make_plan({**LEAST, "standard": standard}).standard
    assert (found.kind, found.worst_miss, found.mean_miss) == (standard["kind"], worst, mean)


@settings(deadline=None)
@given(st.floats(0, 1), st.floats(0, 1))
def test_the_grid_runs_from_end_to_end(one: float, other: float) -> None:
    low, high = sorted((one, other))
    if high == 0 or low == 1:
        return
    grid = make_plan(
        {"outcome": {"range": [low, high]}, "sample": {"n": 9}, "methods": {"only": ["wald"]}}
    ).simulation.grid
    assert grid[0] == low
    assert grid[-1] == high
    assert list(grid) == sorted(set(grid))
    assert len(grid) == 1 if low == high else len(grid) <= 11
    if high - low > 1e-9:
        assert np.allclose(grid, np.linspace(low, high, 11), rtol=1e-12, atol=1e-15)


# --- methods


def test_only_cuts_the_list_in_the_order_of_the_catalogue() -> None:
    plan = make_plan({**LEAST, "methods": {"only": ["wald", "clopper-pearson", "wilson"]}})
    assert names(plan.methods) == ["wilson", "clopper-pearson", "wald"]
    assert names(plan.prefer) == ["wilson", "clopper-pearson"]


@pytest.mark.parametrize(
    ("methods", "prefer"),
    [
        ({"only": ["wald", "clopper-pearson"]}, ["clopper-pearson"]),  # the default list, cut
        ({"only": ["wald", "jeffreys"]}, ["wald", "jeffreys"]),  # nothing of it remains: only is the list, as written
        ({"prefer": ["mid-p", "wilson"]}, ["mid-p", "wilson"]),
        ({"prefer": ["mid-p", "wilson"], "only": ["wilson", "wald"]}, ["wilson"]),
        ({"prefer": ["mid-p"], "only": ["wilson"]}, ["wilson"]),
    ],
)
def test_who_may_be_named(methods: dict, prefer: list[str]) -> None:
    assert names(make_plan({**LEAST, "methods": methods}).prefer) == prefer


def test_a_method_of_ones_own_comes_last_and_can_be_named() -> None:
    plan = make_plan({**LEAST, "methods": {"prefer": ["house-rule"]}}, extra={"house-rule": rule})
    assert names(plan.methods) == [*CATALOGUE, "house-rule"]
    assert plan.methods[-1].function.__wrapped__ is rule
    assert plan.prefer[0].family == "your own"
    assert names(own_methods({"house-rule": rule})) == ["house-rule"]


@pytest.mark.parametrize(
    ("extra", "line"),
    [
        ({"wilson": rule}, "method 'wilson' of your own: expected a name that is not taken"),
        ({"a\nb": rule}, "name = 'a\\nb': expected one line of text as the name of a method of your own"),
        ({"r": 3}, "method 'r' = 3: expected a function (events, trials, tail)"),
    ],
)
def test_what_cannot_be_a_method_is_refused(extra: dict, line: str) -> None:
    with pytest.raises(InputFault) as caught:
        make_plan(LEAST, extra=extra)
    assert caught.value.faults == (line,)
    with pytest.raises(InputFault, match="expected"):
        own_methods(extra)


def install(folder: Path, entry: str) -> None:
    """An installed package as the import system sees it."""
    (folder / "house_rules.py").write_text(
        "def rule(events, trials, tail):\n    return events / trials, events / trials\n"
    )
    info = folder / "house_rules-1.0.dist-info"
    info.mkdir()
    (info / "METADATA").write_text("Metadata-Version: 2.1\nName: house-rules\nVersion: 1.0\n")
    (info / "entry_points.txt").write_text(f"[coverage_lab.methods]\n{entry}\n")


def test_methods_of_installed_packages_are_found(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    install(tmp_path, "house-rule = house_rules:rule")
    monkeypatch.syspath_prepend(tmp_path)
    assert names(make_plan(LEAST).methods) == [*CATALOGUE, "house-rule"]
    assert list(available()) == [*EVERY, "house-rule"]


def test_a_broken_installed_method_is_one_line(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    install(tmp_path, "house-rule = house_rules:absent")
    monkeypatch.syspath_prepend(tmp_path)
    with pytest.raises(InputFault) as caught:
        make_plan({"sample": {"n": 9}})
    needs, broken = caught.value.faults
    assert needs == "[outcome]: expected the key range or expected, or [rare] limit, or [decision] goal"
    assert broken.startswith(
        "method 'house-rule' of an installed package (house_rules:absent) cannot be loaded: Attrib"
    )


# --- options in place of keys


def test_options_replace_keys() -> None:
    overrides = {"confidence": 0.9, "side": "lower", "n": [60], "range": (0.8, 0.9), "replicates": 10, "seed": 3}
    plan = make_plan({**LEAST, "simulation": {"grid": [0.01]}}, overrides={**overrides, "expected": None})
    assert (plan.confidence, plan.side, plan.sizes) == (0.9, "lower", (60,))
    assert (plan.outcome.low, plan.outcome.high, plan.outcome.expected) == (0.8, 0.9, 0.85)
    assert (plan.simulation.replicates, plan.simulation.seed) == (10, 3)
    assert plan.simulation.grid[0] == 0.8, "a grid belongs to its range"


def test_several_n_are_candidates() -> None:
    plan = make_plan(LEAST, overrides={"n": (100, 150)})
    assert plan.sizes == (100, 150)
    assert plan.document["sample"] == {"candidates": [100, 150]}


def test_a_plan_from_options_alone() -> None:
    assert make_plan({}, overrides={"n": (250,), "range": (0.005, 0.05)}) == make_plan(LEAST)


def test_a_level_from_options() -> None:
    assert make_level({"confidence": None, "side": None}) == (0.95, "two-sided")
    with pytest.raises(InputFault) as caught:
        make_level({"confidence": 95, "side": "both"})
    assert caught.value.faults == (
        "--confidence 95: expected a number strictly between 0 and 1 (95 % is written 0.95)",
        "--side both: expected two-sided, upper or lower",
    )


# --- the plan as saved


def saved(plan: Plan, folder: Path) -> Plan:
    return read_plan(file_of(folder, plan_text(plan.document), "saved.toml"))


@pytest.mark.parametrize("path", [DEMONSTRATION, STARTER], ids=lambda path: path.stem)
def test_shipped_plans_are_valid_and_come_back(path: Path, tmp_path: Path) -> None:
    plan = read_plan(path)
    again = saved(plan, tmp_path)
    assert again == plan
    assert plan_digest(again.document) == plan_digest(plan.document)


def test_the_demonstration_is_the_weigh_test() -> None:
    plan = read_plan(DEMONSTRATION)
    assert plan.title == "Gas-cylinder weigh test, inflatable life-jackets"
    assert (plan.outcome.expected, plan.outcome.low, plan.outcome.high, plan.sizes) == (0.02, 0.005, 0.05, (250,))


def switched_on(lines: list[str], line: str) -> list[str]:
    """The starter with one remark switched on, beside what it needs and without what it replaces."""
    key = line.split(" = ")[0]
    needed = {
        "worst_miss": ("worst_miss", "mean_miss"),
        "mean_miss": ("worst_miss", "mean_miss"),
        "assurance": ("half_width",),
        **dict.fromkeys(("events", "hoped_for"), ("limit",)),
        **dict.fromkeys(("see_at_least", "at_rate", "with_probability"), ("see_at_least", "at_rate")),
        **dict.fromkeys(("goal", "believed", "alpha", "power"), ("goal", "believed")),
        **dict.fromkeys(("cluster_cv", "icc"), ("cluster_size", "icc")),
        **dict.fromkeys(("name", "weight", "n", "odds_ratio"), ("name", "weight", "n")),
        **dict.fromkeys(("sensitivity", "specificity"), ("sensitivity", "specificity")),
        **dict.fromkeys(
            ("diseased_tested", "healthy_tested"),
            ("sensitivity", "specificity", "diseased_tested", "healthy_tested"),
        ),
        "treat_as": ("rate",),
    }.get(key, ())
    own = lines.index(f"# {line}")
    header = max((k for k in range(own) if lines[k].removeprefix("# ").startswith("[")), default=0)
    found = [
        other.removeprefix("# ")
        if k in (own, header) or (k > header and other.startswith(tuple(f"# {name} =" for name in needed)))
        else other
        for k, other in enumerate(lines)
    ]
    kinds = dict.fromkeys(("cluster_cv", "icc"), "clustered")
    kinds |= dict.fromkeys(("name", "weight", "n", "odds_ratio"), "stratified")
    if key in kinds:
        found = [f'kind = "{kinds[key]}"' if other.startswith('kind = "simple"') else other for other in found]
        found = ["weight = 1.0" if other.startswith("weight = ") else other for other in found]
    if key == "candidates":
        found = [other for other in found if not other.startswith("n = ")]
    if key in ("worst_miss", "mean_miss"):
        found = ['kind = "custom"' if other.startswith('kind = "bradley"') else other for other in found]
    return found


def test_every_remark_of_the_starter_plan_can_be_switched_on() -> None:
    """A line that is commented out must be valid when its # goes, beside what it needs and without what it replaces."""
    lines = STARTER.read_text(encoding="utf-8").splitlines()
    shown = [line[2:] for line in lines if line.startswith("# ") and " = " in line]
    assert len(shown) >= 26
    for line in shown:
        document = tomllib.loads("\n".join(switched_on(lines, line)))
        assert document != tomllib.loads("\n".join(lines)), line
        make_plan(document)


def test_a_file_without_a_title_is_named_after_itself(tmp_path: Path) -> None:
    path = file_of(tmp_path, "outcome.expected = 0.1\nsample.n = 9\n", "jackets.toml")
    plan = read_plan(path)
    assert plan.title == "jackets"
    assert plan.document["title"] == "jackets"


@pytest.mark.parametrize("ending", ["\n", "\r\n"])
def test_files_of_other_systems_are_read(ending: str, tmp_path: Path) -> None:
    path = tmp_path / "plan.toml"
    path.write_bytes(b"\xef\xbb\xbf" + ending.join(['title = "é"', "outcome.expected = 0.1", "sample.n = 9"]).encode())
    assert read_plan(path).title == "é"


def test_the_document_is_plain_and_whole() -> None:
    plan = make_plan({**LEAST, "study": {"unit": "one"}, "methods": {"only": ["wilson", "wald"]}})
    assert json.loads(json.dumps(plan.document)) == plan.document
    tables = ["study", "outcome", "sample", "standard", "design", "simulation", "methods"]  # no targets, none added
    assert list(plan.document) == ["title", "confidence", "side", *tables]
    assert plan.document["methods"] == {"only": ["wilson", "wald"], "prefer": ["wilson"]}
    assert plan.document["standard"] == {"kind": "bradley"}
    assert plan.document["study"] == {"unit": "one"}
    assert "study" not in make_plan(LEAST).document


def test_the_digest_tells_plans_apart_and_nothing_else() -> None:
    document = dict(make_plan(LEAST).document)
    turned = dict(reversed(document.items()))
    assert plan_digest(turned) == plan_digest(document)
    assert plan_digest({**document, "confidence": 0.9}) != plan_digest(document)
    assert len(plan_digest(document)) == 64


def test_arrays_and_scalars_of_numpy_are_values_like_any_other() -> None:
    mapping = {"confidence": np.float64(0.9), "outcome": {"range": np.array([0.1, 0.2])}, "sample": {"n": np.int64(50)}}
    plan = make_plan(mapping)
    assert plan == make_plan({"confidence": 0.9, "outcome": {"range": (0.1, 0.2)}, "sample": {"n": 50}})
    assert type(plan.document["confidence"]) is float


TEXT = st.text(st.characters(exclude_categories=("Cs", "Cc", "Zl", "Zp")), min_size=1, max_size=20).filter(str.strip)
SHARES = st.floats(1e-9, 1 - 1e-9)
SIDES_AND_NAMES = st.sampled_from(["two-sided", "upper", "lower"]).flatmap(
    lambda side: st.tuples(
        st.just(side),
        st.lists(
            st.sampled_from([k for k, m in CATALOGUE.items() if side in m.sides and m.largest_n is None]),
            min_size=1,
            max_size=4,
            unique=True,
        ),
    )
)


@st.composite
def mappings(draw: st.DrawFn) -> dict:
    side, listed = draw(SIDES_AND_NAMES)
    ends = sorted(draw(st.tuples(SHARES, SHARES)))
    return {
        **draw(st.fixed_dictionaries({}, optional={"title": TEXT, "confidence": SHARES})),
        "side": side,
        "study": draw(
            st.fixed_dictionaries({}, optional={"population": TEXT | st.just("two\nlines\tof text"), "unit": TEXT})
        ),
        "outcome": draw(st.sampled_from([{"range": ends}, {"expected": ends[0]}, {"range": ends, "expected": ends[1]}]))
        | draw(st.fixed_dictionaries({}, optional={"name": TEXT})),
        "sample": draw(
            st.fixed_dictionaries({"n": st.integers(1, 10**7)})
            | st.fixed_dictionaries(
                {"candidates": st.lists(st.integers(1, 10**7), min_size=1, max_size=3, unique=True)}
            )
        ),
        "standard": draw(
            st.sampled_from([{}, {"kind": "guaranteed"}, {"kind": "custom", "worst_miss": 1, "mean_miss": 0.75}])
        ),
        "simulation": draw(st.fixed_dictionaries({}, optional={"seed": st.integers(0, 2**63 - 1)})),
        "methods": draw(
            st.sampled_from([{}, {"only": listed}, {"prefer": listed}, {"only": listed, "prefer": listed[:1]}])
        ),
    }


@settings(deadline=None, max_examples=150, suppress_health_check=[HealthCheck.function_scoped_fixture])
@given(mapping=mappings())
def test_every_plan_comes_back_from_its_own_text(mapping: dict, tmp_path: Path) -> None:
    plan = make_plan(mapping)
    again = saved(plan, tmp_path)
    assert again == plan
    assert again.document == plan.document
    assert plan_digest(again.document) == plan_digest(plan.document)


VALUES = st.recursive(
    st.none() | st.booleans() | st.integers() | st.floats() | st.text(max_size=8),
    lambda inner: st.lists(inner, max_size=3) | st.dictionaries(st.text(max_size=8), inner, max_size=3),
    max_leaves=8,
)


@given(st.dictionaries(st.text(max_size=10), VALUES, max_size=5))
def test_any_document_comes_back_from_toml(document: dict) -> None:
    def without_nothing(value: object) -> object:
        """TOML has no null, and NaN is equal to nothing."""
        if isinstance(value, dict):
            return {key: without_nothing(item) for key, item in value.items()}
        if isinstance(value, list):
            return [without_nothing(item) for item in value if not isinstance(item, dict)]
        return 0.5 if value is None or value != value else value

    plain = without_nothing(document)
    assert tomllib.loads(plan_text(plain)) == plain


def test_what_toml_cannot_say_is_refused() -> None:
    with pytest.raises(TypeError, match="cannot be written as TOML: None"):
        plan_text({"a": None})
