"""What every packet is: parameters that can be read, and a field on the grid.

To add a kind: write the class with `field`, and with `extent` and `widest_wavenumber` where they are known
beforehand, add one line to item.py and one job in jobs/.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from ..grid import Axis
from ..models import Model
from ..potentials.base import Setting
from ..reading.quantities import Units
from ..shapes import Landscape

Array = np.ndarray


@dataclass(frozen=True)
class Surroundings:
    """What a packet may depend on beside its own parameters and the grid."""

    setting: Setting
    landscape: Landscape  # the job's potential
    start: float  # time of the initial state

    @property
    def mass(self) -> float:
        return self.setting.mass

    @property
    def units(self) -> Units:
        return self.setting.units


class PacketError(ValueError):
    """A packet that cannot be set down: what is wrong, and the cure."""

    def __init__(self, message: str, fix: str = "") -> None:
        self.message, self.fix = message, fix
        super().__init__(message, fix)


class Packet(Model):
    """One kind of initial state, on one axis."""

    def field(self, axis: Axis, surroundings: Surroundings) -> Array:
        """psi at the points of `axis`, complex, shape (points,), normalised to 1. Raises PacketError."""
        raise NotImplementedError

    def extent(self) -> tuple[float, float] | None:
        """Between which places it must have room; None where only the field tells."""
        return None

    def check(self, mass: float) -> None:
        """Raises PacketError where there is nothing to normalise."""

    def widest_wavenumber(self, mass: float) -> float | None:
        """The largest wave number it holds; None where only the field tells."""
        return None


def normalised(psi: Array, axis: Axis) -> Array:
    """psi scaled to the norm 1."""
    return np.asarray(psi / np.sqrt(np.sum(np.abs(psi) ** 2) * axis.spacing))


def waves(x: Array, at: float, sigma: float, k: float) -> Array:
    """A Gaussian packet with standard deviation `sigma` of |psi|^2 and mean wave number `k`."""
    return np.asarray((2 * np.pi * sigma**2) ** -0.25 * np.exp(-(((x - at) / (2 * sigma)) ** 2) + 1j * k * (x - at)))
