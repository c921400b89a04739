"""`in_time` and `path`: functions of time that multiply a potential or move it.

To add a kind: write the class with its parameters and `function`, and add one line to FACTORS and PATHS.
"""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, Generic, Literal, TypeVar

import numpy as np
from pydantic import ConfigDict, Field, model_validator

from .models import (
    Angle,
    Duration,
    FormulaText,
    Frequency,
    Length,
    Model,
    NamedQuantity,
    Number,
    Time,
    in_order,
    refuse,
)
from .reading.quantities import Named, Units
from .tabulated import TablePath

Amount = TypeVar("Amount")
Function = Callable[[float], float]


class TimeShape(Model):
    """A function of time; its amounts are numbers in `in_time` and lengths in `path`."""

    def function(self, units: Units, dimension: str) -> Function:
        """t -> value of `dimension`, both in scaled units."""
        raise NotImplementedError

    def span(self, units: Units) -> tuple[float, float]:
        """The times between which the shape is defined."""
        return -np.inf, np.inf

    def fastest(self, units: Units) -> float:
        """The shortest time over which the value changes appreciably; infinity where it never does."""
        return float("inf")


class Constant(TimeShape, Generic[Amount]):
    """The same value at all times."""

    value: Amount = Field(description="the value")

    def function(self, units: Units, dimension: str) -> Function:
        value: Any = self.value
        return lambda t: float(value)


class Ramp(TimeShape, Generic[Amount]):
    """From 0 before `start` to `by` after `stop`."""

    by: Amount | None = Field(None, description="the value reached; before the ramp it is 0")
    to: Amount | None = Field(None, description="another word for `by`")
    start: Time = Field(description="when the rise begins")
    stop: Time = Field(description="when it ends")
    shape: Literal["linear", "smooth"] = Field("linear", description="smooth: 6 s^5 - 15 s^4 + 10 s^3")

    @model_validator(mode="after")
    def _whole(self) -> Ramp[Amount]:
        if (self.by is None) == (self.to is None):
            raise refuse("a ramp needs either `by` or `to`", "write the value reached once")
        in_order(self, "start", "stop", ("start", "stop"))
        return self

    def function(self, units: Units, dimension: str) -> Function:
        end: Any = self.to if self.by is None else self.by
        smooth = self.shape == "smooth"

        def ramp(t: float) -> float:
            s = min(max((t - self.start) / (self.stop - self.start), 0.0), 1.0)
            return float(end) * (s**3 * (6 * s * s - 15 * s + 10) if smooth else s)

        return ramp

    def fastest(self, units: Units) -> float:
        return self.stop - self.start


class Pulse(TimeShape):
    """exp(-4 ln 2 (t - centre)^2 / fwhm^2) cos(2 pi frequency (t - centre) + phase)."""

    centre: Time = Field(description="middle of the pulse")
    fwhm: Duration = Field(description="full width at half maximum of this envelope, not of its square")
    frequency: Frequency | None = Field(None, description="carrier, in cycles per time; left out: the envelope alone")
    phase: Angle | None = Field(None, description="carrier phase at the centre; 0 if left out")

    @model_validator(mode="after")
    def _whole(self) -> Pulse:
        if self.frequency is None and self.phase is not None:
            raise refuse("`phase` needs a `frequency`", "give the carrier frequency or leave the phase out")
        return self

    def function(self, units: Units, dimension: str) -> Function:
        turning, phase = 2 * np.pi * (self.frequency or 0.0), self.phase or 0.0

        def pulse(t: float) -> float:
            s = t - self.centre
            return float(np.exp(-4 * np.log(2) * (s / self.fwhm) ** 2) * np.cos(turning * s + phase))

        return pulse

    def fastest(self, units: Units) -> float:
        return min(self.fwhm, 1 / abs(self.frequency) if self.frequency else np.inf)


class PathPulse(Pulse):
    """by exp(-4 ln 2 (t - centre)^2 / fwhm^2) cos(2 pi frequency (t - centre) + phase)."""

    by: Length = Field(description="distance moved at the top of the envelope")

    def function(self, units: Units, dimension: str) -> Function:
        pulse = super().function(units, dimension)
        return lambda t: self.by * pulse(t)


class Sine(TimeShape, Generic[Amount]):
    """offset + amplitude sin(2 pi frequency t + phase)."""

    amplitude: Amount = Field(description="largest departure from the offset")
    frequency: Frequency = Field(description="cycles per time")
    phase: Angle = Field(0.0, description="phase at t = 0")
    offset: Amount | None = Field(None, description="mean value; 0 if left out")

    def function(self, units: Units, dimension: str) -> Function:
        amplitude: Any = self.amplitude
        offset: Any = 0.0 if self.offset is None else self.offset
        turning = 2 * np.pi * self.frequency
        return lambda t: float(offset + amplitude * np.sin(turning * t + self.phase))

    def fastest(self, units: Units) -> float:
        return 1 / abs(self.frequency) if self.frequency else np.inf


class TimeTable(TimeShape):
    """A smooth curve through the two columns of a file: time and value, both in the job file's units."""

    file: TablePath = Field(description="path of the table, relative to this file")

    def function(self, units: Units, dimension: str) -> Function:
        curve = self.file.curve(units.scale("time"), units.scale(dimension))
        return lambda t: float(curve.value(t))

    def span(self, units: Units) -> tuple[float, float]:
        at = self.file.rows[:, 0] * units.scale("time")
        return float(at[0]), float(at[-1])

    def fastest(self, units: Units) -> float:
        return float(4 * np.diff(self.file.rows[:, 0]).min() * units.scale("time"))


class TimeFormula(TimeShape):
    """`value` as written, of t and any named parameters, all in the job file's units."""

    model_config = ConfigDict(extra="allow")
    __pydantic_extra__: dict[str, NamedQuantity]
    value: str = Field(description="the formula, for example `1 + a*sin(w*t)`", examples=["1 + 0.1*sin(0.02*t)"])

    @model_validator(mode="before")
    @classmethod
    def _named(cls, value: Any) -> Any:
        FormulaText.parameters(value, ("x", "t"))
        return value

    @model_validator(mode="after")
    def _parsed(self) -> TimeFormula:
        FormulaText.parsed(self.value, frozenset({"t", *(self.__pydantic_extra__ or {})}))
        return self

    def function(self, units: Units, dimension: str) -> Function:
        parameters = in_file_units(self.__pydantic_extra__ or {}, units)
        formula = FormulaText.parsed(self.value, frozenset({"t", *parameters}))
        scale, clock = units.scale(dimension), units.scale("time")
        return lambda t: float(formula({**parameters, "t": t / clock})) * scale


def in_file_units(parameters: Any, units: Units) -> dict[str, float]:
    """The named parameters of a formula as plain numbers in the file's units."""
    named: dict[str, Named] = dict(parameters)
    return {name: units.to_file(value.value, value.dimension) for name, value in named.items()}


FACTORS: dict[str, type[TimeShape]] = {
    "constant": Constant[Number],
    "ramp": Ramp[Number],
    "pulse": Pulse,
    "sine": Sine[Number],
    "table": TimeTable,
    "formula": TimeFormula,
}
PATHS: dict[str, type[TimeShape]] = {
    "constant": Constant[Length],
    "ramp": Ramp[Length],
    "pulse": PathPulse,
    "sine": Sine[Length],
    "table": TimeTable,
    "formula": TimeFormula,
}
