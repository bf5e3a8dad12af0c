"""The folder: what is saved, that it reads back digit for digit, and that it appears whole or not at all."""

import dataclasses
import errno
import json
import math
import subprocess
import sys
from collections.abc import Callable
from pathlib import Path

import numpy as np
import pandas as pd
import pytest
from report_audits import PLANS, finished, planned

from coverage_lab.checks import InputFault
from coverage_lab.plan import make_plan, read_plan
from coverage_lab.report import audit_document, check_target, folder, load, page, save, write
from coverage_lab.report.document import plain
from coverage_lab.report.staging import staged
from coverage_lab.report.word_file import installed

ALL = {*folder.DATA_FILES, "report.html", *([folder.WORD_FILE] if installed() else [])}
NAMES = sorted(PLANS)


def state(path: Path) -> dict[str, bytes]:
    """Every file below the path with its bytes."""
    return {str(file.relative_to(path)): file.read_bytes() for file in sorted(path.rglob("*")) if file.is_file()}


@pytest.mark.parametrize("name", NAMES)
def test_what_is_saved_reads_back_digit_for_digit(name: str, tmp_path: Path) -> None:
    audit = finished(name)
    save(audit, tmp_path / "out")
    saved = load(tmp_path / "out")
    assert saved.document == audit_document(audit)
    for frame in ("methods", "cells", "curve", "steady", "table"):
        made, read = getattr(audit, frame), getattr(saved, frame)
        assert len(made) == len(read)
        for column in made.columns:
            for before, after in zip(made[column], read[column], strict=True):
                gap = pd.isna(before)
                assert pd.isna(after) if gap else before == after, (
                    f"{frame}.{column}: {before!r} came back as {after!r}"
                )


def test_the_folder_holds_exactly_the_files_that_are_promised(report: Callable[[str], Path]) -> None:
    found = {file for file in state(report("two-sided")) if not file.startswith("figures/")}
    assert found == ALL
    figures = {file for file in state(report("several")) if file.startswith("figures/")}
    assert figures == {picture.file for picture in page.PICTURES}


def test_audit_json_has_the_keys_that_scripts_rely_on() -> None:
    document = audit_document(finished("two-sided"))
    assert document["format"] == "coverage-lab/audit/1"
    top = "format plan confidence side alpha methods verdict by_n cross_check cautions provenance"
    assert set(top.split()) <= set(document)
    method = (
        "n method label family source applies reason minimum_coverage minimum_at minimum_is mean_coverage missed_below "
        "missed_above mean_width outside_unit_rate zero_width_rate simulated everywhere passes why"
    )
    assert set(method.split()) <= set(document["methods"][0])
    simulated = {"coverage_min", "coverage_min_at", "coverage_mean", "replicates", "standard_error"}
    assert set(document["methods"][0]["simulated"]) == simulated
    assert set(document["methods"][0]["everywhere"]) == {"minimum_coverage", "minimum_at"}
    verdict = (
        "status method n sentence prefer steady alternatives closest too_small holds_on balance bounds_at precision"
    )
    assert set(document["verdict"]) == set(verdict.split())
    assert set(document["cross_check"]) == {"cells", "largest_z", "p_value", "chi_square_p"}
    assert set(document["provenance"]) == {"version", "seed", "plan_sha256", "libraries", "created"}
    json.dumps(document, allow_nan=False)


def test_figures_that_are_missing_are_null() -> None:
    document = audit_document(finished("simulated"))
    assert document["cross_check"] is None
    assert document["methods"][0]["everywhere"] == {"minimum_coverage": None, "minimum_at": None}
    rows = {row["method"]: row for row in audit_document(finished("hostile"))["methods"]}
    unfit = rows["second-order"]  # one-sided only
    assert unfit["applies"] is False
    assert unfit["passes"] is None
    assert unfit["minimum_coverage"] is None
    assert unfit["simulated"]["replicates"] is None
    assert rows["wilson"]["simulated"]["replicates"] == 400
    assert isinstance(rows["wilson"]["simulated"]["replicates"], int)


@pytest.mark.parametrize(
    ("value", "wanted"),
    [
        (np.float64(0.1), 0.1),
        (np.int64(3), 3),
        (np.bool_(True), True),
        (math.inf, None),
        (math.nan, None),
        (pd.NA, None),
        (pd.NaT, None),
        ((1, (2.0, None)), [1, [2.0, None]]),
        (np.array([1.0, np.nan]), [1.0, None]),
        ({"a": np.float64("nan")}, {"a": None}),
    ],
)
def test_values_become_plain(value: object, wanted: object) -> None:
    found = plain(value)
    assert found == wanted
    assert type(found) is type(wanted)


