"""What every potential is: parameters that can be read, and a shape that can be asked.

To add a kind: write the class with its parameters as fields and `shape`, add one line to kinds.py, and one job
in jobs/ that uses it. Sharp kinds return `Shape.sharp(...)`; smooth ones give value and slope as functions of x.
"""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

from ..models import Model
from ..reading.quantities import Units
from ..shapes import Shape

Toward = Literal["+x", "-x"]


@dataclass(frozen=True)
class Setting:
    """What a potential may depend on beside its own parameters."""

    mass: float  # scaled units
    charge: float  # in units of e
    units: Units  # the file's units, for formulas and tables


class Potential(Model):
    """One kind of potential."""

    def shape(self, setting: Setting) -> Shape:
        """Value and slope as functions of x and t in scaled units."""
        raise NotImplementedError

    def detail(self) -> tuple[str, float] | None:
        """The key and the size of the finest detail, which must not be finer than a grid's spacing."""
        return None

    def misfit(self, setting: Setting, low: float, high: float) -> tuple[str, str] | None:
        """What is wrong with this potential on an axis from `low` to `high`, and the cure."""
        return None


def sign(toward: Toward) -> float:
    return 1.0 if toward == "+x" else -1.0
