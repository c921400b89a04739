"""What an observable is of trajectories that follow F = m a, in groups whose spread tells the error."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from ..newton import Passages
from ..results import Column
from ..shapes import Landscape
from .base import Series

Array = np.ndarray

PREFIX = "classical."
OWN_FIGURES = (
    Column(f"{PREFIX}action", meaning="integral of p dx over hbar by F = m a from the mean start"),
    Column(f"{PREFIX}lagrangian_action", meaning="integral of L dt over hbar by F = m a from the mean start"),
    Column(f"{PREFIX}largest_gap", meaning="largest difference of mean places over the quantum width"),
    Column(f"{PREFIX}gap_opens", "time", "when that gap first exceeds a tenth"),
)


def by_newton(column: Column) -> Column:
    """The column or figure of F = m a that belongs to a quantum one."""
    return replace(column, name=f"{PREFIX}{column.name}", meaning=f"{column.meaning}, by F = m a")


@dataclass(frozen=True)
class Swarm:
    """Trajectories at one time; x, p and weight have the shape (groups, n).

    The weights of a group add up to 1 at the start, and with what was `absorbed`, shape (groups,) by layer,
    to the same later on.
    """

    t: float
    x: Array
    p: Array
    weight: Array
    absorbed: Mapping[str, Array]
    landscape: Landscape
    mass: float

    @cached_property
    def pooled(self) -> Swarm:
        """All groups as one."""
        absorbed = {name: taken.mean(keepdims=True) for name, taken in self.absorbed.items()}
        x, p, weight = (values.reshape(1, -1) for values in (self.x, self.p, self.weight))
        return replace(self, x=x, p=p, weight=weight / len(self.x), absorbed=absorbed)

    @cached_property
    def norm(self) -> Array:
        """Weight that is left, shape (groups,)."""
        return np.asarray(self.weight.sum(axis=1))

    def mean(self, values: Array) -> Array:
        """Mean of `values` (groups, n) over what is left, nan where nothing is; shape (groups,)."""
        left = np.where(self.norm > 0, self.norm, np.nan)
        return np.asarray((self.weight * values).sum(axis=1) / left)

    def deviation(self, values: Array) -> Array:
        """Standard deviation of `values` over what is left, shape (groups,)."""
        variance = self.mean((values - self.mean(values)[:, None]) ** 2)
        return np.asarray(np.sqrt(np.maximum(variance, 0.0)))

    def between(self, start: float, stop: float) -> Array:
        """Weight between two places, shape (groups,)."""
        return np.asarray(np.where((self.x > start) & (self.x < stop), self.weight, 0.0).sum(axis=1))

    @cached_property
    def potential(self) -> Array:
        return self.landscape.value(self.x, self.t)

    @cached_property
    def force(self) -> Array:
        """-dV/dx off sharp edges."""
        return -self.landscape.slope(self.x, self.t)


@dataclass(frozen=True)
class History:
    """What one group did: values at the recorded times by name, shape (rows,), and what edges it crossed."""

    times: Array
    rows: Mapping[str, Array]
    passages: Passages

    def series(self, name: str) -> Series:
        return Series(self.times, self.rows[name][:, None])

    def last(self, name: str) -> float:
        return float(self.rows[name][-1])

    def passing(self, place: float) -> Passages:
        """All passages of a place."""
        return self.passages.at(self.passages.place == place)


Figures = Mapping[str, float | None]


@dataclass(frozen=True)
class ClassicalMeter:
    """An observable of trajectories, under the names of the quantum one.

    row      values at a recorded time, shape (groups,); those that are no columns are kept for `figures`
    figures  what a history of such rows and passages comes to
    place    a place whose passages are wanted
    counts   the figures are shares of trajectories: they resolve no less than one of them
    """

    row: Callable[[Swarm], Mapping[str, Array]]
    figures: Callable[[History], Figures]
    place: float | None = None
    counts: bool = False
