"""Command-line options that stand in for keys of a plan."""

from collections.abc import Mapping
from typing import Any

from coverage_lab.checks import InputFault, unknown
from coverage_lab.plan.lines import KeyPath
from coverage_lab.plan.reading import plain

OPTIONS: dict[str, KeyPath] = {
    "confidence": ("confidence",),
    "side": ("side",),
    "n": ("sample", "n"),
    "range": ("outcome", "range"),
    "expected": ("outcome", "expected"),
    "replicates": ("simulation", "replicates"),
    "seed": ("simulation", "seed"),
    "horizon": ("sample", "horizon"),
    "half_width": ("precision", "half_width"),
    "assurance": ("precision", "assurance"),
    "rule_out": ("rare", "limit"),
    "events": ("rare", "events"),
    "hoped_for": ("rare", "hoped_for"),
    "goal": ("decision", "goal"),
    "believed": ("decision", "believed"),
    "alpha": ("decision", "alpha"),
    "power": ("decision", "power"),
    "population": ("design", "population"),
    "loss": ("design", "loss", "rate"),
    "design_effect": ("design", "design_effect"),
    "cluster_size": ("design", "cluster_size"),
}
REPLACED = {"n": (("sample", "n"), ("sample", "candidates")), "range": (("simulation", "grid"),)}


def overridden(document: Mapping[str, Any], overrides: Mapping[str, Any]) -> tuple[dict[str, Any], dict[KeyPath, str]]:
    """The document with the options' values in place of its own, and which option set which key.

    A plan's own grid belongs to its range, and goes with it when the range is replaced.
    """
    changed = dict(document)
    options: dict[KeyPath, str] = {}
    for option, value in overrides.items():
        if option not in OPTIONS:
            raise InputFault(unknown("override", option, OPTIONS))
        if value is None or (isinstance(value, list | tuple) and len(value) == 0):
            continue
        path, given = OPTIONS[option], plain(value)
        for key in REPLACED.get(option, ()):
            changed = _without(changed, *key)
        if option == "n":
            path, given = (path, value[0]) if len(value) == 1 else (("sample", "candidates"), list(value))
        changed = _with(changed, path, given)
        options[path] = f"--{option.replace('_', '-')}"
    return changed, options


def _without(document: dict[str, Any], table: str, key: str) -> dict[str, Any]:
    """The document without one key of a table."""
    inside = document.get(table)
    if not isinstance(inside, Mapping) or key not in inside:
        return document
    return {**document, table: {name: value for name, value in inside.items() if name != key}}


def _with(document: dict[str, Any], path: KeyPath, value: object) -> dict[str, Any]:
    """The document with one key set; what stands where a table should be is left, to be reported."""
    name = str(path[0])
    if len(path) == 1:
        return {**document, name: value}
    inside = document.get(name, {})
    return {**document, name: _with(dict(inside), path[1:], value)} if isinstance(inside, Mapping) else document
