"""Absorbing layers at one kick: by how much they damp, and the exact account of what they take."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np

from ..hamiltonian import Hamiltonian, Layer

Array = np.ndarray


@dataclass(frozen=True)
class Tally:
    """The running account of one absorbing layer at one kick, exact to rounding.

    A kick takes |psi_j|^2 (1 - |factor_j|^2) cell at each point j of the layer. The loop adds up the
    squares; `settle` applies the rest, before the factor changes and whenever the loop pauses.
    """

    layer: Layer
    where: tuple[Any, ...]  # the layer's points, as the last indices of an array on the grid
    rate: Array  # of the layer, broadcasting over the grid, as is its slope
    slope: Array
    share: Array  # cell times this layer's part of what is lost at each point (layers cross in corners)
    amplitude: Array  # live real view of psi there: the last axis is doubled
    squared: Array  # work array of that shape
    seen: Array  # sum of amplitude^2 since the last settling

    def note(self) -> None:
        """Take note of psi before the kick."""
        np.multiply(self.amplitude, self.amplitude, self.squared)
        np.add(self.seen, self.squared, self.seen)

    def settle(self, survival: Array, absorbed: dict[str, Array]) -> None:
        """Book what was taken by kicks that left the fraction `survival` of |psi|^2 in the layer."""
        taken = (self.share * (1 - survival)).repeat(2, axis=-1)
        np.multiply(self.seen, taken, self.seen)
        absorbed[self.layer.name] += np.add.reduce(self.seen.reshape(len(self.seen), -1), axis=1)
        self.seen.fill(0)

    def damping(self, share: float) -> Array:
        """exp(-i share (-i rate)), on the layer's points."""
        damping: Array = np.exp(-share * self.rate)
        return damping

    def bent_damping(self, share: float, per_mass: float, slope: Array) -> Array:
        """The same with what the squared gradient of V - i rate adds to the rate.

        per_mass  coefficient of the squared gradient over the mass of the layer's axis
        slope     V' along that axis, on the layer's points

        -per_mass (V' - i rate')^2 = -per_mass V'^2 + per_mass rate'^2 + 2 i per_mass V' rate'. Where the last
        term would turn the layer into a source, it absorbs nothing instead: the modulus never exceeds 1.
        """
        rate = slope * (-2 * per_mass * self.slope)
        np.add(rate, self.rate, rate)
        np.maximum(rate, 0, out=rate)
        np.multiply(rate, -share, rate)
        return np.exp(rate, rate)


def tallies(hamiltonian: Hamiltonian, psi: Array) -> list[Tally]:
    """One account for each layer, on the live array `psi`, shape (runs, channels, *grid)."""
    grid = hamiltonian.grid
    reals = psi.view(psi.real.dtype)
    total = np.zeros(grid.shape)
    found = []
    for layer in hamiltonian.layers:
        span = slice(layer.first, layer.first + len(layer.rate))
        where = tuple(span if axis == layer.axis else slice(None) for axis in range(len(grid.axes)))
        total[where] += grid.along(layer.axis, layer.rate)
        found.append((layer, where))
    result = []
    for layer, where in found:
        rate = grid.along(layer.axis, layer.rate)
        # where there is nothing to absorb, a squared gradient must not begin to
        slope = grid.along(layer.axis, np.where(layer.rate > 0, layer.slope, 0))
        there = total[where]
        share = np.divide(rate, there, out=np.zeros_like(there), where=there > 0) * grid.cell
        start, stop, _ = where[-1].indices(grid.shape[-1])
        doubled: tuple[Any, ...] = (..., *where[:-1], slice(2 * start, 2 * stop))
        amplitude = reals[doubled]
        squared, seen = np.empty_like(amplitude, order="C"), np.zeros(amplitude.shape)
        result.append(Tally(layer, (..., *where), rate, slope, share, amplitude, squared, seen))
    return result