def test_what_json_cannot_hold_is_refused() -> None:
    with pytest.raises(TypeError, match="cannot be saved as JSON"):
        plain(object())


def test_cells_has_one_row_per_n_proportion_method_and_route(report: Callable[[str], Path]) -> None:
    text = (report("several") / "cells.csv").read_text(encoding="utf-8")
    contract = (
        "n,p,method,route,coverage,standard_error,missed_below,missed_above,mean_width,outside_unit_rate,"
        "zero_width_rate,no_data_rate,draws"
    )
    assert text.splitlines()[0].startswith(contract)
    cells = load(report("several")).cells
    keys = cells[["n", "p", "method", "route"]]
    assert not keys.duplicated().any()
    assert len(cells) == 5 * 11 * 6 * 2  # sizes, grid, methods, routes
    drawn = [line.split(",")[12] for line in text.splitlines()[1:] if ",simulated," in line]
    assert set(drawn) == {"400"}  # whole numbers, not 400.0


def test_words_that_look_like_numbers_or_gaps_stay_words(tmp_path: Path) -> None:
    audit = finished("two-sided")
    odd = {"wilson": "1e5", "wald": "nan", "jeffreys": "", "mid-p": 'a "b", c\nd # e'}
    labels = [odd.get(name, label) for name, label in zip(audit.methods["method"], audit.methods["label"], strict=True)]
    save(dataclasses.replace(audit, methods=audit.methods.assign(label=labels)), tmp_path / "out")
    saved = load(tmp_path / "out")
    assert list(saved.methods["label"]) == labels
    assert [row["label"] for row in saved.document["methods"]] == labels


def test_a_shortened_interval_table_says_so_in_its_last_line(tmp_path: Path) -> None:
    audit = finished("two-sided")
    save(dataclasses.replace(audit, table=audit.table.iloc[:10]), tmp_path / "cut")
    save(audit, tmp_path / "whole")
    assert (tmp_path / "cut/interval-table.csv").read_text().splitlines()[-1].startswith("# only outcomes")
    assert len(load(tmp_path / "cut").table) == 10
    assert "#" not in (tmp_path / "whole/interval-table.csv").read_text()
    assert len(load(tmp_path / "whole").table) == 61


def test_the_saved_plan_reads_back_to_the_same_plan(report: Callable[[str], Path]) -> None:
    for name in ("two-sided", "hostile"):
        assert read_plan(report(name) / "plan.toml").document == planned(name).document


def test_the_report_of_the_same_plan_is_updated_and_other_files_stay(tmp_path: Path) -> None:
    out = tmp_path / "out"
    write(finished("enumerated"), out)
    before = state(out)
    (out / "notes.txt").write_text("mine")
    (out / "methods.csv").write_text("damaged")
    write(finished("enumerated"), out)
    assert state(out) == {**before, "notes.txt": b"mine"}


def test_the_report_of_another_plan_is_refused_and_left_alone(tmp_path: Path) -> None:
    out = tmp_path / "out"
    write(finished("enumerated"), out)
    before = state(out)
    with pytest.raises(InputFault, match=r"holds the report of another plan \('Untitled plan'\).*--overwrite"):
        write(finished("simulated"), out)
    with pytest.raises(InputFault, match="holds the report of another plan"):
        check_target(out, planned("simulated").document, overwrite=False)
    assert state(out) == before


def test_overwrite_replaces_another_report_with_nothing_of_it_left(tmp_path: Path) -> None:
    out = tmp_path / "out"
    write(finished("two-sided"), out)
    assert (out / "figures/cross-check.png").exists()
    write(finished("simulated"), out, overwrite=True)
    assert not (out / "figures/cross-check.png").exists()
    assert load(out).document["plan"] == dict(planned("simulated").document)


@pytest.mark.parametrize("text", ["", "{", '{"format": "another"}', "[1]", '"coverage-lab/audit/1"'])
def test_files_of_others_under_our_names_are_refused(text: str, tmp_path: Path) -> None:
    (tmp_path / "audit.json").write_text(text)
    with pytest.raises(InputFault, match=r"other files named audit\.json"):
        write(finished("enumerated"), tmp_path)
    with pytest.raises(InputFault, match="expected an audit saved by coverage-lab"):
        load(tmp_path)
    assert state(tmp_path) == {"audit.json": text.encode()}


def test_a_plan_of_the_users_is_not_overwritten_by_the_normalised_one(tmp_path: Path) -> None:
    (tmp_path / "plan.toml").write_text("confidence = 0.95")
    with pytest.raises(InputFault, match=r"other files named plan\.toml"):
        write(finished("enumerated"), tmp_path)


