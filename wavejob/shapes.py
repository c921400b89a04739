"""A potential as it is meant: exact functions of x and t, sharp edges listed, and how both reach a grid."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass, replace
from functools import cached_property

import numpy as np

from .grid import Axis

Array = np.ndarray
Field = Callable[[Array, float], Array]

DAMPING = 36.0  # exp(-36) is the rounding error of double precision: the last wave number is gone
ONE_EDGE = 1e-9  # of the length of the axis: edges nearer to each other than this are one
DAMPING_POWER = 8  # a wave number at a third of the largest is damped by 0.5 %, at a fifth by 1e-4

# What damping and the grid take from an edge, its short waves, would have lowered the energy of a slow particle at
# the edge in second order of perturbation theory: by sum of |V_q|^2 (1 - damping^2) / (q^2 / 2m), which for a jump is
# a peak of this strength times 2m jump^2 / k_max^3, put back by `Breaks.resolved`. Measured on a double barrier at
# five points a barrier, it lowers the error of the transmitted probability from 7e-4 to 5e-5.
MISSED = (2 * DAMPING) ** (3 / DAMPING_POWER) * math.gamma(1 - 3 / DAMPING_POWER) / (3 * math.pi)


@dataclass(frozen=True)
class Breaks:
    """A piecewise linear function that is 0 far to the left: jumps in value and in slope at given places.

    f(x) = sum of (jumps[j] + kinks[j] (x - positions[j])) over all positions[j] < x. `peaks` are strengths of
    delta functions at the same places; only `sampled` knows them.
    """

    positions: Array
    jumps: Array
    kinks: Array
    peaks: Array

    @classmethod
    def of(cls, *edges: tuple[float, float, float]) -> Breaks:
        """From (position, jump, kink) triples in any order."""
        table = np.array(sorted(edges), dtype=float).reshape(-1, 3)
        return cls(table[:, 0], table[:, 1], table[:, 2], np.zeros(len(table)))

    @classmethod
    def summed(cls, several: list[Breaks], apart: float) -> Breaks:
        """Their sum; edges less than `apart` from each other are one."""
        table = np.concatenate([np.stack([b.positions, b.jumps, b.kinks, b.peaks], axis=1) for b in several])
        table = table[np.argsort(table[:, 0], kind="stable")]
        first = np.flatnonzero(np.concatenate([[True], np.diff(table[:, 0]) > apart]))
        total = np.add.reduceat(table, first)
        return cls(table[first, 0], *total.T[1:])

    def moved(self, by: float) -> Breaks:
        return replace(self, positions=self.positions + by)

    def scaled(self, by: float) -> Breaks:
        return replace(self, jumps=self.jumps * by, kinks=self.kinks * by, peaks=self.peaks * by)

    def resolved(self, axis: Axis, mass: float) -> Breaks:
        """With the peaks that stand for what the points of `axis` cannot show of the jumps."""
        return replace(self, peaks=missed(axis, mass) * self.jumps**2)

    def value(self, x: Array) -> Array:
        """f at x; half-way between the two sides on an edge itself."""
        away = np.asarray(x)[..., None] - self.positions
        return np.asarray((np.heaviside(away, 0.5) * (self.jumps + self.kinks * away)).sum(-1))

    def slope(self, x: Array) -> Array:
        """f' at x, off the edges."""
        away = np.asarray(x)[..., None] - self.positions
        return np.asarray((np.heaviside(away, 0.5) * self.kinks).sum(-1))

    def within(self, low: float, high: float) -> tuple[Breaks, float, float]:
        """The edges inside (low, high), and value and slope just right of `low`."""
        before = self.positions <= low
        value = float((self.jumps + self.kinks * (low - self.positions))[before].sum())
        slope = float(self.kinks[before].sum())
        inside = ~before & (self.positions < high)
        kept = Breaks(self.positions[inside], self.jumps[inside], self.kinks[inside], self.peaks[inside])
        return kept, value, slope

    def sampled(self, axis: Axis, damped: bool = True) -> tuple[Array, Array]:
        """Values and gradient at the points of `axis`, from the exact Fourier series, damped.

        Sampling the function itself would move every edge to the nearest cell boundary. The exact
        series of the periodic function (on a sine axis: of its even continuation) times
        exp(-36 (k / k_max)^8) keeps the place of an edge within a cell and has a derivative that
        belongs to it, which the gradient-corrected splitting needs to keep its order. Undamped, the series
        turns sums over points into exact integrals (`observables`).
        """
        inside, value, slope = self.within(axis.low, axis.high)
        if axis.transform == "periodic":
            return _series(inside, value, slope, axis.low, axis.length, axis.points, damped)
        left = axis.high - inside.positions
        end_value = value + slope * axis.length + float((inside.jumps + inside.kinks * left).sum())
        end_slope = slope + float(inside.kinks.sum())
        mirrored = Breaks(
            np.concatenate([2 * axis.low - inside.positions[::-1], [axis.low], inside.positions]),
            np.concatenate([-inside.jumps[::-1], [0.0], inside.jumps]),
            np.concatenate([inside.kinks[::-1], [2 * slope], inside.kinks]),
            np.concatenate([inside.peaks[::-1], [0.0], inside.peaks]),
        )
        values, gradient = _series(
            mirrored, end_value, -end_slope, axis.low - axis.length, 2 * axis.length, 2 * axis.points, damped
        )
        return values[axis.points :], gradient[axis.points :]


