"""The report folder of a sample size: what is saved, how it is read back, and what may be overwritten."""

import dataclasses
import importlib.metadata
import json
import platform
from collections.abc import Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
from numpy.typing import NDArray

from coverage_lab.checks import InputFault, shown
from coverage_lab.plan_text import plan_digest, plan_text
from coverage_lab.records import Plan
from coverage_lab.records_sizing import FORMAT, Sizing, rows_of
from coverage_lab.report.chapters import markdown
from coverage_lab.report.document import plain
from coverage_lab.report.folder import PAGE, WORD_FILE
from coverage_lab.report.sizing_protocol import chapters, protocol_title
from coverage_lab.report.sizing_words import WALD, standing_cautions
from coverage_lab.report.word_file import word_file

DOCUMENT = "sample-size.json"
OF_AN_AUDIT = "audit.json"
TABLES = ("scan", "rare", "characteristic", "decision")
ALWAYS = (DOCUMENT, "plan.toml", "protocol.md", PAGE)
OPTIONAL = (*(f"{name}.csv" for name in TABLES), WORD_FILE)
LIBRARIES = ("numpy", "scipy", "pandas", "matplotlib")

COLUMNS: Mapping[str, tuple[str, ...]] = {
    "scan": ("n", "method", "minimum_coverage", "minimum_at", "mean_coverage", "half_width", "assurance"),
    "characteristic": ("events", "n", "p", "probability"),
    "decision": ("n", "critical", "size", "power"),
}
WHOLE = ("n", "events", "critical")
WORDS = ("method",)
KEYS = (
    *(
        "plan",
        "confidence",
        "side",
        "alpha",
        "standard",
        "outcome",
        "targets",
        "labels",
        "families",
        "at_n",
        "claim_at_n",
    ),
    *("methods", "formula"),
    *("rare", "zero_events", "seen", "decision", "inflated", "verdict", "cautions", "provenance", "horizon"),
)


@dataclass(frozen=True)
class SavedSizing:
    """The folder's data as read back: all that figures and page are made from.

    document: sample-size.json. scan, characteristic, decision: the CSV files of those names, empty where the plan asks
    for none. word_file: whether protocol.docx lies beside them.
    """

    document: dict[str, Any]
    scan: pd.DataFrame
    characteristic: pd.DataFrame
    decision: pd.DataFrame
    word_file: bool = False


def sizing_document(sizing: Sizing, provenance: Mapping[str, Any] | None = None) -> dict[str, Any]:
    """The exact content of sample-size.json: what `--json` prints, and what it takes to make the page from it.

    labels, families: of each method. at_n: the scan's figures at the recommended n (or the closest one) for the
    recommended method and plus-or-minus; claim_at_n: the exact test there. targets: what the plan asks for.
    """
    plan = sizing.plan
    document = {
        **sizing.document(),
        "title": plan.title,
        "confidence": plan.confidence,
        "side": plan.side,
        "alpha": plan.alpha,
        "standard": dataclasses.asdict(plan.standard),
        "outcome": {
            **{"name": plan.outcome.name, "expected": plan.outcome.expected},
            **{"range": [plan.outcome.low, plan.outcome.high], "prior": plan.outcome.prior},
        },
        "targets": _targets(plan),
        "labels": {method.name: method.label for method in (*plan.prefer, *plan.methods)},
        "families": {method.name: method.family for method in (*plan.prefer, *plan.methods)},
        "at_n": _at_n(sizing),
        "claim_at_n": _claim_at_n(sizing),
        "provenance": dict(provenance or _provenance(plan)),
    }
    document["cautions"] = [*sizing.cautions, *standing_cautions(document)]
    found = plain(document)
    return found if isinstance(found, dict) else {}


def _targets(plan: Plan) -> dict[str, Any]:
    """[precision], [rare] and [decision] as they were understood; None for what the plan does not ask."""
    asked = {"precision": plan.precision, "rare": plan.rare, "decision": plan.decision}
    return {name: dataclasses.asdict(target) if target else None for name, target in asked.items()}


def _at_n(sizing: Sizing) -> list[dict[str, Any]]:
    """The rows of the scan that the first screen speaks of."""
    verdict = sizing.verdict
    best = verdict.best or {}
    n = verdict.n if verdict.n is not None else best.get("n")
    names = [verdict.method or best.get("method"), WALD]
    return rows_of(sizing.scan[(sizing.scan["n"] == n) & sizing.scan["method"].isin(names)])


def _claim_at_n(sizing: Sizing) -> dict[str, Any] | None:
    """The exact test at the recommended n, which another target may have set; None where it was not looked at."""
    if sizing.decision is None or sizing.decision.n is None:
        return None
    table = sizing.decision.by_n
    found = rows_of(table[table["n"] == sizing.verdict.n])
    return found[0] if found else None


