"""What a run keeps while it goes: rows, samples, frames, stored fields. Each is an output of the loop."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass, field, replace

import numpy as np

from .evolve.schedule import Schedule
from .observables.base import Bench, Meter, Series
from .observables.interpolant import finer
from .observables.moments import kinetic_energy, mean_place, norm, place_width, potential_energy
from .state import Look

Array = np.ndarray

FINE_ENOUGH = 4096  # places along the axis at which a curve looks smooth, also in a close-up
WIDEST_FRAME = 4096  # places kept of a frame: more than any picture has pixels


class Sampler:
    """Offers the evenly spaced looks to the meters that integrate over time."""

    def __init__(self, schedule: Schedule, meters: list[Meter]) -> None:
        self.schedule = schedule
        self.meters = [meter for meter in meters if meter.samples]

    def see(self, look: Look) -> None:
        for meter in self.meters:
            meter.sample(look)


class Rows:
    """The time series: one row of all meters per recorded time."""

    def __init__(self, schedule: Schedule, meters: list[Meter]) -> None:
        self.schedule = schedule
        self.meters = meters
        self.times: list[float] = []
        self.rows: list[list[list[float]]] = []

    def see(self, look: Look) -> None:
        self.times.append(look.t)
        self.rows.append([[float(v) for v in meter.row(look)] for meter in self.meters])

    def series(self, index: int) -> Series:
        """The rows of meter `index`."""
        return Series(np.array(self.times), np.array([row[index] for row in self.rows]))


@dataclass
class Watch:
    """What the checks judge by: the largest value each quantity reached at a recorded time."""

    schedule: Schedule
    bench: Bench
    norm_drift: float = 0.0
    edge: float = 0.0
    head_room: float = 0.0
    moments: list[tuple[float, float, float]] = field(default_factory=list)  # norm, mean place, width

    def see(self, look: Look) -> None:
        axis = self.bench.axis
        self.moments.append((norm(look), mean_place(look, self.bench), place_width(look, self.bench)))
        absorbed = sum(float(taken[0]) for taken in look.absorbed.values())
        self.norm_drift = max(self.norm_drift, abs(norm(look) + absorbed - 1))
        rim = max(axis.points // 100, 1)
        density = look.density[0].sum(0)
        outermost = max(density[:rim].sum(), density[-rim:].sum()) * axis.spacing
        self.edge = max(self.edge, float(outermost))
        fast = np.abs(axis.k) > 0.8 * axis.k_max
        self.head_room = max(self.head_room, float(look.momentum_density[0].sum(0)[fast].sum()))


@dataclass
class Frames:
    """The film's raw material: density and phase at regular times, at as many places as a picture can show.

    A coarse grid shows the interpolant between its points, a fine one the highest of several points.
    """

    schedule: Schedule
    bench: Bench
    view: tuple[float, float]
    times: list[float] = field(default_factory=list)
    density: list[Array] = field(default_factory=list)
    phase: list[Array] = field(default_factory=list)
    energy: list[float] = field(default_factory=list)
    norm: list[float] = field(default_factory=list)

    def __post_init__(self) -> None:
        axis = self.bench.axis
        self.times_finer = max(FINE_ENOUGH // axis.points, 1)
        x = replace(axis, points=self.times_finer * axis.points).x
        inside = np.flatnonzero((x >= self.view[0]) & (x <= self.view[1]))
        self.bin = max(-(-inside.size // WIDEST_FRAME), 1)
        self.span = slice(int(inside[0]), int(inside[0]) + inside.size // self.bin * self.bin)
        self.x = x[self.span].reshape(-1, self.bin).mean(1)

    def see(self, look: Look) -> None:
        psi = look.psi[0, 0]
        if self.times_finer > 1:
            psi = finer(self.bench.axis, psi, self.times_finer)
        psi = psi[self.span].reshape(-1, self.bin)
        density = np.abs(psi) ** 2
        top = density.argmax(1)
        rows = np.arange(top.size)
        self.times.append(look.t)
        self.density.append(density[rows, top].astype(np.float32))
        self.phase.append(np.angle(psi[rows, top]).astype(np.float32))
        total = norm(look)
        self.norm.append(total)
        energy = kinetic_energy(look, self.bench) + potential_energy(look, self.bench)
        self.energy.append(energy / total if total > 1e-6 else np.nan)


class Stored:
    """The field itself, or a density, at regular times."""

    def __init__(self, schedule: Schedule, take: Callable[[Look], Array]) -> None:
        self.schedule = schedule
        self.take = take
        self.times: list[float] = []
        self.values: list[Array] = []

    def see(self, look: Look) -> None:
        self.times.append(look.t)
        self.values.append(self.take(look))


class Ticker:
    """Tells how far the run is, about as often as the time series is recorded."""

    def __init__(self, schedule: Schedule, tell: Callable[[Look], None]) -> None:
        self.schedule = schedule
        self.tell = tell

    def see(self, look: Look) -> None:
        self.tell(look)