def _series(
    edges: Breaks, value: float, slope: float, low: float, length: float, points: int, damped: bool
) -> tuple[Array, Array]:
    """Values and gradient at low + (j + 1/2) length / points of the periodic function with `edges` inside
    (low, low + length) that starts at `low` with `value` and `slope`."""
    left = low + length - edges.positions
    end_value = value + slope * length + float((edges.jumps + edges.kinks * left).sum())
    end_slope = slope + float(edges.kinks.sum())
    mean = value + slope * length / 2
    mean += float((edges.jumps * left + edges.kinks * left**2 / 2 + edges.peaks).sum()) / length
    from_low = np.concatenate([[0.0], edges.positions - low])
    jumps = np.concatenate([[value - end_value], edges.jumps])
    kinks = np.concatenate([[slope - end_slope], edges.kinks])
    peaks = np.concatenate([[0.0], edges.peaks])

    k = 2 * np.pi * np.arange(1, points // 2 + 1) / length
    waves = np.exp(-1j * np.outer(k, from_low))
    series = waves @ jumps / (1j * k) + waves @ kinks / (1j * k) ** 2 + waves @ peaks
    spacing = length / points
    if damped:
        series *= np.exp(-DAMPING * (k * spacing / np.pi) ** DAMPING_POWER)
    series *= np.exp(0.5j * k * spacing) * points / length
    values = np.fft.irfft(np.concatenate([[mean * points], series]), points)
    gradient = np.fft.irfft(np.concatenate([[0.0], 1j * k * series]), points)
    return values, gradient


def missed(axis: Axis, mass: float) -> float:
    """Strength of the peak at a jump of 1 that stands for its short waves; see MISSED."""
    return float(-2 * mass * MISSED / axis.k_max**3)


@dataclass(frozen=True)
class Shape:
    """One potential: value and slope at any place and time, and its sharp edges where it has any."""

    value: Field
    slope: Field
    breaks: Breaks | None = None
    moves: bool = False  # value depends on t by itself (a formula of t)

    @classmethod
    def sharp(cls, breaks: Breaks) -> Shape:
        return cls(lambda x, t: breaks.value(x), lambda x, t: breaks.slope(x), breaks)


@dataclass(frozen=True)
class Term:
    """A shape in time: in_time(t) * shape(x - path(t))."""

    shape: Shape
    in_time: Callable[[float], float] | None = None
    path: Callable[[float], float] | None = None

    @property
    def moves(self) -> bool:
        """True where the values on the grid change by more than a factor."""
        return self.shape.moves or self.path is not None

    def strength(self, t: float) -> float:
        return 1.0 if self.in_time is None else self.in_time(t)

    def shift(self, t: float) -> float:
        return 0.0 if self.path is None else self.path(t)

    def sampled(self, axis: Axis, t: float) -> tuple[Array, Array]:
        """Values and gradient at the points of `axis`, without the factor in_time and what it does to peaks."""
        if self.shape.breaks is not None:
            return self.shape.breaks.moved(self.shift(t)).sampled(axis)
        x = axis.x - self.shift(t)
        return np.broadcast_to(self.shape.value(x, t), x.shape), np.broadcast_to(self.shape.slope(x, t), x.shape)


@dataclass(frozen=True)
class Landscape:
    """The sum of all terms as it is meant, for plots and for F = m a."""

    terms: tuple[Term, ...] = ()

    def value(self, x: Array, t: float) -> Array:
        total = np.zeros(np.shape(x))
        for term in self.terms:
            total = total + term.strength(t) * term.shape.value(x - term.shift(t), t)
        return total

    def slope(self, x: Array, t: float) -> Array:
        """dV/dx off the edges."""
        total = np.zeros(np.shape(x))
        for term in self.terms:
            total = total + term.strength(t) * term.shape.slope(x - term.shift(t), t)
        return total

    def sampled(self, axis: Axis, t: float, mass: float) -> Array:
        """Values at the points of `axis` as the propagation of a particle of `mass` sees them at time t."""
        total, edges = np.zeros(axis.points), []
        for term in self.terms:
            if term.shape.breaks is None:
                total = total + term.strength(t) * term.sampled(axis, t)[0]
            else:
                edges.append(term.shape.breaks.moved(term.shift(t)).scaled(term.strength(t)))
        if edges:
            total = total + Breaks.summed(edges, ONE_EDGE * axis.length).resolved(axis, mass).sampled(axis)[0]
        return total

    def edges(self, t: float) -> tuple[Array, Array]:
        """Places and heights of all jumps in value at time t, in rising order of place."""
        places, heights = [np.empty(0)], [np.empty(0)]
        for term in self.terms:
            if term.shape.breaks is not None:
                places.append(term.shape.breaks.positions + term.shift(t))
                heights.append(term.shape.breaks.jumps * term.strength(t))
        where, height = np.concatenate(places), np.concatenate(heights)
        order = np.argsort(where, kind="stable")
        order = order[height[order] != 0]
        return where[order], height[order]

    @cached_property
    def depends_on_time(self) -> bool:
        return any(term.moves or term.in_time is not None for term in self.terms)
