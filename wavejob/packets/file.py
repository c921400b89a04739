"""A packet read from a file: a text table, or the final state of an earlier run."""

from __future__ import annotations

from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Any

import numpy as np
from pydantic import Field, ValidationInfo, WithJsonSchema
from pydantic.functional_validators import BeforeValidator

from ..grid import Axis
from ..models import LARGEST, Reader, reader_of, refuse
from ..reading.quantities import QuantityError, Units
from ..tabulated import FEWEST_ROWS, TableError, digest, named_file, read_columns
from .base import Array, Packet, Surroundings, normalised


@dataclass(frozen=True)
class StoredField:
    """A field as stored: places in `unit` (None: the job file's), complex values, a digest of the file."""

    written: str
    x: Array
    psi: Array
    unit: str | None
    digest: str

    @classmethod
    def read(cls, written: Any, info: ValidationInfo) -> StoredField:
        if isinstance(written, StoredField):
            return written
        path = named_file(written, info)
        if path.suffix == ".nc":
            x, psi, unit = _final_state(path, str(written))
            _known_unit(unit, reader_of(info))
        else:
            try:
                rows = read_columns(path, str(written), 3)
            except TableError as error:
                raise refuse(error.message, error.fix) from None
            x, psi, unit = rows[:, 0], rows[:, 1] + 1j * rows[:, 2], None
        if np.any(np.diff(x) <= 0):
            raise refuse(f"the places in `{written}` do not rise", "sort the rows and drop doubled ones")
        if not (np.all(np.isfinite(x)) and np.all(np.abs(psi) < LARGEST)):
            raise refuse(f"the field in `{written}` is not finite everywhere", "every value must be finite")
        if not np.any(np.abs(psi) > 1 / LARGEST):
            raise refuse(f"the field in `{written}` is 0 everywhere", "store a field with some probability")
        return cls(str(written), x, psi, unit, digest(path))


def _known_unit(unit: str, reader: Reader) -> None:
    """Refuses a unit of stored places that the job file's units do not go with."""
    try:
        reader.units.read(f"1 {unit}".strip(), "length")
    except QuantityError as error:
        raise refuse(f"the stored places are in `{unit}`: {error.message}", error.fix) from None


def _final_state(path: Path, written: str) -> tuple[Array, Array, str]:
    """x, psi and the unit of x of the last stored time of a fields.nc with one axis."""
    import h5py

    try:
        with h5py.File(path, "r") as file:
            x, psi = file["x"], file["psi"]
            fits = x.ndim == 1 and psi.ndim in (2, 3) and psi.shape[-2:] == (x.size, 2) and x.size >= FEWEST_ROWS
            last = np.asarray((psi[-1] if psi.ndim == 3 else psi) if fits else [[0.0, 0.0]], dtype=float)
            unit = x.attrs.get("units", "")
            places = np.asarray(x, dtype=float)
    except (OSError, LookupError, AttributeError, TypeError, ValueError, RuntimeError):
        raise refuse(
            f"`{written}` is no fields file with `psi` on an axis `x`", "name the fields.nc of a finished run"
        ) from None
    if not fits:
        raise refuse(f"`{written}` does not hold a field on one axis", "name the fields.nc of a run with one axis")
    return places, last[:, 0] + 1j * last[:, 1], unit.decode() if isinstance(unit, bytes) else str(unit)


StoredPath = Annotated[StoredField, BeforeValidator(StoredField.read), WithJsonSchema({"type": "string"})]


class FilePacket(Packet):
    """A stored field: columns x, real, imaginary of a text table, or the final state in a `fields.nc`."""

    path: StoredPath = Field(description="path of the file, relative to this one")

    def places(self, units: Units) -> Array:
        """The stored places in scaled units."""
        scale = units.read(f"1 {self.path.unit}", "length") if self.path.unit else units.scale("length")
        return self.path.x * scale

    def field(self, axis: Axis, surroundings: Surroundings) -> Array:
        from scipy.interpolate import CubicSpline

        x = self.places(surroundings.units)
        psi = CubicSpline(x, self.path.psi)(axis.x)
        psi[(axis.x < x[0] - axis.spacing) | (axis.x > x[-1] + axis.spacing)] = 0
        return normalised(psi, axis)