def test_a_folder_with_other_files_is_fine(tmp_path: Path) -> None:
    (tmp_path / "notes.txt").write_text("mine")
    write(finished("enumerated"), tmp_path)
    assert (tmp_path / "notes.txt").read_text() == "mine"
    assert set(state(tmp_path)) >= ALL


def test_a_file_where_the_folder_should_be_is_refused(tmp_path: Path) -> None:
    (tmp_path / "out").write_text("a file")
    with pytest.raises(InputFault, match="expected a folder for the report, but it is a file"):
        write(finished("enumerated"), tmp_path / "out", overwrite=True)


def test_a_folder_below_a_file_is_an_error_of_the_system(tmp_path: Path) -> None:
    (tmp_path / "file").write_text("a file")
    with pytest.raises(OSError, match="file"):
        save(finished("enumerated"), tmp_path / "file" / "out")
    assert state(tmp_path) == {"file": b"a file"}


FAULTS = [OSError(errno.ENOSPC, "No space left on device"), KeyboardInterrupt()]


def breaking_at(call: int, fault: BaseException, original: Callable[..., object]) -> Callable[..., object]:
    """The function, but its call number `call` raises."""
    calls = 0

    def broken(*arguments: object, **named: object) -> object:
        nonlocal calls
        calls += 1
        if calls == call:
            raise fault
        return original(*arguments, **named)

    return broken


@pytest.mark.parametrize("fault", FAULTS, ids=["full disk", "interrupt"])
@pytest.mark.parametrize("call", [1, 5])
def test_a_new_folder_appears_whole_or_not_at_all(
    call: int, fault: BaseException, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    monkeypatch.setattr(folder, "_write", breaking_at(call, fault, folder._write))
    with pytest.raises(type(fault)):
        write(finished("enumerated"), tmp_path / "a" / "b" / "out")
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("fault", FAULTS, ids=["full disk", "interrupt"])
@pytest.mark.parametrize("call", [1, 4, 7])
def test_an_interrupted_update_leaves_the_old_report(
    call: int, fault: BaseException, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    out = tmp_path / "out"
    save(finished("two-sided"), out)
    before = state(out)
    monkeypatch.setattr(Path, "replace", breaking_at(call, fault, Path.replace))
    with pytest.raises(type(fault)):
        save(finished("upper"), out, overwrite=True)
    assert state(out) == before
    assert [path.name for path in tmp_path.iterdir()] == ["out"]


@pytest.mark.parametrize(("operation", "call"), [("replace", 2), ("unlink", 1)])
def test_what_an_interrupted_update_added_or_removed_is_undone(
    operation: str, call: int, tmp_path: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    for name in ("kept", "obsolete"):
        (tmp_path / name).write_text("old")
    before = state(tmp_path)

    def update() -> None:
        with staged(tmp_path, ["obsolete"]) as stage:
            for name in ("added", "kept"):
                (stage / name).write_text("new")

    with monkeypatch.context() as patch:
        patch.setattr(Path, operation, breaking_at(call, KeyboardInterrupt(), getattr(Path, operation)))
        with pytest.raises(KeyboardInterrupt):
            update()
    assert state(tmp_path) == before
    update()
    assert state(tmp_path) == {"added": b"new", "kept": b"new"}


def test_saving_loads_no_drawing_library() -> None:
    code = "import sys, coverage_lab.report; print([m for m in ('matplotlib', 'jinja2', 'PIL') if m in sys.modules])"
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout.strip() == "[]"


def test_a_page_that_cannot_be_drawn_leaves_no_data_either(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(page, "html", breaking_at(1, RuntimeError("broken template"), page.html))
    with pytest.raises(RuntimeError, match="broken template"):
        write(finished("enumerated"), tmp_path / "out")
    assert list(tmp_path.iterdir()) == []


def test_the_page_is_rebuilt_from_the_folder_byte_for_byte(report: Callable[[str], Path], tmp_path: Path) -> None:
    before = state(report("two-sided"))
    out = tmp_path / "copy"
    for name, content in before.items():
        if not name.startswith("figures/") and name != "report.html":
            (out / name).parent.mkdir(parents=True, exist_ok=True)
            (out / name).write_bytes(content)
    assert page.write(out) == out / "report.html"
    assert state(out) == before


def test_a_missing_file_is_an_error_of_the_system(tmp_path: Path) -> None:
    save(finished("enumerated"), tmp_path / "out")
    (tmp_path / "out/cells.csv").unlink()
    with pytest.raises(FileNotFoundError, match=r"cells\.csv"):
        load(tmp_path / "out")


def test_plans_that_differ_only_in_the_order_of_keys_are_the_same(tmp_path: Path) -> None:
    out = tmp_path / "out"
    save(finished("enumerated"), out)
    document = dict(reversed(list(planned("enumerated").document.items())))
    check_target(out, make_plan(document).document, overwrite=False)
