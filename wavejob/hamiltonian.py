"""The Hamiltonian as a list of parts, each diagonal in one representation.

Everything is in the scaled units of a job, where hbar is 1. The state it acts on has shape
(runs, channels, points of axis 0, points of axis 1, ...), even where the first two are 1.
"""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass
from typing import Literal

import numpy as np

from .grid import Grid

Array = np.ndarray


@dataclass(frozen=True)
class Part:
    """One term of H: `in_time(t) * values(t)`, diagonal in `representation`.

    values    t -> array that broadcasts against (runs, channels, *grid); with `couples`,
              against (runs, channels, channels, *grid), Hermitian in the two channel axes.
    gradient  t -> one such array per axis, d(values)/d(axis); None where it is not known, and
              then only schemes without gradients can be used.
    in_time   t -> a number that multiplies the part; None for 1 at all times.
    moves     True where `values` itself depends on t.
    """

    representation: Literal["position", "wave number"]
    values: Callable[[float], Array]
    gradient: Callable[[float], tuple[Array, ...]] | None = None
    in_time: Callable[[float], float] | None = None
    moves: bool = False
    couples: bool = False

    @property
    def depends_on_time(self) -> bool:
        return self.moves or self.in_time is not None

    def factor(self, t: float) -> float:
        """f(t), 1 where the part has none."""
        return 1.0 if self.in_time is None else self.in_time(t)


@dataclass(frozen=True)
class Layer:
    """An absorbing layer at one end of an axis: the term -i rate(x) with rate >= 0.

    `first` is the index of its first point along `axis`; `rate` and `slope` (its derivative
    along the axis) have one value per point of the layer.
    """

    name: str  # "x.low", "x.high"
    axis: int
    first: int
    rate: Array
    slope: Array


@dataclass(frozen=True)
class Hamiltonian:
    """H = sum over axes of p^2 / 2 mass + parts - i layers, on `grid`."""

    grid: Grid
    masses: tuple[float, ...]  # one per axis
    parts: tuple[Part, ...] = ()
    layers: tuple[Layer, ...] = ()

    @property
    def depends_on_time(self) -> bool:
        return any(part.depends_on_time for part in self.parts)

    @property
    def couples(self) -> bool:
        return any(part.couples for part in self.parts)

    def kinetic(self) -> Array:
        """Kinetic energy on the wave-number grid, shape of the grid."""
        total = np.zeros(self.grid.shape)
        for index, (axis, mass) in enumerate(zip(self.grid.axes, self.masses, strict=True)):
            total = total + self.grid.along(index, axis.k**2 / (2 * mass))
        return total

    def potential(self, t: float) -> Array:
        """Sum of the parts that are diagonal in position and channel, without the layers."""
        total = np.zeros((1, 1, *self.grid.shape))
        for part in self.parts:
            if part.representation == "position" and not part.couples:
                total = total + part.factor(t) * part.values(t)
        return total
