"""What outputs and observables see of a run when they are due."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass, field
from functools import cached_property
from typing import Any

import numpy as np

from .grid import Grid
from .hamiltonian import Hamiltonian

Array = np.ndarray


@dataclass(frozen=True)
class Look:
    """The state after step `n`, at time `t`. Derived quantities are computed once, when first asked for.

    psi       complex, shape (runs, channels, *grid), the live array: copy what you keep
    absorbed  layer name -> probability it took so far, shape (runs,), live too
    """

    n: int
    t: float
    psi: Array
    grid: Grid
    hamiltonian: Hamiltonian
    absorbed: Mapping[str, Array]
    to_amplitudes: Callable[[Array], Array]
    _kept: dict[str, Any] = field(default_factory=dict, repr=False, compare=False)

    def cached(self, name: str, make: Callable[[], Any]) -> Any:
        """What `make` gives, made once for this look: observables share costly quantities under a name."""
        if name not in self._kept:
            self._kept[name] = make()
        return self._kept[name]

    @cached_property
    def density(self) -> Array:
        """|psi|^2, shape (runs, channels, *grid), probability per volume."""
        return _square(self.psi)

    @cached_property
    def norm(self) -> Array:
        """Probability on the grid, shape (runs,)."""
        return self._per_run(self.density) * self.grid.cell

    @cached_property
    def amplitudes(self) -> Array:
        """Amplitude of each wave number `axis.k`, shape (runs, channels, *grid).

        sum |a|^2 = norm. Phases are those of a first grid point at 0 (see `evolve.transforms.Spectrum`).
        """
        return self.to_amplitudes(self.psi)

    @cached_property
    def momentum_density(self) -> Array:
        """|amplitudes|^2: the probability of each wave number; sums to the norm."""
        return _square(self.amplitudes)

    def _per_run(self, values: Array) -> Array:
        total: Array = values.reshape(len(values), -1).sum(-1, dtype=float)
        return total


def _square(field: Array) -> Array:
    square: Array = field.real**2 + field.imag**2
    return square
