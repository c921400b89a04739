"""What every observable is: options that can be read, and a meter that measures one run.

To add a kind: write the class with its options as fields and `meter`, write the meter, add one line to kinds.py and
one job in jobs/. A meter names its columns, is offered every recorded time (`row`) and, where it integrates over
time, every sampling time (`sample`); at the end it yields results and curves. All in scaled units.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass
from typing import TYPE_CHECKING, Literal

import numpy as np

from ..grid import Axis
from ..hamiltonian import Hamiltonian
from ..models import Model
from ..packets.base import Surroundings
from ..potentials.base import Setting
from ..reading.quantities import Units
from ..results import Check, Column, Curve
from ..shapes import Landscape
from ..state import Look
from .integrals import every

if TYPE_CHECKING:
    from .swarm import ClassicalMeter

Array = np.ndarray
Toward = Literal["+x", "-x"]


@dataclass(frozen=True)
class Outline:
    """What the names of columns and results depend on."""

    axes: tuple[str, ...]
    layers: tuple[str, ...]  # "x.low", ...


@dataclass(frozen=True)
class Bench:
    """Where a meter stands: the job's physics, and the scales that errors are measured by."""

    hamiltonian: Hamiltonian
    landscape: Landscape
    units: Units
    charge: float  # in units of e
    start: float
    stop: float
    scales: Mapping[str, float]  # by dimension: initial width, initial momentum width, ...
    accuracy: float  # error wanted, of the scale
    fastest: float  # shortest time over which a time-dependent term changes; infinity without one

    @property
    def axis(self) -> Axis:
        return self.hamiltonian.grid.axes[0]

    @property
    def mass(self) -> float:
        return self.hamiltonian.masses[0]

    @property
    def surroundings(self) -> Surroundings:
        """What a packet that is compared with depends on."""
        return Surroundings(Setting(self.mass, self.charge, self.units), self.landscape, self.start)

    def scale(self, dimension: str) -> float:
        return self.scales.get(dimension, 1.0)


@dataclass(frozen=True)
class Series:
    """The rows of one meter: times (rows,) and values (rows, columns)."""

    times: Array
    values: Array

    def thinned(self) -> Series:
        """Every second row, and the last."""
        kept = every(2, len(self.times))
        return Series(self.times[kept], self.values[kept])


class Meter:
    """Measures one run of a state; subclasses keep what they need between calls."""

    samples: bool = False  # True: wants `sample` at every sampling time

    def start(self, look: Look) -> None:
        """The initial state, before anything else."""

    def sample(self, look: Look) -> None:
        """One of the evenly spaced sampling times, the first and the last included."""

    def row(self, look: Look) -> Sequence[float]:
        """The values of the observable's columns at a recorded time."""
        return ()

    def results(self, series: Series, stride: int = 1) -> Mapping[str, float | None]:
        """A value for each of the observable's figures, from every `stride`-th sample; None where it cannot be had."""
        return {}

    def notes(self) -> Mapping[str, str]:
        """Why a figure cannot be had, by its name."""
        return {}

    def curves(self) -> list[Curve]:
        return []

    def finished(self, series: Series) -> Series:
        """The rows as they are written, where the end of the run decides about all of them."""
        return series

    def own_errors(self) -> Mapping[str, Mapping[str, float]]:
        """What the method itself adds to a figure's error bar: figure -> part -> error."""
        return {}

    def checks(self) -> list[Check]:
        """What the meter judges about its own figures."""
        return []

    def progress(self) -> list[tuple[str, Array, Array]]:
        """Probabilities that add up while the run goes on, for pictures: name, times, value at each time."""
        return []


class Observable(Model):
    """One kind of observable."""

    def columns(self, outline: Outline) -> tuple[Column, ...]:
        """The columns it adds to series.csv."""
        return ()

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        """The results it yields: names, dimensions, meanings."""
        return ()

    def meter(self, bench: Bench) -> Meter:
        raise NotImplementedError

    def classical_figures(self, outline: Outline) -> tuple[Column, ...]:
        """Those of its figures that F = m a gives too."""
        return ()

    def classical(self, bench: Bench) -> ClassicalMeter | None:
        """The meter for trajectories that follow F = m a; None where there is no counterpart."""
        return None

    def misplaced(self, axis: Axis) -> tuple[str, str, str] | None:
        """(key, what is wrong, cure) where it cannot stand on this axis."""
        return None

    def unfit(self, bench: Bench, psi: Array) -> tuple[str, str, str] | None:
        """(key, what is wrong, cure) where it cannot be had of the initial state `psi`, shape (points,)."""
        return None

    def doubtful(self, bench: Bench, psi: Array) -> tuple[str, str, str] | None:
        """The same where it can be had in part only."""
        return None


def over_time(name: str, dimension: str, what: str) -> tuple[Column, ...]:
    """The figures .final, .min, .max and .mean of one column."""
    return (
        Column(f"{name}.final", dimension, f"{what} at the end"),
        Column(f"{name}.min", dimension, f"smallest {what} recorded"),
        Column(f"{name}.max", dimension, f"largest {what} recorded"),
        Column(f"{name}.mean", dimension, f"{what} averaged over time"),
    )


def time_average(series: Series, column: int = 0) -> float:
    """The mean over time of one column (trapezoidal rule over the recorded times)."""
    values, duration = series.values[:, column], series.times[-1] - series.times[0]
    return float(np.trapezoid(values, series.times) / duration) if duration > 0 else float(values[-1])


def summary(name: str, series: Series) -> dict[str, float | None]:
    """Values for `over_time`, of the first column."""
    values = series.values[:, 0]
    return {
        f"{name}.final": float(values[-1]),
        f"{name}.min": float(values.min()),
        f"{name}.max": float(values.max()),
        f"{name}.mean": time_average(series),
    }
