"""What an audit fixed before the data: read from its report folder."""

import json
from collections.abc import Mapping
from dataclasses import dataclass
from pathlib import Path

from coverage_lab.checks import InputFault
from coverage_lab.plan import of_option
from coverage_lab.records import SIDES, Method, Side


@dataclass(frozen=True)
class Planned:
    """The method that an audit named, for its n, confidence and side."""

    method: str
    n: int
    confidence: float
    side: Side


def read_planned(folder: Path) -> Planned:
    """The pre-specified analysis of a report folder.

    Raises:
        InputFault: not the folder of an audit, or the audit named no method.
    """
    from coverage_lab.report.document import FORMAT  # brings pandas, which no other question about data in hand needs

    path = folder / "audit.json"
    try:
        document = json.loads(path.read_text(encoding="utf-8"))
        if document["format"] != FORMAT:
            raise ValueError
        verdict, confidence, side = document["verdict"], document["confidence"], document["side"]
        method, n = verdict["method"], verdict["n"]
        sound = isinstance(n, int) and isinstance(confidence, float) and 0 < confidence < 1 and side in SIDES
        if not (sound and isinstance(method, str | None)):
            raise ValueError
    except (OSError, ValueError, KeyError, TypeError, RecursionError):
        raise InputFault(
            f"{folder}: expected the report folder of an audit, with its audit.json (format {FORMAT!r})"
        ) from None
    if method is None:
        raise InputFault(f"{folder}: expected an audit that names a method, but this one names none")
    return Planned(method, n, confidence, side)


def departures(planned: Planned, known: Mapping[str, Method], confidence: object, side: object) -> list[str]:
    """A line for everything asked for that is not what was fixed: options, or a method that is not at hand."""
    faults = []
    for option, fixed, asked in (("--confidence", planned.confidence, confidence), ("--side", planned.side, side)):
        if asked is not None and asked != fixed:
            faults.append(of_option(option, asked, f"{fixed}, which was fixed in advance, or the option left out"))
    if planned.method not in known:
        faults.append(f"method {planned.method!r}, fixed in advance, is one of your own, and is not installed here")
    return faults
