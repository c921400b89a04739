"""Potentials written by the user: a table or a formula."""

from __future__ import annotations

from typing import Annotated, Any

import numpy as np
from pydantic import ConfigDict, Field, model_validator

from ..models import FormulaText, Model, NamedQuantity, unit_of
from ..reading.quantities import Units
from ..shapes import Shape
from ..tabulated import TablePath
from ..time_shapes import in_file_units
from .base import Potential, Setting

Array = np.ndarray


class Columns(Model):
    """Units of a table's columns."""

    x: Annotated[str | None, unit_of("length")] = Field(None, description="unit of the first column", examples=["nm"])
    value: Annotated[str | None, unit_of("energy")] = Field(
        None, description="unit of the second column", examples=["meV"]
    )

    def scales(self, units: Units) -> tuple[float, float]:
        """What the columns are multiplied by to be in scaled units."""
        return _scale(self.x, "length", units), _scale(self.value, "energy", units)


def _scale(unit: str | None, dimension: str, units: Units) -> float:
    return units.scale(dimension) if unit is None else units.read(f"1 {unit}", dimension)


class Table(Potential):
    """A smooth curve (cubic spline) through the two columns of a file: x and energy."""

    file: TablePath = Field(description="path of the table, relative to this file")
    columns: Columns = Field(
        default_factory=lambda: Columns(), description="units of the columns; left out: the file's units"
    )

    def shape(self, setting: Setting) -> Shape:
        curve = self.file.curve(*self.columns.scales(setting.units))
        return Shape(lambda x, t: np.asarray(curve.value(x)), lambda x, t: np.asarray(curve.slope(x)))

    def misfit(self, setting: Setting, low: float, high: float) -> tuple[str, str] | None:
        at = self.file.rows[:, 0] * self.columns.scales(setting.units)[0]
        if at[0] > low or at[-1] < high:
            first, last = (setting.units.rounded(float(end), "length") for end in (at[0], at[-1]))
            return f"the table covers {first} to {last}, less than the grid", "extend the table or shrink the grid"
        return None


class FormulaPotential(Potential):
    """`value` as written, of x, t and any named parameters, all in the file's units."""

    model_config = ConfigDict(extra="allow")
    __pydantic_extra__: dict[str, NamedQuantity]
    value: str = Field(
        description="the formula, for example `V0*exp(-(x/w)**2)` with V0 and w beside it",
        examples=["80*exp(-(x/5)**2)"],
    )

    @model_validator(mode="before")
    @classmethod
    def _named(cls, value: Any) -> Any:
        FormulaText.parameters(value, ("x", "t"))
        return value

    @model_validator(mode="after")
    def _parsed(self) -> FormulaPotential:
        FormulaText.parsed(self.value, frozenset({"x", "t", *(self.__pydantic_extra__ or {})}))
        return self

    def shape(self, setting: Setting) -> Shape:
        units = setting.units
        parameters = in_file_units(self.__pydantic_extra__ or {}, units)
        formula = FormulaText.parsed(self.value, frozenset({"x", "t", *parameters}))
        length, energy, clock = units.scale("length"), units.scale("energy"), units.scale("time")

        def at(x: Array, t: float) -> dict[str, Array | float]:
            return {**parameters, "x": np.asarray(x) / length, "t": t / clock}

        def value(x: Array, t: float) -> Array:
            return np.broadcast_to(np.asarray(formula(at(x, t))) * energy, np.shape(x))

        def slope(x: Array, t: float) -> Array:
            derivative = formula.with_slope(at(x, t), "x")[1]
            return np.broadcast_to(np.asarray(derivative) * energy / length, np.shape(x))

        return Shape(value, slope, moves="t" in formula.used)
