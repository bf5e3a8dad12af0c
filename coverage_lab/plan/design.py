"""[design] becomes a design: which keys belong to which kind, and the designs' own faults in a plan's words."""

import re
from collections.abc import Callable, Iterator, Sequence
from typing import Any

from coverage_lab import designs
from coverage_lab.checks import InputFault, unknown
from coverage_lab.designs import Classification, Clustered, Finite, Layered, Loss, Simple, Stratified, Stratum
from coverage_lab.designs.frame import Frame
from coverage_lab.plan.check import Checked
from coverage_lab.plan.faults import Fault
from coverage_lab.plan.lines import KeyPath
from coverage_lab.plan.parts import named, outcome_of
from coverage_lab.plan.schema import DesignTable, OutcomeTable, SampleTable, StudyTable
from coverage_lab.plan.schema_targets import ClassificationTable, LossTable

# What [design] may say beside the kind; those of the simple one are for sample-size alone.
KEYS: dict[str, tuple[str, ...]] = {
    "simple": ("population", "design_effect", "cluster_size"),
    "finite": ("population",),
    "clustered": ("population", "cluster_size", "cluster_cv", "icc"),
    "stratified": ("strata",),
}
NEEDED: dict[str, tuple[str, ...]] = {
    "simple": (),
    "finite": ("population",),
    "clustered": ("cluster_size", "icc"),
    "stratified": ("strata",),
}
_LINE = re.compile(r"\[([\w.]+)\] (\w+) = .*?: expected (.*)", re.DOTALL)

Design = Frame | Layered


def design_faults(checked: Checked) -> Iterator[Fault]:
    """Keys that do not belong to the kind, keys that it lacks, and what the design itself refuses."""
    table = checked.find(DesignTable)
    if table is None:
        return
    if table.kind not in designs.CATALOGUE:
        yield Fault(("design", "kind"), unknown("design", table.kind, designs.CATALOGUE), where="[design] kind")
        return
    found = [*_misplaced(table), *_lacking(table)]
    yield from found
    if found or any(fault.path[:1] == ("design",) for fault in checked.faults):
        return
    lines = _refused(checked)
    yield from (_located(line, checked) for line in dict.fromkeys(lines))


def design_of(checked: Checked) -> Design:
    """The design of sound tables.

    Raises:
        InputFault: what the design itself refuses, one line each.
    """
    pieces = [_tried(build) for build in (lambda: _frame(checked), lambda: _loss(checked), lambda: _test(checked))]
    faults = [line for _, lines in pieces for line in lines]
    if faults:
        raise InputFault(*faults)
    frame, *layers = (piece for piece, _ in pieces)
    present = tuple(layer for layer in layers if layer is not None)
    return Layered(frame, present) if present else frame


def sound_design(checked: Checked) -> Design | None:
    """The design, or None while something about it is at fault."""
    return None if any(True for _ in design_faults(checked)) or not _complete(checked) else design_of(checked)


def _complete(checked: Checked) -> bool:
    """Whether every table that the design is made of is sound."""
    unsound = any(fault.path[:1] == ("design",) for fault in checked.faults)
    return checked.find(DesignTable) is not None and not unsound


def _tried(build: Callable[[], Any]) -> tuple[Any, Sequence[str]]:
    """What was built, or why not."""
    try:
        return build(), ()
    except InputFault as fault:
        return None, fault.faults


def _misplaced(table: DesignTable) -> Iterator[Fault]:
    """Keys of another kind."""
    given = {key: value for key, value in table.model_dump().items() if key != "kind" and value is not None}
    for key, value in given.items():
        if key not in KEYS[table.kind]:
            kinds = " or ".join(f'"{kind}"' for kind, keys in KEYS.items() if key in keys)
            yield Fault(("design", key), f"to be left out unless kind = {kinds}", value)


def _lacking(table: DesignTable) -> Iterator[Fault]:
    """Keys that the kind cannot do without."""
    missing = [key for key in NEEDED[table.kind] if getattr(table, key) is None]
    if missing:
        word = "keys" if len(missing) > 1 else "key"
        what = f'expected the {word} {" and ".join(missing)}, since kind = "{table.kind}"'
        yield Fault(("design",), what, where="[design]")


def _refused(checked: Checked) -> list[str]:
    """What the design says against itself, its sizes and the range."""
    try:
        design = design_of(checked)
    except InputFault as fault:
        return list(fault.faults)
    sample, outcome = checked.find(SampleTable), checked.find(OutcomeTable)
    if sample is None:
        return []
    if outcome is None or named(checked) is None:
        return [line for n in sample.sizes for line in design.faults(n)]
    planned = outcome_of(checked)
    return [line for n in sample.sizes for line in designs.faults(design, n, planned.low, planned.high)]


def _located(line: str, checked: Checked) -> Fault:
    """A design's fault line at the key that it is about."""
    said = _LINE.fullmatch(line)
    sample = checked.find(SampleTable)
    if said and said[1] == "sample" and sample is not None:
        came = int(re.findall(r"= (\d+): ", line)[0])
        if sample.n is not None:
            return Fault(("sample", "n"), said[3], came)
        return Fault(("sample", "candidates", sample.sizes.index(came)), said[3], came)
    if said and said[1] in checked.tables and said[2] in type(checked.tables[said[1]]).model_fields:
        value = getattr(checked.tables[said[1]], said[2])
        return Fault((*said[1].split("."), said[2]), said[3], value)
    return Fault(_place(line, checked), line, where="")


def _place(line: str, checked: Checked) -> KeyPath:
    """The path of what a line without a key of its own is about."""
    table = line[1:].split("]", maxsplit=1)[0]
    path: KeyPath = tuple(table.split("."))
    strata = checked.get(DesignTable).strata
    if path == ("design", "strata") and strata is not None:
        name = line.partition("] ")[2].partition(": ")[0]
        at = [k for k, stratum in enumerate(strata) if stratum.name == name]
        return (*path, *at[:1])
    return path


def _frame(checked: Checked) -> Frame:
    """How units come into the sample; what produces the units has no finite population."""
    table, study = checked.get(DesignTable), checked.find(StudyTable)
    process = study is not None and study.target == "process"
    if table.kind == "finite":
        return Simple() if process else Finite(table.population or 0)
    if table.kind == "clustered":
        size = tuple(table.cluster_size) if isinstance(table.cluster_size, list) else table.cluster_size or 0
        population = None if process else table.population
        return Clustered(size, table.icc or 0.0, table.cluster_cv or 0.0, population=population)
    if table.kind == "stratified":
        return Stratified(tuple(Stratum(s.name, s.weight, s.n, s.odds_ratio) for s in table.strata or ()))
    return Simple()


def _loss(checked: Checked) -> Loss | None:
    """Units are lost before they are tested."""
    table = checked.find(LossTable)
    if table is None:
        return None
    both = (table.rate_events, table.rate_others) if table.rate is None else (table.rate, table.rate)
    return Loss(both[0] or 0.0, both[1] or 0.0, table.treat_as)


def _test(checked: Checked) -> Classification | None:
    """The test that the units are seen through."""
    table = checked.find(ClassificationTable)
    if table is None:
        return None
    tested = (table.diseased_tested, table.healthy_tested)
    return Classification(table.sensitivity or 0.0, table.specificity or 0.0, *tested)
