"""The kinds of quantity in a job file: what they are called, made of, and may be given as."""

from __future__ import annotations

from dataclasses import dataclass
from typing import NamedTuple


class Powers(NamedTuple):
    """A dimension as powers of length, time, energy, hbar and charge."""

    length: int = 0
    time: int = 0
    energy: int = 0
    hbar: int = 0
    charge: int = 0


class Vector(NamedTuple):
    """A dimension as powers of the base units from which unit texts are built."""

    length: int = 0
    mass: int = 0
    time: int = 0
    charge: int = 0
    temperature: int = 0
    angle: int = 0
    cycle: int = 0


@dataclass(frozen=True)
class Dimension:
    """One kind of quantity.

    `words` and `example` serve messages. `accepts` names the kinds that may be given for it. `printed` is the
    unit of tables where that is not made from the file's units; bare numbers of such a kind are refused.
    """

    words: str
    example: str
    powers: Powers = Powers()  # noqa: RUF009  (immutable)
    accepts: tuple[str, ...] = ()
    printed: str = ""
    angle: int = 0
    cycle: int = 0
    kelvin: int = 0

    @property
    def vector(self) -> Vector:
        """The same in base units: energy is mass length^2 / time^2, hbar is energy times time."""
        length, time, energy, hbar, charge = self.powers
        mass = energy + hbar
        return Vector(length + 2 * mass, mass, time - 2 * energy - hbar, charge, self.kelvin, self.angle, self.cycle)


DIMENSIONS = {
    "number": Dimension("a plain number", "0.5"),
    "angle": Dimension("an angle", "0.5 rad", angle=1, accepts=("angle", "number")),
    "length": Dimension("a length", "5 nm", Powers(length=1)),
    "time": Dimension("a time", "5 fs", Powers(time=1)),
    "energy": Dimension("an energy", "5 meV", Powers(energy=1), ("energy", "wavenumber", "temperature")),
    "mass": Dimension("a mass", "0.067 electron_mass", Powers(length=-2, time=1, hbar=1), printed="electron_mass"),
    "charge": Dimension("a charge", "-1 e", Powers(charge=1), printed="e"),
    "wavenumber": Dimension("a wave number", "0.5 1/nm", Powers(length=-1), ("wavenumber", "angular_wavenumber")),
    "angular_wavenumber": Dimension("a wave number", "0.5 rad/nm", Powers(length=-1), angle=1),
    "momentum": Dimension("a momentum", "0.5 hbar/nm", Powers(length=-1, hbar=1)),
    "velocity": Dimension("a velocity", "0.1 nm/fs", Powers(length=1, time=-1)),
    "rate": Dimension("a rate", "0.1 1/fs", Powers(time=-1)),
    "frequency": Dimension("a frequency", "5 THz", Powers(time=-1), ("frequency", "rate"), cycle=1),
    "angular_frequency": Dimension(
        "an angular frequency", "0.03 rad/fs", Powers(time=-1), ("angular_frequency", "rate"), angle=1
    ),
    "acceleration": Dimension("an acceleration", "9.81 m/s^2", Powers(length=1, time=-2)),
    "electric_field": Dimension("an electric field", "2 V/um", Powers(length=-1, energy=1, charge=-1), printed="V/m"),
    "force": Dimension("a force", "1 meV/nm", Powers(length=-1, energy=1)),
    "slope": Dimension("an energy per length", "1 meV/nm", Powers(length=-1, energy=1), ("force",)),
    "stiffness": Dimension("an energy per squared length", "1 meV/nm^2", Powers(length=-2, energy=1)),
    "energy_length": Dimension("an energy times a length", "1 eV*nm", Powers(length=1, energy=1)),
    "flux": Dimension("a rate", "0.1 1/fs", Powers(time=-1), ("rate",)),
    "density": Dimension("a density", "0.1 1/nm", Powers(length=-1), ("wavenumber",)),
    "momentum_density": Dimension("a density over wave number", "5 nm", Powers(length=1), ("length",)),
    "temperature": Dimension("a temperature", "20 uK", kelvin=1),
}


def accepted(dimension: str) -> tuple[str, ...]:
    """The kinds of quantity that may stand for `dimension`."""
    return DIMENSIONS[dimension].accepts or (dimension,)


def kind_of(vector: Vector) -> str | None:
    """The kind of quantity that a unit of these base powers measures, the first of `DIMENSIONS` that fits."""
    return next((name for name, kind in DIMENSIONS.items() if kind.vector == vector), None)
