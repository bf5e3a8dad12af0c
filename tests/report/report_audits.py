"""Small finished audits, made by the real engine with a fixed provenance, and a page taken apart."""

from collections.abc import Mapping
from functools import cache
from html.parser import HTMLParser
from pathlib import Path
from typing import Any

import pytest

from coverage_lab import study
from coverage_lab.plan import make_plan
from coverage_lab.records import Audit, Plan

METHODS = ["wilson", "clopper-pearson", "jeffreys", "mid-p", "poisson-exact", "wald"]

PLANS: Mapping[str, Mapping[str, Any]] = {
    "two-sided": {
        "title": "Weld test",
        "study": {"population": "welds of one line", "unit": "one weld", "target": "process", "range_basis": "pilot"},
        "outcome": {"name": "crack found", "range": [0.02, 0.1]},
        "sample": {"n": 60},
    },
    "several": {"outcome": {"range": [0.05, 0.2]}, "sample": {"candidates": [30, 20, 60, 50, 40]}},
    "upper": {"side": "upper", "outcome": {"range": [0.01, 0.1]}, "sample": {"n": 80}},
    "none": {"outcome": {"range": [0.02, 0.1]}, "sample": {"n": 60}, "methods": {"prefer": ["wald"]}},
    "simulated": {
        "outcome": {"range": [0.02, 0.1]},
        "sample": {"n": 60},
        "simulation": {"replicates": 500, "routes": ["simulated"]},
    },
    "undecided": {
        "outcome": {"range": [0.02, 0.1]},
        "sample": {"n": 60},
        "simulation": {"replicates": 50, "routes": ["simulated"]},
        "methods": {"prefer": ["wilson"]},
    },
    "enumerated": {
        "outcome": {"range": [0.05, 0.05]},
        "sample": {"n": 60},
        "simulation": {"routes": ["enumerated"]},
    },
    "hostile": {
        "title": "<script>alert(1)</script> </title> مرحبا 😀 " + "x" * 300,
        "study": {"population": "<img src=x onerror=alert(2)>\n\n# not a heading", "unit": "[unit: \"'&]"},
        "outcome": {"name": "</style><b>bold</b> $x_1$", "range": [0.02, 0.1]},
        "sample": {"n": 40},
        "methods": {"prefer": ["wilson", "clopper-pearson"]},
    },
}
"""Plans by what is special about them."""

PROVENANCE = {
    "version": "0.1.0",
    "libraries": {"python": "3.11", "numpy": "2.0"},
    "created": "2000-01-01T00:00:00+00:00",
}


def planned(name: str) -> Plan:
    """The plan of that name, with few draws, and but for the hostile one with few methods."""
    document: dict[str, Any] = {"simulation": {"replicates": 400}, **PLANS[name]}
    few = {} if name == "hostile" else {"only": METHODS}
    return make_plan({**document, "methods": {**few, **document.get("methods", {})}})


@cache
def finished(name: str) -> Audit:
    """The audit of that plan."""

    def provenance(plan: Plan) -> dict[str, Any]:
        return {**PROVENANCE, "seed": plan.simulation.seed, "plan_sha256": study.plan_digest(plan.document)}

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(study, "provenance", provenance)
        return study.audit(planned(name))


class Tree(HTMLParser):
    """A page as a list of (tag, attributes, enclosing tags) and the text inside each element."""

    VOID = frozenset({"meta", "img", "br", "hr", "input", "link", "line", "circle"})

    def __init__(self, text: str) -> None:
        super().__init__(convert_charrefs=True)
        self.elements: list[tuple[str, dict[str, str], tuple[str, ...]]] = []
        self.texts: list[list[str]] = []
        self._open: list[tuple[str, int]] = []
        self.feed(text)
        self.close()
        assert not self._open, f"not closed: {self._open}"

    def handle_starttag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, {k: v or "" for k, v in attrs}, tuple(name for name, _ in self._open)))
        self.texts.append([])
        if tag not in self.VOID:
            self._open.append((tag, len(self.elements) - 1))

    def handle_startendtag(self, tag: str, attrs: list[tuple[str, str | None]]) -> None:
        self.elements.append((tag, {k: v or "" for k, v in attrs}, tuple(name for name, _ in self._open)))
        self.texts.append([])

    def handle_endtag(self, tag: str) -> None:
        if tag in self.VOID:
            return
        name, _ = self._open.pop()
        assert name == tag, f"</{tag}> closes <{name}>"

    def handle_data(self, data: str) -> None:
        for _, index in self._open:
            self.texts[index].append(data)

    def all(self, *tags: str) -> list[tuple[dict[str, str], tuple[str, ...], str]]:
        """Attributes, enclosing tags and text of every element with one of the tags."""
        return [
            (attributes, inside, " ".join("".join(text).replace("\u00a0", " ").split()))
            for (tag, attributes, inside), text in zip(self.elements, self.texts, strict=True)
            if tag in tags
        ]

    def by_id(self, name: str) -> str:
        """The text of the element with that id."""
        found = [
            "".join(text)
            for (_, attributes, _), text in zip(self.elements, self.texts, strict=True)
            if attributes.get("id") == name
        ]
        assert len(found) == 1, f"{len(found)} elements with id {name}"
        return " ".join(found[0].replace("\u00a0", " ").split())


def page_of(folder: Path) -> Tree:
    """The folder's page, parsed."""
    return Tree((folder / "report.html").read_text(encoding="utf-8"))
