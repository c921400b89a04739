"""Absorbing layers at the ends of an axis: the term -i W(x) with W >= 0, tuned to what must be absorbed.

The shape is the transmission-free absorber of D. E. Manolopoulos, J. Chem. Phys. 117, 9552 (2002):
W = E_min y(z), E_min = k_min^2 / 2 mass, z = c s / pole with s the way into the layer and

    y(z) = a z - b z^3 + 4 / (c - z)^2 - 4 / (c + z)^2,   pole = c / (2 delta k_min).

Its strength grows without bound towards `pole`. A grid cannot follow that, so the pole lies a `gap` behind
the end of the axis, where the local wave number is a fixed part of the largest that the points hold.
For a given depth one parameter is left, `delta`, and `tuned` chooses it.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, replace
from functools import cached_property
from typing import Literal

import numpy as np

from .grid import Axis
from .hamiltonian import Layer

Array = np.ndarray
Side = Literal["low", "high"]

C = math.gamma(0.25) ** 2 / (2 * math.sqrt(2 * math.pi))  # lemniscate constant, 2.622057554
A = 1 - 16 / C**3
B = (1 - 17 / C**3) / C**2
PUBLISHED_DELTA = 0.2
LARGEST_WAVE_NUMBER = 0.9  # of k_max, reached in the layer at the end of the axis
DELTAS = np.geomspace(0.02, 2.0, 25)  # searched by `tuned`
SAFETY = 2.0  # runs were seen to send back up to 1.1 times what is predicted, and down to a quarter
FEWEST_CELLS = 6
LONGEST = 600.0  # depth times mean wave number, about 100 wavelengths, at which `recommended_depth` gives up
BINS = 64  # wave numbers that stand for a momentum distribution


@dataclass(frozen=True)
class Momenta:
    """What a layer must absorb: outward wave numbers > 0 and their weights, whose sum is at most 1."""

    k: Array
    weight: Array

    @classmethod
    def of_density(cls, k: Array, weight: Array, side: Side | None = None) -> Momenta:
        """From the probability `weight` at each signed wave number `k`.

        With `side` only what moves towards that end counts, without it both directions do (what a
        potential may turn back). Neighbours are joined to at most 64 wave numbers; what is rarer than
        1e-12 of the most frequent is left out.
        """
        outward = np.abs(k) if side is None else k if side == "high" else -k
        kept = (outward > 0) & (weight > 1e-12 * weight.max(initial=0.0))
        if not kept.any():
            return cls(np.empty(0), np.empty(0))
        outward, weight = outward[kept], weight[kept]
        bounds = np.geomspace(outward.min(), outward.max(), BINS + 1)[1:-1]
        bins = np.searchsorted(bounds, outward)
        total = np.bincount(bins, weight, BINS)
        moment = np.bincount(bins, weight * outward, BINS)
        filled = total > 0
        return cls(moment[filled] / total[filled], total[filled])

    @classmethod
    def of_energies(cls, low: float, high: float, mass: float) -> Momenta:
        """The same weight at every kinetic energy from `low` to `high`, both > 0."""
        energies = np.linspace(low, high, BINS)
        return cls(np.sqrt(2 * mass * energies), np.full(BINS, 1 / BINS))


@dataclass(frozen=True)
class LayerShape:
    """W(s) of one layer of `depth`; `reflected` is the predicted probability it sends back, weighted."""

    depth: float
    delta: float
    gap: float
    mass: float
    reflected: float = math.nan

    @classmethod
    def on_grid(cls, depth: float, delta: float, mass: float, spacing: float) -> LayerShape:
        """With the gap that a grid of `spacing` needs: sqrt(2 mass W) is 1 / (delta gap) near the pole."""
        return cls(depth, delta, float(_gap(np.array(delta), spacing)), mass)

    @property
    def pole(self) -> float:
        return self.depth + self.gap

    @cached_property
    def k_min(self) -> float:
        """Wave number of E_min; at delta = 0.2 the layer reflects less than 1 % of what is faster."""
        return C / (2 * self.delta * self.pole)

    def rate(self, s: Array) -> Array:
        """W at distance `s` into the layer, 0 before it; energy, or 1 / time with hbar = 1."""
        z = np.clip(s, 0, self.depth) * C / self.pole
        return np.asarray(_squared(self.k_min, z) / (2 * self.mass))

    def integral(self, s: Array) -> Array:
        """Integral of W from the start of the layer to distance `s` into it."""
        z = np.clip(s, 0, self.depth) * C / self.pole
        total = A * z**2 / 2 - B * z**4 / 4 + 4 / (C - z) + 4 / (C + z) - 8 / C
        return np.asarray(self.k_min**2 / (2 * self.mass) * self.pole / C * total)

    def slope(self, s: Array) -> Array:
        """dW/ds at distance `s` into the layer."""
        z = np.clip(s, 0, self.depth) * C / self.pole
        rise = A - 3 * B * z**2 + 8 / (C - z) ** 3 + 8 / (C + z) ** 3
        scale = self.k_min**2 / (2 * self.mass) * C / self.pole
        return np.where(np.asarray(s) > 0, scale * rise, 0.0)


def _gap(delta: Array, spacing: float) -> Array:
    return np.asarray(spacing / (math.pi * delta * LARGEST_WAVE_NUMBER))


def _squared(k_min: Array | float, z: Array) -> Array:
    """k_min^2 y(z) = 2 mass W."""
    return np.asarray(k_min**2 * (A * z - B * z**3 + 4 / (C - z) ** 2 - 4 / (C + z) ** 2))


def reflection(shape: LayerShape, k: Array) -> Array:
    """Probability that a plane wave of wave number `k` > 0 survives the layer, shape of `k`.

    Behind the layer is a wall or, where an axis wraps, its mirror image: what comes back and what passes
    both layers is the mean over an odd and an even wave, and this mean is used for both. The layer is cut
    into cells of constant W, the amplitude is carried outward from the end and extrapolated from two cell
    sizes. Relative error below 1e-3 down to 1e-10.
    """
    k = np.asarray(k, dtype=float)
    delta, gap, cells = np.array(shape.delta), np.array(shape.gap), _cells(shape.depth, k)
    coarse, fine = (_amplitudes(delta, shape.depth, gap, k, n) for n in (cells, 2 * cells))
    return _survives((4 * fine - coarse) / 3)


def _survives(amplitudes: Array) -> Array:
    return np.asarray((np.abs(amplitudes) ** 2).mean(0))


def _cells(depth: float, k: Array) -> int:
    """Cells of less than a fifth of a radian for the fastest wave, where that costs little."""
    return int(np.clip(5 * depth * k.max(initial=0.0), 150, 1000))


def _amplitudes(delta: Array, depth: float, gap: Array, k: Array, cells: int) -> Array:
    """Amplitudes sent back for odd and even waves, shape (2, ...); `delta`, `gap` and `k` broadcast."""
    pole = depth + gap
    shape = np.broadcast_shapes(delta.shape, k.shape)
    s = ((np.arange(cells) + 0.5) * depth / cells).reshape(-1, *[1] * len(shape))
    inside = np.sqrt(k**2 + 1j * _squared(C / (2 * delta * pole), s * C / pole))
    before = np.concatenate([np.broadcast_to(k, (1, *shape)), inside[:-1]])
    step = (before - inside) / (before + inside)
    there_and_back = np.exp(2j * inside * depth / cells)
    amplitude = np.stack([np.full(shape, -1.0 + 0j), np.full(shape, 1.0 + 0j)])
    for j in range(cells - 1, -1, -1):
        carried = amplitude * there_and_back[j]
        amplitude = (step[j] + carried) / (1 + step[j] * carried)
    return amplitude


def tuned(depth: float, mass: float, momenta: Momenta, spacing: float) -> LayerShape:
    """The layer of at most `depth` that sends back least of `momenta` on a grid of `spacing`, and how much.

    It covers whole cells: W starts with a kink, and half-way between two points the aliases of a kink
    subtract (alternating sum over wave numbers, Poisson's formula), elsewhere they add. Slow wave
    numbers count in full: nothing absorbs a wave much longer than the layer.
    """
    depth = max(1, math.floor(depth / spacing + 1e-6)) * spacing
    if not momenta.k.size:
        return replace(LayerShape.on_grid(depth, PUBLISHED_DELTA, mass, spacing), reflected=0.0)
    cells = _cells(depth, momenta.k)
    deltas, best = DELTAS, 0
    for finer in (False, True):
        if finer:
            deltas = np.geomspace(deltas[max(best - 1, 0)], deltas[min(best + 1, len(deltas) - 1)], 9)
        gaps = _gap(deltas, spacing)[:, None]
        survives = _survives(_amplitudes(deltas[:, None], depth, gaps, momenta.k, cells))
        best = int(np.argmin(survives @ momenta.weight))
    shape = LayerShape.on_grid(depth, float(deltas[best]), mass, spacing)
    return replace(shape, reflected=float(reflection(shape, momenta.k) @ momenta.weight))


def recommended_depth(mass: float, momenta: Momenta, spacing: float, limit: float = 1e-5) -> float:
    """The smallest depth, in whole cells, predicted to send back at most half of `limit` once tuned.

    `math.inf` where none does, because too much of `momenta` is too slow.
    """
    if not momenta.k.size:
        return FEWEST_CELLS * spacing
    mean = float(momenta.k @ momenta.weight / momenta.weight.sum())

    def enough(cells: int) -> bool:
        return tuned(cells * spacing, mass, momenta, spacing).reflected <= limit / SAFETY

    short, cells = 0, max(FEWEST_CELLS, math.ceil(2 / (mean * spacing)))
    while not enough(cells):
        short, cells = cells, math.ceil(1.4 * cells)
        if cells * spacing * mean > LONGEST:
            return math.inf
    while short and cells - short > max(1, cells // 32):
        middle = (short + cells) // 2
        short, cells = (short, middle) if enough(middle) else (middle, cells)
    return cells * spacing


def layer(index: int, axis: Axis, shape: LayerShape, side: Side) -> Layer:
    """`shape` at one end of `axis`, which is axis `index` of the grid; W rises towards that end."""
    into = axis.x - (axis.high - shape.depth) if side == "high" else axis.low + shape.depth - axis.x
    inside = np.flatnonzero(into > 0)
    slope = shape.slope(into[inside]) * (1 if side == "high" else -1)
    return Layer(f"{axis.name}.{side}", index, int(inside[0]), shape.rate(into[inside]), slope)
