"""Packets at any time, to nine digits or more, by methods that share nothing with wavejob; m = hbar = 1.

`Layers`: stationary states of flat layers, added up with the packet's momenta. `Box`: a basis of sines between two
walls, all matrix elements by quadrature, every energy exact (P. M. Morse & H. Feshbach, Methods of Theoretical Physics,
1953, section 12.3, from memory, for both). test_formulas.py compares the two with each other and with closed forms.
"""

from __future__ import annotations

import itertools
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np

Array = np.ndarray


def nodes(low: float, high: float, breaks: Sequence[float] = (), panel: float = 0.5) -> tuple[Array, Array]:
    """Places and weights of Gauss's quadrature, 12 in each panel; panels end at the breaks."""
    cuts = [low, *sorted(b for b in breaks if low < b < high), high]
    unit, share = np.polynomial.legendre.leggauss(12)
    places, weights = [], []
    for start, stop in itertools.pairwise(cuts):
        count = int(np.ceil((stop - start) / panel))
        half = (stop - start) / count / 2
        middles = start + half * (2 * np.arange(count) + 1)
        places.append((middles[:, None] + half * unit).ravel())
        weights.append(np.tile(half * share, count))
    return np.concatenate(places), np.concatenate(weights)


@dataclass(frozen=True)
class Layers:
    """A Gaussian packet that comes from the left, where the potential is 0, to flat layers.

    `heights` has one entry more than `edges`: the potential right of each, the first one 0. Holds for packets that
    start clear of the first edge and hold no momenta to the left.
    """

    edges: tuple[float, ...]
    heights: tuple[float, ...]
    at: float
    sigma: float
    k: float

    def __post_init__(self) -> None:
        away = 4.2 / self.sigma  # 8.4 standard deviations
        low, high = max(self.k - away, 2e-3), self.k + away
        threshold = float(np.sqrt(2 * max(self.heights[-1], 0.0)))  # where the states depend on the root of k
        waves, weights = [], []
        for start, stop in ((low, min(threshold, high)), (max(threshold, low), high)):
            if start < stop:
                u, share = nodes(0.0, 1.0, panel=0.04 / (stop - start))
                toward = stop == threshold
                root = 1 - u if toward else u
                waves.append(stop - (stop - start) * root**2 if toward else start + (stop - start) * root**2)
                weights.append(share * 2 * root * (stop - start))
        object.__setattr__(self, "waves", np.concatenate(waves))
        object.__setattr__(self, "shares", np.concatenate(weights))

    def psi(self, x: Array, t: float) -> Array:
        """psi(x, t), shape (places,)."""
        k = self.waves  # type: ignore[attr-defined]
        weight = (
            self.shares
            * (2 * self.sigma**2 / np.pi) ** 0.25
            * np.exp(  # type: ignore[attr-defined]
                -((self.sigma * (k - self.k)) ** 2) - 1j * k * self.at - 0.5j * k**2 * t
            )
        )
        total = np.zeros(len(x), complex)
        layer = np.searchsorted(self.edges, x)
        for number, (q, forth, back) in enumerate(self._amplitudes(k)):
            here = np.flatnonzero(layer == number)
            for part in np.array_split(here, max(len(here) // 300, 1)):
                wave = np.exp(1j * np.outer(x[part], q))
                total[part] = wave @ (forth * weight) + (np.exp(-1j * np.outer(x[part], q)) @ (back * weight))
        return total / np.sqrt(2 * np.pi)

    def _amplitudes(self, k: Array) -> list[tuple[Array, Array, Array]]:
        """Wave number and both amplitudes in each layer, matched in value and slope from the right."""
        q = [np.sqrt(k**2 - 2 * height + 0j) for height in self.heights]
        found = [(q[-1], np.ones_like(q[-1]), np.zeros_like(q[-1]))]
        for edge, before in zip(self.edges[::-1], q[-2::-1], strict=True):
            after, forth, back = found[0]
            value = forth * np.exp(1j * after * edge) + back * np.exp(-1j * after * edge)
            slope = after / before * (forth * np.exp(1j * after * edge) - back * np.exp(-1j * after * edge))
            found.insert(
                0,
                (
                    before,
                    (value + slope) / 2 * np.exp(-1j * before * edge),
                    (value - slope) / 2 * np.exp(1j * before * edge),
                ),
            )
        incoming = found[0][1]
        return [(q, forth / incoming, back / incoming) for q, forth, back in found]

    def inside(self, low: float, high: float, t: float) -> float:
        """Probability between two places at time t."""
        x, weight = nodes(low, high, self.edges, panel=1.0)
        return float(weight @ np.abs(self.psi(x, t)) ** 2)


@dataclass(frozen=True)
class Box:
    """A Gaussian packet between walls at `low` and `high`, by `size` sines; `breaks` are edges of the potential."""

    potential: Callable[[Array], Array]
    low: float
    high: float
    at: float
    sigma: float
    k: float = 0.0
    size: int = 300
    breaks: tuple[float, ...] = ()
    mass: float = 1.0

    def __post_init__(self) -> None:
        length, n = self.high - self.low, np.arange(1, self.size + 1)
        x, weight = nodes(self.low, self.high, self.breaks, panel=4 * length / self.size)
        moments = np.cos(np.outer(np.arange(2 * self.size + 1), np.pi / length * (x - self.low))) @ (
            weight * self.potential(x) / length
        )
        matrix = moments[np.abs(np.subtract.outer(n, n))] - moments[np.add.outer(n, n)]
        energies, states = np.linalg.eigh(matrix + np.diag((np.pi * n / length) ** 2 / (2 * self.mass)))
        start = (2 * np.pi * self.sigma**2) ** -0.25 * np.exp(
            -(((x - self.at) / (2 * self.sigma)) ** 2) + 1j * self.k * (x - self.at)
        )
        object.__setattr__(self, "energies", energies)
        object.__setattr__(self, "states", states)
        object.__setattr__(self, "start", self._waves(x) @ (weight * start))

    def _waves(self, x: Array) -> Array:
        """The sines at x, shape (size, places)."""
        length = self.high - self.low
        return np.sqrt(2 / length) * np.sin(np.outer(np.arange(1, self.size + 1), np.pi / length * (x - self.low)))

    def amplitudes(self, t: float) -> Array:
        """Amplitudes of the sines at time t."""
        energies, states = self.energies, self.states  # type: ignore[attr-defined]
        return np.asarray(states @ (np.exp(-1j * energies * t) * (states.T @ self.start)))  # type: ignore[attr-defined]

    def inside(self, low: float, high: float, t: float) -> float:
        """Probability between two places at time t."""
        x, weight = nodes(low, high, self.breaks, panel=min(4 * (self.high - self.low) / self.size, 1.0))
        return float(weight @ np.abs(self.amplitudes(t) @ self._waves(x)) ** 2)

    def moments(self, t: float) -> tuple[float, float]:
        """Mean and standard deviation of position at time t."""
        x, weight = nodes(self.low, self.high, panel=4 * (self.high - self.low) / self.size)
        density = weight * np.abs(self.amplitudes(t) @ self._waves(x)) ** 2
        mean = float(density @ x)
        return mean, float(np.sqrt(density @ (x - mean) ** 2))

    def overlap(self, t: float) -> float:
        """abs(<psi(0), psi(t)>)^2."""
        return float(abs(np.vdot(self.start, self.amplitudes(t))) ** 2)  # type: ignore[attr-defined]
