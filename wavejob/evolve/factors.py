"""Potential factors: what one kick multiplies the state by. `factor` picks the kind that suits."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from ..hamiltonian import Hamiltonian, Part
from .channels import matrix_exponential
from .layers import tallies
from .phases import Circle, Lines

Array = np.ndarray
Fetch = Callable[[Part, float], Array]


def factor(hamiltonian: Hamiltonian, share: float, squeeze: float, psi: Array, start: float) -> Factor:
    """exp(-i share [V - i rates - squeeze sum over axes (d(V - i rates)/dx_a)^2 / m_a]) of one kick.

    share    weight of the kick times the step
    squeeze  coefficient of its squared gradient times the step squared
    psi      the live state that it multiplies, shape (runs, channels, *grid)
    """
    arguments = (hamiltonian, share, squeeze, psi, start)
    if hamiltonian.couples:
        return MatrixFactor(*arguments)
    if not hamiltonian.depends_on_time:
        return StaticFactor(*arguments)
    timed = [part for part in hamiltonian.parts if part.depends_on_time]
    if not squeeze and not any(part.moves for part in timed):
        lines = Lines.of([part.values(start) for part in timed], hamiltonian.grid.shape)
        if lines is not None:
            return SeparableFactor(*arguments, lines)
    return PhaseFactor(*arguments)


class Factor:
    """The factor of one kick, kept in `table`, and the accounts of the absorbing layers at this kick."""

    table: Array  # complex, broadcasting against psi

    def __init__(self, hamiltonian: Hamiltonian, share: float, squeeze: float, psi: Array, start: float) -> None:
        self._hamiltonian, self._share, self._squeeze, self._psi = hamiltonian, share, squeeze, psi
        self._timed = [part for part in hamiltonian.parts if part.depends_on_time]
        self._moves = any(part.moves for part in self._timed)
        self._scales = self._scales_at(start)
        self.tallies = tallies(hamiltonian, psi)
        self._damping = [tally.damping(share) for tally in self.tallies]

    def refresh(self, t: float, absorbed: dict[str, Array]) -> None:
        """Make `table` that of time `t`; nothing to do where no f(t) has changed."""
        scales = self._scales_at(t)
        if scales != self._scales:
            if self._squeeze:  # then the damping depends on time too
                self.settle(absorbed)
            self._set(t)
            self._scales = scales

    def apply(self) -> None:
        """Multiply psi by the factor, and note what the layers take."""
        for tally in self.tallies:
            tally.note()
        np.multiply(self._psi, self.table, self._psi)

    def settle(self, absorbed: dict[str, Array]) -> None:
        """Add to `absorbed` (layer name -> (runs,)) what the kicks since the last call have taken."""
        for tally in self.tallies:
            tally.settle(self._survival(self.table[tally.where]), absorbed)

    def _survival(self, there: Array) -> Array:
        """The fraction of |psi|^2 that the factor `there` leaves."""
        survival: Array = there.real.astype(float) ** 2 + there.imag.astype(float) ** 2
        return survival

    def _scales_at(self, t: float) -> tuple[float, ...]:
        """All that the factor depends on at time t: equal scales, equal factor."""
        return (t,) if self._moves else tuple(part.factor(t) for part in self._timed)

    def _set(self, t: float) -> None:
        """Write the factor of time `t` to `table`."""
        raise NotImplementedError

    def _stiffen(self, energy: Array) -> None:
        """Add what the layers' own squared slopes do to the energy: -squeeze (-i rate')^2 / m."""
        for tally in self.tallies:
            energy[tally.where] += self._squeeze / self._hamiltonian.masses[tally.layer.axis] * tally.slope**2

    def _damp(self, slopes: list[Array]) -> None:
        """Let the layers damp `table`; `slopes` holds dV/dx_a where there is a squared gradient."""
        for tally, damping in zip(self.tallies, self._damping, strict=True):
            if slopes:
                axis = tally.layer.axis
                per_mass = self._squeeze / self._hamiltonian.masses[axis]
                damping = tally.bent_damping(self._share, per_mass, slopes[axis][tally.where])
            self.table[tally.where] *= damping


class StaticFactor(Factor):
    """Nothing depends on time."""

    def __init__(self, hamiltonian: Hamiltonian, share: float, squeeze: float, psi: Array, start: float) -> None:
        super().__init__(hamiltonian, share, squeeze, psi, start)
        values, slopes = _totals(hamiltonian, squeeze, start)
        energy = values.fixed
        self._stiffen(energy)
        for slope, mass in zip(slopes, hamiltonian.masses, strict=False):
            energy = energy - squeeze / mass * slope.fixed**2
        self.table = np.exp(-1j * share * energy).astype(psi.dtype)
        self._damp([slope.fixed for slope in slopes])


class SeparableFactor(Factor):
    """What depends on time is a sum of functions of one coordinate each: its factor is a product of lines."""

    def __init__(
        self,
        hamiltonian: Hamiltonian,
        share: float,
        squeeze: float,
        psi: Array,
        start: float,
        lines: Lines,
    ) -> None:
        super().__init__(hamiltonian, share, squeeze, psi, start)
        values, _ = _totals(hamiltonian, 0.0, start)
        self._lines = lines
        self.table = np.empty(np.broadcast_shapes(values.shape, lines.shape), psi.dtype)
        self.table[...] = np.exp(-1j * share * values.fixed)
        self._damp([])
        self._fixed = self.table.copy()
        self._set(start)

    def _set(self, t: float) -> None:
        scales = np.array([-self._share * part.factor(t) for part in self._timed])
        self._lines.multiply(self._fixed, scales, self.table)


class PhaseFactor(Factor):
    """Anything else without coupled channels: the potential is summed and its phase taken anew."""

    def __init__(self, hamiltonian: Hamiltonian, share: float, squeeze: float, psi: Array, start: float) -> None:
        super().__init__(hamiltonian, share, squeeze, psi, start)
        self._values, self._slopes = _totals(hamiltonian, squeeze, start)
        self._stiffen(self._values.fixed)
        self.table = np.empty(self._values.shape, psi.dtype)
        self._circle = Circle(self._values.shape)
        self._slope_work = [np.empty(self._values.shape) for _ in self._slopes]
        self._square = np.empty(self._values.shape) if self._slopes else np.empty(0)
        self._set(start)

    def _set(self, t: float) -> None:
        half, square = self._circle.half, self._square
        self._values.into(half, t)
        for total, slope, mass in zip(self._slopes, self._slope_work, self._hamiltonian.masses, strict=False):
            total.into(slope, t)
            np.multiply(slope, slope, square)
            np.multiply(square, self._squeeze / mass, square)
            np.subtract(half, square, half)
        np.multiply(half, -self._share / 2, half)
        self._circle.into(self.table)
        self._damp(self._slope_work)


class MatrixFactor(Factor):
    """Coupled channels: `table` holds a matrix for each point, (runs, channels, channels, *grid)."""

    def __init__(self, hamiltonian: Hamiltonian, share: float, squeeze: float, psi: Array, start: float) -> None:
        super().__init__(hamiltonian, share, squeeze, psi, start)
        parts = [part for part in hamiltonian.parts if part.couples]
        channels = psi.shape[1]
        self._values, _ = _totals(hamiltonian, 0.0, start)
        self._coupling = Total(parts, _values, start, (1, channels, channels, *hamiltonian.grid.shape))
        self._set(start)
        self._products = np.empty((len(psi), *self.table.shape[1:]), psi.dtype)

    def apply(self) -> None:
        for tally in self.tallies:
            tally.note()
        np.multiply(self.table, self._psi[:, None], self._products)
        np.add.reduce(self._products, axis=2, out=self._psi)

    def _survival(self, there: Array) -> Array:
        """Each column of a unitary matrix times the damping has the damping as its length."""
        survival: Array = super()._survival(there[:, :, 0]).sum(1, keepdims=True)
        return survival

    def _set(self, t: float) -> None:
        matrix = matrix_exponential(self._values.at(t), self._coupling.at(t), self._share)
        self.table = matrix.astype(self._psi.dtype)
        self._damp([])


class Total:
    """sum over parts of f(t) W; what does not depend on time is added up once, in `fixed`."""

    def __init__(self, parts: list[Part], fetch: Fetch, start: float, shape: tuple[int, ...]) -> None:
        self._fetch = fetch
        self.fixed = np.zeros(shape)
        self._timed: list[tuple[Part, Array, Array]] = []  # with its W at the start, and a work array
        for part in parts:
            values = fetch(part, start)
            if part.depends_on_time:
                self._timed.append((part, values, np.empty(values.shape)))
            else:
                self.fixed = self.fixed + values
        self.shape = np.broadcast_shapes(self.fixed.shape, *(values.shape for _, values, _ in self._timed))

    def at(self, t: float) -> Array:
        """The sum at time `t`."""
        total = self.fixed
        for part, values, _ in self._timed:
            total = total + part.factor(t) * (self._fetch(part, t) if part.moves else values)
        return total

    def into(self, out: Array, t: float) -> None:
        """Write the real sum at time `t` to `out`."""
        np.copyto(out, self.fixed)
        for part, values, scaled in self._timed:
            np.multiply(self._fetch(part, t) if part.moves else values, part.factor(t), scaled)
            np.add(out, scaled, out)


def _totals(hamiltonian: Hamiltonian, squeeze: float, start: float) -> tuple[Total, list[Total]]:
    """V of the parts that are diagonal in position and channel, and its slope along each axis if squeezed."""
    parts = [part for part in hamiltonian.parts if part.representation == "position" and not part.couples]
    shape = (1, 1, *hamiltonian.grid.shape)
    axes = range(len(hamiltonian.grid.axes)) if squeeze else ()
    slopes = [Total(parts, _slope_along(axis), start, shape) for axis in axes]
    return Total(parts, _values, start, shape), slopes


def _values(part: Part, t: float) -> Array:
    return part.values(t)


def _slope_along(axis: int) -> Fetch:
    def slope(part: Part, t: float) -> Array:
        if part.gradient is None:
            raise TypeError("a squared gradient of a part without gradient: `plan` refuses this")
        return part.gradient(t)[axis]

    return slope
