"""A term of the potential as it stands in a job file: one kind, and how it changes in time."""

from __future__ import annotations

from typing import Annotated

from pydantic import Field

from ..models import Choice, Item, Model, Name
from ..shapes import Term
from ..time_shapes import FACTORS, PATHS
from .base import Potential, Setting
from .sharp import Barrier, Bias, Stack, Step, Well
from .smooth import (
    Eckart,
    ElectricFieldPotential,
    Gaussian,
    Gravity,
    Harmonic,
    Lattice,
    Linear,
    Morse,
    Polynomial,
    Sech2,
    SoftCoulomb,
)
from .written import FormulaPotential, Table

POTENTIALS: dict[str, type[Potential]] = {
    "step": Step,
    "barrier": Barrier,
    "well": Well,
    "stack": Stack,
    "gaussian": Gaussian,
    "harmonic": Harmonic,
    "linear": Linear,
    "field": ElectricFieldPotential,
    "bias": Bias,
    "gravity": Gravity,
    "morse": Morse,
    "eckart": Eckart,
    "sech2": Sech2,
    "polynomial": Polynomial,
    "lattice": Lattice,
    "soft_coulomb": SoftCoulomb,
    "table": Table,
    "formula": FormulaPotential,
}


class Paths(Model):
    """How a term moves, by axis."""

    x: Annotated[Item, Choice(PATHS, "path")] = Field(description="displacement along x as a function of time")


class TermItem(Item):
    """What may stand beside the kind of a potential term."""

    name: Name | None = Field(None, description="name of the term, for `based_on`")
    in_time: Annotated[Item, Choice(FACTORS, "function of time")] | None = Field(
        None, description="a function of time that multiplies the term"
    )
    path: Paths | None = Field(None, description="a function of time that moves the term")

    def term(self, setting: Setting) -> Term:
        """The term in scaled units."""
        shape = self.body.shape(setting)
        factor = self.in_time.body.function(setting.units, "number") if self.in_time else None
        path = self.path.x.body.function(setting.units, "length") if self.path else None
        return Term(shape, factor, path)
