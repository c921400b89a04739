"""Potential factors: what one kick multiplies the state by, and what its absorbing layers take."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

from ..hamiltonian import Hamiltonian, Layer, Part

Array = np.ndarray
Fetch = Callable[[Part, float], Array]


@dataclass(frozen=True)
class Tally:
    """The running account of one absorbing layer at one kick, exact to rounding.

    A kick takes |psi_j|^2 (1 - |factor_j|^2) cell at each point j of the layer. The loop adds up the
    squares; `settle` applies the rest, before the factor changes and whenever the loop pauses.
    """

    layer: Layer
    where: tuple[slice, ...]  # of the layer in (runs, channels, *grid)
    amplitude: Array  # live real view of psi there: the last axis is doubled
    squared: Array  # work array of that shape
    seen: Array  # sum of amplitude^2 since the last settling
    share: Array  # cell times this layer's part of what is lost at each point (layers cross in corners)

    def settle(self, survival: Array, absorbed: dict[str, Array]) -> None:
        """Book what was taken by kicks that left the fraction `survival` of |psi|^2 in the layer."""
        squares = self.seen.reshape(*self.seen.shape[:-1], -1, 2).sum(-1)
        taken = squares * (self.share * (1 - survival))
        absorbed[self.layer.name] += taken.reshape(len(taken), -1).sum(-1)
        self.seen[...] = 0


class Total:
    """sum over parts of f(t) W; what does not depend on time is added up once."""

    def __init__(self, parts: list[Part], fetch: Fetch, start: float, shape: tuple[int, ...]) -> None:
        self._fetch = fetch
        self._fixed = np.zeros(shape)
        self._timed: list[tuple[Part, Array]] = []
        for part in parts:
            if part.depends_on_time:
                self._timed.append((part, fetch(part, start)))
            else:
                self._fixed = self._fixed + fetch(part, start)

    @property
    def arrays(self) -> list[Array]:
        return [self._fixed, *(table for _, table in self._timed)]

    def at(self, t: float) -> Array:
        total = self._fixed
        for part, table in self._timed:
            total = total + part.factor(t) * (self._fetch(part, t) if part.moves else table)
        return total


class Factor:
    """exp(-i share (V - i rates - squeeze sum over axes (dV/dx_a - i drate/dx_a)^2 / m_a)) for one kick.

    share     weight of the kick times the step
    squeeze   coefficient of its squared gradient times the step squared
    table     the factor, complex, broadcasting against psi; with coupled channels the unitary matrix of
              each point, broadcasting against (runs, channels, channels, *grid)
    tallies   one for each absorbing layer

    No factor ever exceeds modulus 1: where the squared gradient would turn a layer into a source, it
    absorbs nothing instead.
    """

    def __init__(
        self, hamiltonian: Hamiltonian, share: float, squeeze: float, psi: Array, start: float
    ) -> None:
        self._share, self._squeeze, self._psi = share, squeeze, psi
        self._masses = hamiltonian.masses
        parts = [part for part in hamiltonian.parts if part.representation == "position"]
        diagonal = [part for part in parts if not part.couples]
        coupling = [part for part in parts if part.couples]
        point = (1, 1, *hamiltonian.grid.shape)
        self._values = Total(diagonal, lambda part, t: part.values(t), start, point)
        self._slopes = [
            Total(diagonal, _slope_along(a), start, point) for a in range(len(self._masses)) if squeeze
        ]
        self._coupling = Total(coupling, lambda part, t: part.values(t), start, (1, *point))
        self._couples = bool(coupling)
        self._timed = [part for part in parts if part.depends_on_time]
        self._moves = any(part.moves for part in self._timed)
        self.tallies = _tallies(hamiltonian, psi)
        self.scales: tuple[float, ...] = ()
        self.table = np.empty(0)
        self._set(start)
        self.products = np.empty_like(psi, shape=np.broadcast_shapes(psi[:, None].shape, self.table.shape))

    def refresh(self, t: float, absorbed: dict[str, Array]) -> None:
        """Make `table` that of time `t`; does nothing where no f(t) has changed."""
        scales = self._scales_at(t)
        if scales != self.scales:
            self.settle(absorbed)
            self._set(t)

    def settle(self, absorbed: dict[str, Array]) -> None:
        """Add to `absorbed` (name -> (runs,)) what the kicks since the last call have taken."""
        for tally in self.tallies:
            tally.settle(self._survival(tally), absorbed)

    def apply(self) -> None:
        """Multiply psi by the factor, and keep the layers' accounts."""
        for tally in self.tallies:
            np.multiply(tally.amplitude, tally.amplitude, tally.squared)
            np.add(tally.seen, tally.squared, tally.seen)
        if self._couples:
            np.multiply(self.table, self._psi[:, None], self.products)
            np.add.reduce(self.products, axis=2, out=self._psi)
        else:
            np.multiply(self._psi, self.table, self._psi)

    def _scales_at(self, t: float) -> tuple[float, ...]:
        """What the factor depends on at time t: equal scales, equal factor."""
        if self._moves:
            return (t,)
        return tuple(part.factor(t) for part in self._timed)

    def _set(self, t: float) -> None:
        self.scales = self._scales_at(t)
        energy = self._values.at(t)
        slopes = [slope.at(t) for slope in self._slopes]
        for slope, mass in zip(slopes, self._masses, strict=False):
            energy = energy - self._squeeze / mass * slope**2
        if self._couples:
            table = _matrix_exponential(energy, self._coupling.at(t), self._share)
        else:
            table = np.exp(-1j * self._share * energy)
        for tally in self.tallies:
            table[..., *tally.where[2:]] *= self._decay(tally, slopes)
        self.table = table.astype(self._psi.dtype)

    def _decay(self, tally: Tally, slopes: list[Array]) -> Array:
        """The layer's own factor on its points, of modulus 1 or less."""
        layer, ndim = tally.layer, self._psi.ndim - 2
        shape = [-1 if axis == layer.axis else 1 for axis in range(ndim)]
        rate, drop = layer.rate.reshape(shape), layer.slope.reshape(shape)
        energy = np.zeros(1)
        if slopes:
            per_mass = self._squeeze / self._masses[layer.axis]
            energy = per_mass * drop**2
            rate = np.where(rate > 0, rate - 2 * per_mass * slopes[layer.axis][tally.where] * drop, 0)
        decay: Array = np.exp(-self._share * (np.maximum(rate, 0) + 1j * energy))
        return decay

    def _survival(self, tally: Tally) -> Array:
        """|factor|^2 on the layer's points; one column of the matrix has it where channels couple."""
        there = self.table[..., *tally.where[2:]]
        if self._couples:
            there = there[:, :, 0]
            return (there.real.astype(float) ** 2 + there.imag.astype(float) ** 2).sum(1, keepdims=True)
        return there.real.astype(float) ** 2 + there.imag.astype(float) ** 2


