"""Axes, their points and wave numbers, and sizes that transform fast."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from typing import Literal

import numpy as np

Array = np.ndarray
Transform = Literal["periodic", "sine"]


@dataclass(frozen=True)
class Axis:
    """One axis: points at low + (j + 1/2) spacing, and the transform its ends ask for.

    "periodic" wraps around; "sine" makes the field vanish at `low` and `high` (walls).
    Lengths are in the scaled units of the job.
    """

    name: str
    low: float
    high: float
    points: int
    transform: Transform = "periodic"

    @property
    def length(self) -> float:
        return self.high - self.low

    @property
    def spacing(self) -> float:
        return self.length / self.points

    @cached_property
    def x(self) -> Array:
        """Grid points, shape (points,)."""
        return self.low + (np.arange(self.points) + 0.5) * self.spacing

    @cached_property
    def k(self) -> Array:
        """Wave numbers in transform order, shape (points,), radians per length."""
        if self.transform == "sine":
            return np.pi * np.arange(1, self.points + 1) / self.length
        return 2 * np.pi * np.fft.fftfreq(self.points, self.spacing)

    @property
    def k_max(self) -> float:
        """Largest wave number the points can hold, pi / spacing."""
        return float(np.pi / self.spacing)


@dataclass(frozen=True)
class Grid:
    """The axes of a job, in order."""

    axes: tuple[Axis, ...]

    @property
    def shape(self) -> tuple[int, ...]:
        return tuple(axis.points for axis in self.axes)

    @property
    def cell(self) -> float:
        """Volume of one cell: sums over points times this are integrals."""
        return float(np.prod([axis.spacing for axis in self.axes]))

    def along(self, index: int, values: Array) -> Array:
        """`values` (points of axis `index`,) shaped to broadcast over the whole grid."""
        shape = [1] * len(self.axes)
        shape[index] = -1
        return values.reshape(shape)


def fast_size(at_least: int) -> int:
    """The smallest even size >= `at_least` whose only prime factors are 2, 3 and 5."""
    best = 1 << max(at_least - 1, 1).bit_length()
    five = 1
    while five < best:
        three = five
        while three < best:
            two = three * 2
            while two < at_least:
                two *= 2
            best = min(best, two)
            three *= 3
        five *= 5
    return best


def fast_size_below(at_most: int) -> int:
    """The largest even size <= `at_most` whose only prime factors are 2, 3 and 5."""
    size = at_most - at_most % 2
    while fast_size(size) != size:
        size -= 2
    return size
