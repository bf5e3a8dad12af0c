"""The sampling model in words, from the saved plan."""

from collections.abc import Mapping
from typing import Any

from coverage_lab.rounding import percent, whole

Document = Mapping[str, Any]


def design_words(document: Document) -> str:
    """How the sample arises, without an article: 'simple random sample'."""
    design = document["plan"].get("design") or {}
    study = document["plan"].get("study") or {}
    said = [_frame(design, study.get("target") == "process")]
    if "classification" in design:
        said.append(_test(design["classification"]))
    if "loss" in design:
        said.append(_loss(design["loss"]))
    return ", ".join(said)


def _frame(design: Mapping[str, Any], process: bool) -> str:
    """How units come into the sample."""
    kind = design.get("kind", "simple")
    if kind == "finite" and not process:
        return f"simple random sample from a population of {whole(design['population'])} units"
    if kind == "clustered":
        return _clusters(design)
    if kind == "stratified":
        return f"stratified random sample from {len(design['strata'])} strata"
    return "simple random sample"


def _clusters(design: Mapping[str, Any]) -> str:
    """Whole clusters, their sizes and their correlation."""
    size, cv = design["cluster_size"], design.get("cluster_cv")
    if isinstance(size, list):
        units = f"{len(size)} clusters of {whole(min(size))} to {whole(max(size))} units"
    else:
        about = f"on average (coefficient of variation {cv:g}) " if cv else ""
        units = f"clusters of {about}{whole(size)} units"
    return f"random sample of whole {units} with intraclass correlation {design['icc']:g}"


def _test(test: Mapping[str, Any]) -> str:
    """The test that units are seen through."""
    said = f"seen through a test with sensitivity {percent(test['sensitivity'])} and specificity "
    said += percent(test["specificity"])
    if "diseased_tested" not in test:
        return said
    return f"{said}, both estimated from {whole(test['diseased_tested'])} and {whole(test['healthy_tested'])} units"


def _loss(loss: Mapping[str, Any]) -> str:
    """The units that are lost and what is done with them."""
    treated = loss.get("treat_as", "excluded")
    done = "left out" if treated == "excluded" else f"counted as {treated}"
    if "rate" in loss:
        return f"{percent(loss['rate'])} of units lost and {done}"
    return f"{percent(loss['rate_events'])} of events and {percent(loss['rate_others'])} of others lost and {done}"
