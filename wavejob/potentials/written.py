"""Potentials written by the user: a table or a formula."""

from __future__ import annotations

import numpy as np
from pydantic import ConfigDict, Field, model_validator

from ..models import FormulaText, Model, NamedQuantity, Quantity, refuse
from ..reading.quantities import QuantityError, Units
from ..shapes import Shape
from ..tabulated import TablePath
from ..time_shapes import in_file_units
from .base import Potential, Setting

Array = np.ndarray


class Columns(Model):
    """Units of a table's columns."""

    x: str | None = Field(None, description="unit of the first column")
    value: str | None = Field(None, description="unit of the second column")

    def scales(self, units: Units) -> tuple[float, float]:
        """What the columns are multiplied by to be in scaled units."""
        return _scale(self.x, "length", units), _scale(self.value, "energy", units)


def _scale(unit: str | None, dimension: str, units: Units) -> float:
    if unit is None:
        return units.scale(dimension)
    try:
        return units.read(f"1 {unit}", dimension)
    except QuantityError as error:
        raise refuse(error.message, error.fix) from None


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
            write = setting.units.write
            return (
                f"the table covers {write(float(at[0]), 'length')} to {write(float(at[-1]), 'length')}, "
                "less than the grid",
                "extend the table or shrink the grid",
            )
        return None


class FormulaPotential(Potential):
    """`value` as written, of x, t and any named parameters, all in the file's units."""

    model_config = ConfigDict(extra="allow")
    __pydantic_extra__: dict[str, NamedQuantity]
    value: str = Field(description="the formula, for example `V0*exp(-(x/w)**2)` with V0 and w beside it")

    @model_validator(mode="after")
    def _parsed(self) -> FormulaPotential:
        for name in self.__pydantic_extra__ or {}:
            if name in ("x", "y", "z", "t", "pi"):
                raise refuse(f"`{name}` cannot be a parameter of a formula", "it has a meaning of its own")
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

    def misfit(self, setting: Setting, low: float, high: float) -> tuple[str, str] | None:
        x = np.linspace(low, high, 2001)[1:-1]
        shape = self.shape(setting)
        for kind, values in (("", shape.value(x, 0.0)), ("the slope of ", shape.slope(x, 0.0))):
            bad = np.flatnonzero(~np.isfinite(values))
            if bad.size:
                place = setting.units.write(float(x[bad[0]]), "length")
                return f"{kind}the formula is not finite at x = {place}", "keep it finite over the whole grid"
        return None
