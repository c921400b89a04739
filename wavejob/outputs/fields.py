"""fields.nc: the field itself, netCDF-4 that xarray, h5py and every other HDF5 reader open alike.

A complex field stands as real numbers with a last dimension `ri` of length 2, since no file format has one
complex number that all readers agree on: `psi = ds.psi[..., 0] + 1j * ds.psi[..., 1]`.
"""

from __future__ import annotations

import contextlib
import io
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any, Literal

import h5netcdf
import h5py
import numpy as np

from ..grid import Array, Axis, Grid
from ..version import __version__
from .files import atomic_path
from .log import utc
from .tables import Units

CONVENTIONS = "CF-1.11"
HOW_TO_READ = "psi = psi[..., 0] + 1j * psi[..., 1]; the sum of abs(psi)**2 times the cell is the norm"


@dataclass(frozen=True)
class DensityTable:
    """A probability density over time, on the grid or on the wave numbers of its axes.

    `times` has shape (rows,); `rows` yields one array a time, of shape (channels, *grid). For
    `momentum_density` the order along each axis is that of `Axis.k`; it is written in rising order.
    """

    name: Literal["density", "momentum_density"]
    times: Array
    rows: Iterable[Array]


def write_fields(
    path: Path,
    *,
    grid: Grid,
    times: Array,
    fields: Iterable[Array],
    units: Units,
    tables: Sequence[DensityTable] = (),
    channels: Sequence[str] = (),
    about: dict[str, str] | None = None,
) -> None:
    """Writes the field at `times` (rows,), one array of shape (channels, *grid) each, in scaled units.

    `fields` may be an iterator: one field at a time is held. complex64 is stored in single precision.
    The dimension `channel` exists only where there are several `channels`. `about` adds global
    attributes, such as the job id. Raises RunError where the file can't be written.
    """
    with (
        atomic_path(path) as temporary,
        temporary.open("w+b", buffering=0) as raw,
        _careful(raw) as disk,
        h5netcdf.File(disk, "w") as file,
    ):
        file.attrs.update(
            Conventions=CONVENTIONS,
            title="Wave packet of a wavejob run",
            source=f"wavejob {__version__}",
            history=f"{utc(datetime.now(UTC))} written by wavejob {__version__}",
            **(about or {}),
        )
        places = _Writer(file, grid, units, tuple(channels))
        places.field(times, fields)
        for table in tables:
            places.density(table)


@contextlib.contextmanager
def _careful(raw: io.FileIO) -> Iterator[_Disk]:
    """What HDF5 may write to; the first refusal of the system is raised at the end."""
    disk = _Disk(raw)
    try:
        yield disk
    except Exception as error:
        if disk.refusal:
            raise disk.refusal from error
        raise
    if disk.refusal:
        raise disk.refusal


class _Disk:
    """A file that keeps a failed write to itself: told of a full disk, HDF5 crashes the process."""

    def __init__(self, raw: io.FileIO) -> None:
        self.raw = raw
        self.refusal: OSError | None = None
        self.read, self.readinto = raw.read, raw.readinto
        self.seek, self.tell, self.flush = raw.seek, raw.tell, raw.flush

    def write(self, data: Any) -> int:
        rest = memoryview(data).cast("B")
        while rest and not self.refusal:
            try:
                rest = rest[self.raw.write(rest) :]
            except OSError as error:
                self.refusal = error
        return len(data)

    def truncate(self, size: int) -> int:
        try:
            return self.raw.truncate(size)
        except OSError as error:
            self.refusal = self.refusal or error
            return size


class _Writer:
    """Puts variables with their dimensions and coordinates into one open file."""

    def __init__(self, file: Any, grid: Grid, units: Units, channels: tuple[str, ...]) -> None:
        self.file, self.grid, self.units = file, grid, units
        self.channels = channels if len(channels) > 1 else ()
        if self.channels:
            file.dimensions["channel"] = len(channels)
            names = file.create_variable("channel", ("channel",), dtype=h5py.string_dtype())
            names[...] = np.array(channels, dtype=object)
        for axis in grid.axes:
            self._coordinate(axis.name, axis.x, "length", f"position along {axis.name}")

    def field(self, times: Array, fields: Iterable[Array]) -> None:
        """The variable `psi` with dimensions time, [channel], axes, ri."""
        self._coordinate("time", times, "time", "time")
        self.file.dimensions["ri"] = 2
        axes = [axis.name for axis in self.grid.axes]
        attributes = {"long_name": "wave function", "comment": HOW_TO_READ}
        power = len(axes) / 2
        pairs = (_pairs(field) for field in fields)
        self._rows("psi", ("time", *self._middle(axes), "ri"), pairs, "density", power, attributes)

    def density(self, table: DensityTable) -> None:
        """The variable of one density table, with its own time coordinate `time_<name>`."""
        time = f"time_{table.name}"
        self._coordinate(time, table.times, "time", f"time of {table.name}")
        if table.name == "density":
            axes, rows = [axis.name for axis in self.grid.axes], table.rows
            words = "probability density"
        else:
            orders = [np.argsort(axis.k) for axis in self.grid.axes]
            axes = [self._wave_numbers(axis) for axis in self.grid.axes]
            rows = (row[np.ix_(np.arange(len(row)), *orders)] for row in table.rows)
            words = "probability density of the wave number"
        dimensions = (time, *self._middle(axes))
        self._rows(table.name, dimensions, rows, table.name, len(axes), {"long_name": words})

    def _wave_numbers(self, axis: Axis) -> str:
        name = f"k{axis.name}" if len(self.grid.axes) > 1 else "k"
        self._coordinate(name, np.sort(axis.k), "wavenumber", f"wave number along {axis.name}")
        return name

    def _middle(self, axes: list[str]) -> list[str]:
        return ["channel", *axes] if self.channels else axes

    def _coordinate(self, name: str, values: Array, dimension: str, long_name: str) -> None:
        self.file.dimensions[name] = len(values)
        variable = self.file.create_variable(name, (name,), dtype="f8")
        variable[...] = self.units.to_file(np.asarray(values, dtype=float), dimension)
        variable.attrs.update(long_name=long_name, units=self.units.label(dimension) or "1")

    def _rows(
        self,
        name: str,
        dimensions: Sequence[str],
        rows: Iterable[Array],
        dimension: str,
        power: float,
        attributes: dict[str, str],
    ) -> None:
        """One variable, written row by row, in units of `dimension` to the given power."""
        scale = float(self.units.to_file(1.0, dimension)) ** power
        variable = None
        for index, row in enumerate(rows):
            values = np.asarray(row) * row.real.dtype.type(scale)
            if not self.channels:
                values = values[0]
            if variable is None:
                variable = self.file.create_variable(name, dimensions, dtype=values.dtype)
                variable.attrs.update(attributes, units=_power(self.units.label(dimension), power))
            variable[index] = values


def _pairs(field: Array) -> Array:
    """A complex array as real numbers with a last dimension of 2."""
    whole = np.ascontiguousarray(field)
    return whole.view(whole.real.dtype).reshape(*whole.shape, 2)


def _power(label: str, power: float) -> str:
    """A unit label such as `1/nm` to a power, as CF tools read it; `1` where there is no unit."""
    if not label:
        return "1"
    below = label.startswith("1/")
    exponent = -power if below else power
    base = label.removeprefix("1/")
    base = base if base.isidentifier() else f"({base})"
    return base if exponent == 1 else f"{base}^{exponent:g}"
