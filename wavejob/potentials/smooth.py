"""Smooth potentials in closed form."""

from __future__ import annotations

import numpy as np
from pydantic import Field, model_validator

from ..models import (
    Acceleration,
    AngularFrequency,
    ElectricField,
    Energy,
    EnergyLength,
    Extent,
    Frequency,
    Length,
    Number,
    PositiveEnergy,
    Slope,
    Stiffness,
    refuse,
)
from ..shapes import Shape
from .base import Potential, Setting, Toward, sign

Array = np.ndarray


class Gaussian(Potential):
    """height exp(-(x - at)^2 / (2 sigma^2))."""

    at: Length = Field(description="place of the top")
    sigma: Extent = Field(description="standard deviation")
    height: Energy = Field(description="value at the top; negative for a dip")

    def detail(self) -> tuple[str, float]:
        return "sigma", self.sigma

    def shape(self, setting: Setting) -> Shape:
        def value(x: Array, t: float) -> Array:
            return np.asarray(self.height * np.exp(-(((x - self.at) / self.sigma) ** 2) / 2))

        return Shape(value, lambda x, t: -(x - self.at) / self.sigma**2 * value(x, t))


class Harmonic(Potential):
    """mass omega^2 (x - at)^2 / 2."""

    at: Length = Field(description="place of the bottom")
    omega: AngularFrequency | None = Field(None, description="radians per time")
    frequency: Frequency | None = Field(None, description="cycles per time")
    stiffness: Stiffness | None = Field(None, description="mass omega^2")

    @model_validator(mode="after")
    def _one(self) -> Harmonic:
        given = [value for value in (self.omega, self.frequency, self.stiffness) if value is not None]
        if len(given) != 1:
            said = f"a harmonic well has {len(given) or 'none'} of `omega`, `frequency` and `stiffness`"
            raise refuse(said, "write exactly one of them")
        if self.frequency is not None and self.frequency <= 0:
            raise refuse("must be greater than 0", "", at="frequency")
        return self

    def shape(self, setting: Setting) -> Shape:
        if self.stiffness is not None:
            stiffness = self.stiffness
        else:
            omega = self.omega if self.omega is not None else 2 * np.pi * (self.frequency or 0.0)
            stiffness = setting.mass * omega**2
        return Shape(lambda x, t: stiffness * (x - self.at) ** 2 / 2, lambda x, t: stiffness * (x - self.at))


def straight(at: float, slope: float) -> Shape:
    """slope (x - at)."""
    return Shape(lambda x, t: slope * (x - at), lambda x, t: np.full(np.shape(x), slope))


class Linear(Potential):
    """slope (x - at)."""

    at: Length = Field(description="where the value is 0")
    slope: Slope = Field(description="energy per length")

    def shape(self, setting: Setting) -> Shape:
        return straight(self.at, self.slope)


class ElectricFieldPotential(Potential):
    """-charge E x along `toward`, the direction of E."""

    strength: ElectricField = Field(description="field strength")
    toward: Toward = Field(description="direction of E")

    def shape(self, setting: Setting) -> Shape:
        return straight(0.0, -setting.charge * self.strength * sign(self.toward))

    def misfit(self, setting: Setting, low: float, high: float) -> tuple[str, str] | None:
        if setting.charge == 0:
            return "an electric field does nothing to a particle of charge 0", "state `charge:` under `particle:`"
        return None


class Gravity(Potential):
    """-mass g x along `toward`, the direction things fall."""

    strength: Acceleration = Field(description="acceleration, for example 9.80665 m/s^2")
    toward: Toward = Field(description="direction of the fall")

    def shape(self, setting: Setting) -> Shape:
        return straight(0.0, -setting.mass * self.strength * sign(self.toward))


class Morse(Potential):
    """depth (1 - exp(-(x - at) / range))^2 (Morse 1929)."""

    at: Length = Field(description="place of the bottom")
    depth: PositiveEnergy = Field(description="energy of the dissociated limit above the bottom")
    reach: Extent = Field(alias="range", description="length over which the bond weakens", examples=["50 nm"])

    def detail(self) -> tuple[str, float]:
        return "range", self.reach

    def shape(self, setting: Setting) -> Shape:
        def decay(x: Array) -> Array:
            return np.asarray(np.exp(-(x - self.at) / self.reach))

        return Shape(
            lambda x, t: self.depth * (1 - decay(x)) ** 2,
            lambda x, t: 2 * self.depth / self.reach * (1 - decay(x)) * decay(x),
        )