def _provenance(plan: Plan) -> dict[str, Any]:
    """What it takes to compute the same again; nothing is drawn at random, so there is no seed."""
    versions = {name: importlib.metadata.version(name) for name in LIBRARIES}
    return {
        "version": importlib.metadata.version("coverage-lab"),
        "plan_sha256": plan_digest(plan.document),
        "libraries": {"python": platform.python_version(), **versions},
    }


def write_data(sizing: Sizing, into: Path, provenance: Mapping[str, Any] | None = None) -> None:
    """The data files, into an existing directory; a table that the plan does not ask for has no file."""
    document = sizing_document(sizing, provenance)
    _write(into / DOCUMENT, json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False) + "\n")
    for name, frame in _tables(sizing):
        _write(into / f"{name}.csv", frame.to_csv(index=False, lineterminator="\n"))
    _write(into / "plan.toml", plan_text(sizing.plan.document))
    title, told = protocol_title(document), chapters(document)
    _write(into / "protocol.md", markdown(title, told))
    word = word_file(title, told)
    if word is not None:
        (into / WORD_FILE).write_bytes(word)


def _tables(sizing: Sizing) -> Iterator[tuple[str, pd.DataFrame]]:
    """The tables that hold something."""
    decision = sizing.decision.by_n if sizing.decision else pd.DataFrame()
    for name, frame in zip(TABLES, (sizing.scan, sizing.rare, sizing.characteristic, decision), strict=True):
        if not frame.empty:
            yield name, frame


def _write(path: Path, text: str) -> None:
    path.write_bytes(text.encode("utf-8"))


def load_sizing(folder: Path) -> SavedSizing:
    """Read a sample size's report folder back.

    Raises:
        OSError: a file is missing or unreadable.
        InputFault: sample-size.json is not one of ours, or a file is damaged.
    """
    path = folder / DOCUMENT
    document = _document(path)
    if document is None:
        raise InputFault(f"{path}: expected a sample size saved by coverage-lab, format {FORMAT!r}")
    missing = [key for key in KEYS if key not in document]
    if missing:
        raise InputFault(f"{path}: expected the keys {', '.join(KEYS)}; {', '.join(missing)} missing")
    asked = {
        "scan": bool(document["methods"]),
        "characteristic": any(row["n"] is not None for row in document["rare"]),
        "decision": document["decision"] is not None,
    }
    frames = {name: _read(folder / f"{name}.csv", name, wanted) for name, wanted in asked.items()}
    return SavedSizing(document, **frames, word_file=(folder / WORD_FILE).is_file())


def _read(path: Path, name: str, wanted: bool) -> pd.DataFrame:
    """A table as it was saved, every digit included; an empty one where none was asked for."""
    columns = list(COLUMNS[name])
    if not wanted:
        return pd.DataFrame(columns=columns)
    try:
        texts = pd.read_csv(path, usecols=columns, dtype=object, keep_default_na=False)
        return pd.DataFrame({column: _values(column, texts[column].to_numpy(dtype=object)) for column in columns})
    except ValueError as error:  # columns that are missing, cells that are no numbers, text that is not UTF-8
        raise InputFault(f"{path}: expected the table that a sample size saved, but: {error}") from None


def _values(column: str, texts: NDArray[np.object_]) -> NDArray[Any]:
    """One column from its texts: a method's name stays what it is, numbers keep every digit."""
    if column in WORDS:
        return texts
    return texts.astype(np.int64) if column in WHOLE else np.where(texts == "", "nan", texts).astype(float)


def check_sizing_target(folder: Path, plan_document: Mapping[str, Any], overwrite: bool) -> None:
    """Refuse a folder that holds an audit, another plan's sample size, or other files under the names of ours.

    Raises:
        InputFault: what the folder holds, and how to go on.
    """
    if folder.exists() and not folder.is_dir():
        raise InputFault(f"{folder}: expected a folder for the report, but it is a file")
    names = (*ALWAYS, *OPTIONAL, OF_AN_AUDIT)
    taken = [name for name in names if (folder / name).exists()]
    if overwrite or not taken:
        return
    held = _held(folder, taken, plan_digest(plan_document))
    if held is not None:
        raise InputFault(
            f"{folder}: expected a new folder or an earlier sample-size report of this plan, but it holds {held}; "
            "choose another folder with --out, or replace them with --overwrite"
        )


def _held(folder: Path, taken: list[str], digest: str) -> str | None:
    """What stands in the way, or None where it is an earlier report of the same plan."""
    if OF_AN_AUDIT in taken:
        return "the files of an audit's report"
    document = _document(folder / DOCUMENT) if DOCUMENT in taken else None
    if document is None:
        return f"other files named {', '.join(taken)}"
    if document.get("provenance", {}).get("plan_sha256") != digest:
        return f"the files of another plan's sample size ({shown(document.get('title'))})"
    return None


def _document(path: Path) -> dict[str, Any] | None:
    """The sample size saved at path, or None when the file is something else."""
    try:
        document = json.loads(path.read_text(encoding="utf-8"))
    except ValueError:  # not JSON, or not even text
        return None
    return document if isinstance(document, dict) and document.get("format") == FORMAT else None
