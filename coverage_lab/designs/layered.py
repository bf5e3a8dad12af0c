"""A frame under a stack of layers is a design again."""

from collections.abc import Mapping
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Any

import numpy as np
from numpy.typing import NDArray

from coverage_lab.checks import InputFault, expected
from coverage_lab.designs.frame import LARGEST_LAW, Frame, probable
from coverage_lab.designs.layers import Layer
from coverage_lab.designs.lens import Lens, stacked
from coverage_lab.records import Array, Columns, Outcomes, Part


@dataclass(frozen=True)
class Layered:
    """The frame's units, recorded through the layers in their order; what is lost is treated last.

    Raises:
        InputFault: two layers of one kind.
    """

    frame: Frame
    layers: tuple[Layer, ...]

    def __post_init__(self) -> None:
        kinds = [layer.kind for layer in self.layers]
        if len(set(kinds)) < len(kinds):
            raise InputFault(expected("each kind at most once: their errors would not be told apart", kinds, "layers"))

    @property
    def kind(self) -> str:
        """The frame's catalogue name."""
        return self.frame.kind

    @property
    def columns(self) -> tuple[str, ...]:
        """The frame's, and what the layers add."""
        return (*self.frame.columns, *(name for layer in self.layers for name in layer.columns))

    @cached_property
    def lens(self) -> Lens:
        """What the whole stack does to a unit."""
        return stacked([*(layer.matrix for layer in self.layers), *(layer.treatment for layer in self.layers)])

    @cached_property
    def constants(self) -> Columns:
        """The layers' columns that no sample varies in."""
        return {name: values for layer in self.layers for name, values in layer.constants.items()}

    def settle(self, p: float, n: int) -> tuple[float, int]:
        """As the frame: the truth is what units are, not what is recorded of them."""
        return self.frame.settle(p, n)

    def points(self, low: float, high: float, n: int) -> Array | None:
        """As the frame."""
        return self.frame.points(low, high, n)

    def faults(self, n: int) -> tuple[str, ...]:
        """As the frame."""
        return self.frame.faults(n)

    def draw(self, p: float, n: int, size: int, rng: np.random.Generator) -> Columns:
        """`size` literal samples: units through the lens, then what the layers draw of their own."""
        columns: Mapping[str, NDArray[Any]] = {**self.frame.drawn(p, n, size, rng, self.lens), **self.constants}
        for layer in self.layers:
            columns = {**columns, **layer.draw(size, rng)}
        return columns

    def law(self, p: float, n: int) -> Outcomes | None:
        """The frame's law through the lens, times the layers' own laws; None when that is too much to list."""
        found = self.frame.listed(p, n, self.lens)
        if found is not None:
            found = Outcomes({**found.columns, **self.constants}, found.weight)
        for own in (layer.law() for layer in self.layers):
            if found is not None and own is not None:
                found = _product(found, own)
        return found

    def parts(self, n: int) -> tuple[Part, ...] | None:
        """The frame's mixture through the lens; None where a layer draws something of its own."""
        if any(layer.law() is not None for layer in self.layers):
            return None
        parts = self.frame.mixed(n, self.lens)
        return parts and tuple(replace(part, constants={**part.constants, **self.constants}) for part in parts)

    def view(self, needs: frozenset[str]) -> "Layered":
        """The frame's view, under layers without the columns that nothing needs."""
        return Layered(self.frame.view(needs), tuple(layer.view(needs) for layer in self.layers))


def _product(first: Outcomes, second: Outcomes) -> Outcomes | None:
    """Two independent lists of samples as one; None when the result is too long."""
    rows, columns = len(first.weight), len(second.weight)
    if rows * columns > 10 * LARGEST_LAW:
        return None
    left, right = np.repeat(np.arange(rows), columns), np.tile(np.arange(columns), rows)
    joined = {
        name: values[place] if len(values) > 1 else values
        for found, place in ((first, left), (second, right))
        for name, values in found.columns.items()
    }
    return probable(joined, first.weight[left] * second.weight[right])