class Eckart(Potential):
    """A u / (1 + u) + B u / (1 + u)^2 with u = exp((x - at) / width) (Eckart 1930)."""

    at: Length = Field(description="place where u = 1")
    width: Extent = Field(description="length scale")
    A: Energy = Field(description="value far to the right")
    B: Energy = Field(description="sets the barrier; its top is (A + B)^2 / 4B where abs(A) < B")

    def detail(self) -> tuple[str, float]:
        return "width", self.width

    def shape(self, setting: Setting) -> Shape:
        def share(x: Array) -> Array:  # u / (1 + u), without overflow
            return np.asarray(0.5 * (1 + np.tanh((x - self.at) / (2 * self.width))))

        def slope(x: Array, t: float) -> Array:
            s = share(x)
            return np.asarray((self.A + self.B * (1 - 2 * s)) * s * (1 - s) / self.width)

        return Shape(lambda x, t: self.A * share(x) + self.B * share(x) * (1 - share(x)), slope)


def sech_squared(z: Array) -> Array:
    """1 / cosh^2 z, without overflow."""
    e = np.exp(-2 * np.abs(z))
    return np.asarray(4 * e / (1 + e) ** 2)


class Sech2(Potential):
    """height / cosh^2((x - at) / width)."""

    at: Length = Field(description="place of the top")
    width: Extent = Field(description="length scale")
    height: Energy = Field(description="value at the top; negative for a well")

    def detail(self) -> tuple[str, float]:
        return "width", self.width

    def shape(self, setting: Setting) -> Shape:
        def value(x: Array, t: float) -> Array:
            return self.height * sech_squared((x - self.at) / self.width)

        return Shape(value, lambda x, t: -2 / self.width * np.tanh((x - self.at) / self.width) * value(x, t))


class Polynomial(Potential):
    """Sum of c_n (x - at)^n."""

    at: Length = Field(description="where x - at is 0")
    coefficients: list[Number] = Field(
        description="c_0, c_1, ... in the file's units of energy per length^n",
        min_length=1,
        max_length=32,
        examples=[[0, 0, 0.4]],
    )

    def shape(self, setting: Setting) -> Shape:
        length, energy = setting.units.scale("length"), setting.units.scale("energy")
        curve = np.polynomial.Polynomial(
            [energy * c / length**n for n, c in enumerate(self.coefficients)], domain=[-1, 1], window=[-1, 1]
        )
        slope = curve.deriv()
        return Shape(lambda x, t: np.asarray(curve(x - self.at)), lambda x, t: np.asarray(slope(x - self.at)))


class Lattice(Potential):
    """depth sin^2(pi (x - at) / period)."""

    at: Length = Field(description="place of a minimum")
    period: Extent = Field(description="distance between minima")
    depth: Energy = Field(description="height of the maxima above the minima")

    def detail(self) -> tuple[str, float]:
        return "period", self.period / 2

    def shape(self, setting: Setting) -> Shape:
        turn = np.pi / self.period
        return Shape(
            lambda x, t: self.depth * np.sin(turn * (x - self.at)) ** 2,
            lambda x, t: self.depth * turn * np.sin(2 * turn * (x - self.at)),
        )


class SoftCoulomb(Potential):
    """strength / sqrt((x - at)^2 + softening^2)."""

    at: Length = Field(description="place of the centre")
    strength: EnergyLength = Field(description="negative where it attracts")
    softening: Extent = Field(description="keeps the centre finite")

    def detail(self) -> tuple[str, float]:
        return "softening", self.softening

    def shape(self, setting: Setting) -> Shape:
        def away(x: Array) -> Array:
            return np.asarray(np.hypot(x - self.at, self.softening))

        return Shape(lambda x, t: self.strength / away(x), lambda x, t: -self.strength * (x - self.at) / away(x) ** 3)