def _slope_along(axis: int) -> Fetch:
    def slope(part: Part, t: float) -> Array:
        if part.gradient is None:  # refused by `plan` long before
            raise TypeError("a part without a gradient")
        return part.gradient(t)[axis]

    return slope


def _tallies(hamiltonian: Hamiltonian, psi: Array) -> list[Tally]:
    grid = hamiltonian.grid
    total = np.zeros(grid.shape)
    wheres = []
    for layer in hamiltonian.layers:
        span = slice(layer.first, layer.first + len(layer.rate))
        where = tuple(span if axis == layer.axis else slice(None) for axis in range(len(grid.axes)))
        wheres.append(where)
        total[where] += _along(layer.axis, layer.rate, total.ndim)
    tallies = []
    reals = psi.view(psi.real.dtype)
    for layer, where in zip(hamiltonian.layers, wheres, strict=True):
        rate = _along(layer.axis, layer.rate, total.ndim)
        there = total[where]
        share = np.divide(rate, there, out=np.zeros_like(there), where=there > 0) * grid.cell
        last = where[-1]
        doubled = last if last.start is None else slice(2 * last.start, 2 * last.stop)
        amplitude = reals[:, :, *where[:-1], doubled]
        tallies.append(
            Tally(
                layer,
                (slice(None), slice(None), *where),
                amplitude,
                np.empty(amplitude.shape, amplitude.dtype),
                np.zeros(amplitude.shape),
                share,
            )
        )
    return tallies


def _along(axis: int, values: Array, ndim: int) -> Array:
    return values.reshape([-1 if index == axis else 1 for index in range(ndim)])


def _matrix_exponential(diagonal: Array, coupling: Array, share: float) -> Array:
    """exp(-i share H) of the Hermitian channel matrix of each point, shape (runs, channels, channels, *grid)."""
    channels = coupling.shape[1]
    matrix = coupling + diagonal[:, :, None] * np.eye(channels).reshape(
        1, channels, channels, *(1,) * (diagonal.ndim - 2)
    )
    if channels == 2:
        return _two_by_two(matrix, share)
    inward = np.moveaxis(matrix, (1, 2), (-2, -1))
    energies, states = np.linalg.eigh(inward)
    turned = (states * np.exp(-1j * share * energies)[..., None, :]) @ states.conj().swapaxes(-1, -2)
    return np.moveaxis(turned, (-2, -1), (1, 2))


def _two_by_two(matrix: Array, share: float) -> Array:
    """Rabi's closed form: with H = mean + D and D^2 = w^2, exp(-i s H) = exp(-i s mean)(cos sw - i D sin(sw) / w)."""
    upper, lower = matrix[:, 0, 0].real, matrix[:, 1, 1].real
    mean, half = (upper + lower) / 2, (upper - lower) / 2
    angle = share * np.hypot(half, np.abs(matrix[:, 0, 1]))
    turn = -1j * share * np.sinc(angle / np.pi)
    table = np.empty(matrix.shape, complex)
    table[:, 0, 0] = np.cos(angle) + turn * half
    table[:, 1, 1] = np.cos(angle) - turn * half
    table[:, 0, 1] = turn * matrix[:, 0, 1]
    table[:, 1, 0] = turn * matrix[:, 1, 0]
    table *= np.exp(-1j * share * mean)[:, None, None]
    return table
