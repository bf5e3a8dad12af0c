"""Designs that the tests of this folder share: every frame under every stack of layers."""

import math
from dataclasses import dataclass

from coverage_lab.designs import Classification, Clustered, Finite, Layered, Loss, Simple, Stratified, Stratum
from coverage_lab.designs.frame import Frame

STRATA = (Stratum("north", 0.5, 40), Stratum("middle", 0.3, 30, 2.0), Stratum("south", 0.2, 30, 4.0))

FRAMES: dict[str, tuple[Frame, int]] = {
    "simple": (Simple(), 60),
    "finite": (Finite(400), 60),
    "endless": (Finite(math.inf), 60),
    "clusters": (Clustered(6, 0.1), 60),
    "listed": (Clustered((3, 3, 5, 8, 8, 13), 0.1), 40),
    "random": (Clustered(6, 0.1, cv=0.5), 60),
    "independent": (Clustered(6, 0.0), 60),
    "strata": (Stratified(STRATA), 100),
}

LAYERS = {
    "clear": (),
    "known": (Classification(0.9, 0.95),),
    "estimated": (Classification(0.9, 0.95, 20, 30),),
    "lost": (Loss(0.1, 0.1),),
    "lost_by_outcome": (Loss(0.3, 0.05),),
    "lost_as_events": (Loss(0.2, 0.1, "events"),),
    "lost_as_others": (Loss(0.1, 0.1, "non-events"),),
    "lost_and_known": (Loss(0.1, 0.1), Classification(0.9, 0.95)),
    "lost_by_outcome_and_known": (Loss(0.3, 0.05), Classification(0.9, 0.95)),
    "lost_and_estimated": (Loss(0.1, 0.1), Classification(0.9, 0.95, 20, 30)),
}


@dataclass(frozen=True)
class Case:
    """A design at a size."""

    name: str
    design: Frame | Layered
    n: int

    def views(self) -> list[Frame | Layered]:
        """The design in full, and as a method of events and trials sees it."""
        return [self.design, self.design.view(frozenset({"events", "trials"}))]


CASES = [
    Case(f"{frame}-{stack}", Layered(FRAMES[frame][0], layers) if layers else FRAMES[frame][0], FRAMES[frame][1])
    for frame in FRAMES
    for stack, layers in LAYERS.items()
]
