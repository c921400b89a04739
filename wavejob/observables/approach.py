"""How a packet comes in: from where the potential is flat, with which amplitude at each energy."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property

import numpy as np

from ..grid import Axis
from .base import Bench

Array = np.ndarray

FLAT = 1e-5  # of the mean kinetic energy: a potential that changes by less is flat
ASTRAY = 1e-6  # probability of the initial state that may stand where it should not
BACK = 1e-9  # probability left behind the back of a packet: 6 standard deviations of a Gaussian
SMALLEST_WEIGHT = 1e-8  # of the largest: less is not told from rounding and tails


@dataclass(frozen=True)
class Incoming:
    """What comes in at some energies, each array of shape (energies,); nan where nothing can.

    amplitude  phi(k) = (2 pi)^(-1/2) integral of psi e^(-ikx), k the wave number at the start
    away       the same at -k: what moves away from the detector
    stray      largest share of phi(k) that does not start in the flat region between the two detectors
    centre     -d arg(phi) / dk, the mean place at this wave number
    """

    k: Array
    amplitude: Array
    away: Array
    stray: Array
    centre: Array


@dataclass(frozen=True)
class Approach:
    """The initial state psi (points,) on its way to a detector at `x`."""

    bench: Bench
    psi: Array
    x: float

    @property
    def axis(self) -> Axis:
        return self.bench.axis

    @cached_property
    def density(self) -> Array:
        """Probability of each grid point."""
        return np.asarray(np.abs(self.psi) ** 2 * self.axis.spacing)

    @cached_property
    def start(self) -> float:
        """The mean place."""
        return float(self.density @ self.axis.x)

    @property
    def forward(self) -> float:
        """1 where the packet must move towards +x to reach the detector, -1 towards -x."""
        return 1.0 if self.x > self.start else -1.0

    @cached_property
    def potential(self) -> Array:
        return self.bench.landscape.value(self.axis.x, self.bench.start)

    @cached_property
    def level(self) -> float:
        """The potential where the packet starts."""
        return float(self.bench.landscape.value(np.array([self.start]), self.bench.start)[0])

    @cached_property
    def uneven(self) -> Array:
        """Where the potential is not that of the start: bool, (points,)."""
        return np.asarray(np.abs(self.potential - self.level) > FLAT * self._kinetic)

    @cached_property
    def _momenta(self) -> tuple[Array, Array]:
        """Wave numbers towards the detector, and the probability of each."""
        k = 2 * np.pi * np.fft.fftfreq(self.axis.points, self.axis.spacing)
        weight = np.abs(np.fft.fft(self.psi)) ** 2
        return self.forward * k, weight / weight.sum()

    @property
    def _kinetic(self) -> float:
        k, weight = self._momenta
        return float(weight @ k**2) / (2 * self.bench.mass)

    @cached_property
    def ahead(self) -> Array:
        """Signed distance of the grid points from the start, positive towards the detector."""
        return np.asarray(self.forward * (self.axis.x - self.start))

    @cached_property
    def span(self) -> tuple[float, float]:
        """Between which places nothing is absorbed."""
        low, high = self.axis.low, self.axis.high
        for layer in self.bench.hamiltonian.layers:
            depth = layer.rate.size * self.axis.spacing
            if layer.first == 0:
                low += depth
            else:
                high -= depth
        return low, high

    @cached_property
    def behind(self) -> float:
        """Where the reflected flux is measured: half-way between the packet's back and the layer or end."""
        order = np.argsort(self.ahead)
        back = float(self.ahead[order][np.searchsorted(np.cumsum(self.density[order]), BACK)])
        low, high = self.span
        end = self.forward * ((low if self.forward > 0 else high) - self.start)
        return self.start + self.forward * max((back + end) / 2, end + 2 * self.axis.spacing)

    @property
    def beyond(self) -> float:
        """Where what comes back from the far layer or end is measured: just before it."""
        low, high = self.span
        return high - 2 * self.axis.spacing if self.forward > 0 else low + 2 * self.axis.spacing

    def written(self, value: float, dimension: str = "length") -> str:
        """A quantity as a user would write it."""
        return self.bench.units.rounded(float(value), dimension)

    def relative_weight(self, energies: Array) -> Array:
        """abs(phi(k))^2 at each energy over its largest value; 0 below the potential of the start."""
        return self.weight_of(self.incoming(energies))

    def weight_of(self, incoming: Incoming) -> Array:
        k, weight = self._momenta
        densest = weight[k > 0].max() * self.axis.length / (2 * np.pi)
        return np.asarray(np.nan_to_num(np.abs(incoming.amplitude) ** 2) / densest)

    def incoming(self, energies: Array) -> Incoming:
        """What comes in at each energy, on the file's scale of energy."""
        kinetic = np.asarray(energies, dtype=float) - self.level
        k = np.sqrt(2 * self.bench.mass * np.where(kinetic > 0, kinetic, np.nan))
        held = np.abs(self.psi) > 1e-17 * np.abs(self.psi).max()
        x, psi = self.axis.x[held], self.psi[held] * self.axis.spacing / np.sqrt(2 * np.pi)
        outside = np.where(self.uneven | (self.ahead < self.forward * (self.behind - self.start)), 1.0, 0.0)
        outside[self.forward * (self.axis.x - self.x) > 0] = 1.0
        parts = np.stack([psi, psi * outside[held], psi * (x - self.start)], axis=1)
        waves = np.exp(-1j * self.forward * np.outer(k, x))
        towards, astray, placed = (waves @ parts).T
        with np.errstate(divide="ignore", invalid="ignore"):
            return Incoming(
                k=k,
                amplitude=towards,
                away=waves.conj() @ psi,
                stray=np.abs(astray / towards),
                centre=self.start + (placed / towards).real,
            )

    def held(self) -> tuple[float, float] | None:
        """The lowest and the highest energy of which there is enough; None where nothing comes this way."""
        k, weight = self._momenta
        enough = (k > 0) & (weight > SMALLEST_WEIGHT * weight[k > 0].max()) & (weight > 1e-20)
        if weight[k > 0].sum() < SMALLEST_WEIGHT or not enough.any():
            return None
        kinetic = k[enough] ** 2 / (2 * self.bench.mass)
        return self.level + float(kinetic.min()), self.level + float(kinetic.max())
