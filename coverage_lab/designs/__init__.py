"""The catalogue of designs: how a sample arises from the true proportion. One entry a design."""

from dataclasses import dataclass

from coverage_lab.designs.simple import Simple
from coverage_lab.records import Side

__all__ = ["CATALOGUE", "Entry", "Simple"]


@dataclass(frozen=True)
class Entry:
    """A design as the catalogue lists it, with the methods that may be named for it, first choice first."""

    frame: type[Simple]
    label: str
    source: str
    two_sided: tuple[str, ...]
    one_sided: tuple[str, ...]

    def prefer(self, side: Side) -> tuple[str, ...]:
        """The default preference list for that side."""
        return self.two_sided if side == "two-sided" else self.one_sided


CATALOGUE: dict[str, Entry] = {
    "simple": Entry(
        frame=Simple,
        label="simple random sample",
        source="Cochran 1977, Sampling Techniques, ch. 3",
        two_sided=("wilson", "clopper-pearson"),
        one_sided=("clopper-pearson",),
    ),
}
