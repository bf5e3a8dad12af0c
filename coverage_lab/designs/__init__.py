"""The catalogue of designs: how a sample arises from the true proportion. One entry a frame, one a layer."""

from collections.abc import Callable
from dataclasses import dataclass

from coverage_lab.checks import expected
from coverage_lab.designs.clustered import Clustered
from coverage_lab.designs.finite import Finite
from coverage_lab.designs.frame import Frame
from coverage_lab.designs.layered import Layered
from coverage_lab.designs.layers import Classification, Loss
from coverage_lab.designs.simple import Simple
from coverage_lab.designs.stratified import Stratified, Stratum
from coverage_lab.records import Side

__all__ = [
    "CATALOGUE",
    "EVERY",
    "LAYERS",
    "Classification",
    "Clustered",
    "Entry",
    "Finite",
    "LayerEntry",
    "Layered",
    "Loss",
    "Simple",
    "Stratified",
    "Stratum",
    "faults",
    "preferred",
]


@dataclass(frozen=True)
class Entry:
    """A frame as the catalogue lists it, with the methods that may be named for it, first choice first.

    `corrected` are the methods named when the units are seen through a test with known sensitivity and specificity.
    """

    frame: type[Frame]
    label: str
    source: str
    two_sided: tuple[str, ...]
    one_sided: tuple[str, ...]
    corrected: tuple[str, ...]
    corrected_one_sided: tuple[str, ...]

    def prefer(self, side: Side) -> tuple[str, ...]:
        """The default preference list for that side."""
        return self.two_sided if side == "two-sided" else self.one_sided


@dataclass(frozen=True)
class LayerEntry:
    """A layer as the catalogue lists it."""

    layer: Callable[..., Classification | Loss]
    label: str
    source: str


EVERY: dict[str, Entry] = {
    "simple": Entry(
        frame=Simple,
        label="simple random sample",
        source="Cochran 1977, Sampling Techniques, ch. 3",
        two_sided=("wilson", "clopper-pearson"),
        one_sided=("clopper-pearson",),
        corrected=("corrected-wilson", "corrected-clopper-pearson"),
        corrected_one_sided=("corrected-clopper-pearson",),
    ),
    "finite": Entry(
        frame=Finite,
        label="simple random sample from a finite population",
        source="Cochran 1977, Sampling Techniques, ch. 3",
        two_sided=("wilson-fpc", "hypergeometric-exact"),
        one_sided=("hypergeometric-exact",),
        # A finite correction shrinks the variance of the sampling, not that of the test's errors: it is left out.
        corrected=("corrected-wilson", "corrected-clopper-pearson"),
        corrected_one_sided=("corrected-clopper-pearson",),
    ),
    "clustered": Entry(
        frame=Clustered,
        label="clusters, beta-binomial",
        source="Cochran 1977, Sampling Techniques, ch. 9-10; Skellam 1948, J. R. Stat. Soc. B 10:257",
        two_sided=("wilson-deff-estimated", "korn-graubard"),
        one_sided=("korn-graubard",),
        corrected=("corrected-wilson-deff-estimated", "corrected-korn-graubard"),
        corrected_one_sided=("corrected-korn-graubard",),
    ),
    "stratified": Entry(
        frame=Stratified,
        label="stratified random sample",
        source="Cochran 1977, Sampling Techniques, ch. 5",
        two_sided=("stratified-wilson", "stratified-korn-graubard"),
        one_sided=("stratified-korn-graubard",),
        corrected=("corrected-stratified-wilson", "corrected-stratified-korn-graubard"),
        corrected_one_sided=("corrected-stratified-korn-graubard",),
    ),
}

# What a plan can name.
CATALOGUE: dict[str, Entry] = EVERY

LAYERS: dict[str, LayerEntry] = {
    "classification": LayerEntry(
        layer=Classification,
        label="a test with known or estimated sensitivity and specificity",
        source="Rogan & Gladen 1978, Am. J. Epidemiol. 107:71",
    ),
    "loss": LayerEntry(
        layer=Loss,
        label="units lost, alike or by outcome",
        source="Little & Rubin 2019, Statistical Analysis with Missing Data",
    ),
}


def preferred(design: Frame | Layered, side: Side) -> tuple[str, ...]:
    """The methods that may be named for a design by default, first choice first."""
    entry = EVERY[design.kind]
    test = next((k for k in getattr(design, "layers", ()) if isinstance(k, Classification)), None)
    if test is None:
        return entry.prefer(side)
    if test.estimated:
        return ("corrected-adjusted",)
    return entry.corrected if side == "two-sided" else entry.corrected_one_sided


def faults(design: Frame | Layered, n: int, low: float, high: float) -> list[str]:
    """Why the design cannot be studied at size n over the range [low, high], one line each; none when it can."""
    found = list(design.faults(n))
    points = design.points(low, high, n)
    if points is not None and len(points) == 0:
        nearest = design.settle((low + high) / 2, n)[0]
        found.append(expected(f"a reachable proportion, like {nearest:.6g}", [low, high], "[outcome] range"))
    return found
