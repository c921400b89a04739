"""What a run that ends early leaves out of its Fourier integrals over time."""

from __future__ import annotations

import numpy as np

from .base import Bench

Array = np.ndarray

FINENESS = 20.0  # cells per radian of the fastest wave: its wave number is then right to 1e-4
LARGEST = 2**17  # cells
WITHIN_CELL = 16  # places over which the potential of a cell is averaged, so that edges stay where they are
NOTHING = 1e-14  # probability left that is not worth following


class Remainder:
    """The integral from the end of the run to infinity of psi(x, t) e^(iEt), t from the start of the run.

    It is i (E - H)^(-1) psi(end) e^(iE(end - start)): one tridiagonal system an energy, absorbing layers
    included, with outgoing waves at both ends. Second order in the cells, so good to about a per cent: it
    serves error bars.
    """

    def __init__(self, bench: Bench, psi: Array, t: float, highest: float) -> None:
        """The state psi (points,) at time t is followed at energies up to `highest`."""
        from scipy.interpolate import make_interp_spline

        axis = bench.axis
        self.empty = float(np.sum(np.abs(psi) ** 2) * axis.spacing) < NOTHING
        self.mass, self.duration = bench.mass, t - bench.start
        deepest = float(bench.landscape.value(axis.x, t).min())
        fastest = np.sqrt(2 * bench.mass * max(highest - deepest, 1e-300))
        cells = int(np.clip(FINENESS * fastest * axis.length, 4 * axis.points, LARGEST))
        self.h = axis.length / cells
        self.x = axis.low + (np.arange(cells) + 0.5) * self.h
        if self.empty:
            return
        inside = (np.arange(WITHIN_CELL) + 0.5) / WITHIN_CELL - 0.5
        taken = np.zeros(axis.points)
        for layer in bench.hamiltonian.layers:
            taken[layer.first : layer.first + layer.rate.size] = layer.rate
        averaged = np.mean([bench.landscape.value(self.x + s * self.h, t) for s in inside], axis=0)
        self.potential = averaged - 1j * np.interp(self.x, axis.x, taken)
        self.source = 1j * make_interp_spline(axis.x, psi, k=5)(self.x)

    def at(self, energies: Array, places: tuple[float, ...]) -> Array:
        """Its psi, psi' and t psi at each place, complex, (places, 3, energies); 0 at energies that are nan.

        The integral of t psi is the derivative by iE of that of psi.
        """
        found = np.zeros((len(places), 3, len(energies)), complex)
        if not self.empty:
            for index in np.flatnonzero(np.isfinite(energies)):
                found[:, :, index] = self._one(float(energies[index]), places)
        return found

    def _one(self, energy: float, places: tuple[float, ...]) -> Array:
        from scipy.linalg import solve_banded

        hop = 1 / (2 * self.mass * self.h**2)
        matrix = np.empty((3, self.x.size), complex)
        matrix[0], matrix[2] = hop, hop
        matrix[1] = energy - self.potential - 2 * hop
        for end in (0, -1):
            turn = 1 - (energy - self.potential[end]) / (2 * hop)
            matrix[1, end] += hop * _outgoing(turn)
        field = solve_banded((1, 1), matrix, self.source)
        late = solve_banded((1, 1), matrix, 1j * field)
        phase = np.exp(1j * energy * self.duration)
        rows = []
        for place in places:
            value, slope = self._near(field, place)
            rows.append([value, slope, self.duration * value + self._near(late, place)[0]])
        return np.asarray(np.array(rows) * phase)

    def _near(self, field: Array, place: float) -> tuple[complex, complex]:
        """Value and slope by the parabola through the three nearest cells."""
        middle = int(np.clip(round((place - self.x[0]) / self.h), 1, self.x.size - 2))
        before, here, after = field[middle - 1 : middle + 2]
        away = (place - self.x[middle]) / self.h
        first, second = (after - before) / 2, after - 2 * here + before
        return here + away * first + away**2 / 2 * second, (first + away * second) / self.h


def _outgoing(turn: complex) -> complex:
    """e^(iqh) of the wave that leaves, or dies away, where cos(qh) = `turn`."""
    root = complex(np.sqrt(turn**2 - 1 + 0j))
    first, second = turn + root, turn - root
    if abs(abs(first) - abs(second)) < 1e-12:  # both run on for ever: the one that moves outwards
        return first if first.imag > 0 else second
    return first if abs(first) < abs(second) else second
