"""fields.nc opens alike in xarray (both ways) and h5py, and holds the field to the last bit."""

from __future__ import annotations

import os
import resource
import signal
from pathlib import Path
from typing import Any

import h5py
import numpy as np
import pytest
import xarray as xr

from wavejob.grid import Axis, Grid
from wavejob.outputs.fields import DensityTable, _power, write_fields
from wavejob.problems import RunError

LINE = Grid((Axis("x", -8.0, 8.0, 32),))
PLANE = Grid((Axis("x", -8.0, 8.0, 16), Axis("y", 0.0, 3.0, 8, "sine")))
TIMES = np.array([0.0, 1.5, 4.0])


def _fields(grid: Grid, channels: int = 1, kind: type = np.complex128) -> np.ndarray:
    random = np.random.default_rng(7)
    shape = (len(TIMES), channels, *grid.shape)
    return (random.standard_normal(shape) + 1j * random.standard_normal(shape)).astype(kind)


@pytest.mark.parametrize("engine", [None, "h5netcdf"])
def test_xarray_gives_the_field_back(tmp_path: Path, units: Any, engine: str | None) -> None:
    psi = _fields(LINE)
    path = tmp_path / "fields.nc"
    write_fields(path, grid=LINE, times=TIMES, fields=psi, units=units, about={"job": "stack/nominal"})
    with xr.open_dataset(path, engine=engine) as data:
        assert data.psi.dims == ("time", "x", "ri")
        assert data.psi.dtype == np.float64
        assert np.array_equal(data.psi[..., 0] + 1j * data.psi[..., 1], psi[:, 0])
        assert np.array_equal(data.x, LINE.axes[0].x)
        assert np.array_equal(data.time, TIMES)
        units_found = (data.x.units, data.time.units, data.psi.units)
        assert units_found == ("nm", "fs", "nm^-0.5")
        assert data.attrs["Conventions"] == "CF-1.11"
        assert data.attrs["job"] == "stack/nominal"


def test_h5py_gives_the_field_back(tmp_path: Path, units: Any) -> None:
    psi = _fields(LINE)
    write_fields(tmp_path / "fields.nc", grid=LINE, times=TIMES, fields=psi, units=units)
    with h5py.File(tmp_path / "fields.nc") as file:
        assert np.array_equal(file["psi"][..., 0] + 1j * file["psi"][..., 1], psi[:, 0])
        assert [d.keys() for d in file["psi"].dims][:2] == [["time"], ["x"]]
        assert np.array_equal(file["x"], LINE.axes[0].x)


def test_single_precision_stays_single(tmp_path: Path, units: Any) -> None:
    psi = _fields(LINE, kind=np.complex64)
    write_fields(tmp_path / "fields.nc", grid=LINE, times=TIMES, fields=psi, units=units)
    with xr.open_dataset(tmp_path / "fields.nc") as data:
        assert data.psi.dtype == np.float32
        assert data.x.dtype == np.float64
        assert np.array_equal(data.psi[..., 0], psi[:, 0].real)


def test_channels_are_named(tmp_path: Path, units: Any) -> None:
    psi = _fields(PLANE, channels=2)
    path = tmp_path / "fields.nc"
    write_fields(path, grid=PLANE, times=TIMES, fields=psi, units=units, channels=("lower", "upper"))
    with xr.open_dataset(path) as data:
        assert data.psi.dims == ("time", "channel", "x", "y", "ri")
        assert data.channel.values.tolist() == ["lower", "upper"]
        assert np.array_equal(data.psi.sel(channel="upper")[..., 1], psi[:, 1].imag)
        assert data.psi.units == "nm^-1"


def test_densities_have_their_own_times_and_rising_wave_numbers(tmp_path: Path, units: Any) -> None:
    """Norm and mean wave number come out of the table as they went in (Parseval)."""
    axis = LINE.axes[0]
    psi = np.exp(-(axis.x**2) / 4 + 2j * axis.x)
    psi /= np.sqrt(np.sum(abs(psi) ** 2) * axis.spacing)
    spacing = 2 * np.pi / axis.length
    momentum = abs(np.fft.fft(psi)) ** 2 * axis.spacing**2 / (2 * np.pi)
    tables = (
        DensityTable("density", np.array([0.0, 2.0]), [abs(psi[None]) ** 2] * 2),
        DensityTable("momentum_density", np.array([1.0]), [momentum[None]]),
    )
    path = tmp_path / "fields.nc"
    write_fields(path, grid=LINE, times=TIMES[:1], fields=[psi[None]], units=units, tables=tables)
    with xr.open_dataset(path) as data:
        assert data.density.dims == ("time_density", "x")
        assert data.momentum_density.dims == ("time_momentum_density", "k")
        assert data.time_density.values.tolist() == [0.0, 2.0]
        assert (np.diff(data.k) > 0).all()
        assert float(data.density[0].sum()) * axis.spacing == pytest.approx(1, abs=1e-12)
        assert float(data.momentum_density[0].sum()) * spacing == pytest.approx(1, abs=1e-12)
        assert float((data.k * data.momentum_density[0]).sum()) * spacing == pytest.approx(2, abs=1e-12)
        assert (data.density.units, data.momentum_density.units, data.k.units) == ("nm^-1", "nm", "1/nm")


def test_momentum_density_in_a_plane(tmp_path: Path, units: Any) -> None:
    values = np.random.default_rng(3).random((1, *PLANE.shape))
    table = DensityTable("momentum_density", np.array([0.0]), [values])
    path = tmp_path / "fields.nc"
    write_fields(path, grid=PLANE, times=TIMES, fields=_fields(PLANE), units=units, tables=[table])
    with xr.open_dataset(path) as data:
        assert data.momentum_density.dims == ("time_momentum_density", "kx", "ky")
        lowest = data.momentum_density[0].sel(kx=PLANE.axes[0].k.min(), ky=PLANE.axes[1].k.min())
        assert lowest == values[0, np.argmin(PLANE.axes[0].k), 0]
        assert data.momentum_density.units == "nm^2"


@pytest.mark.parametrize("label", ["s", "ms", "ns", "fs"])
def test_xarray_takes_times_for_plain_numbers(tmp_path: Path, units: Any, label: str) -> None:
    units.label = lambda dimension: label if dimension == "time" else ""
    write_fields(tmp_path / "fields.nc", grid=LINE, times=TIMES, fields=_fields(LINE), units=units)
    with xr.open_dataset(tmp_path / "fields.nc") as data:
        assert data.time.dtype == np.float64


def test_natural_units_are_one(tmp_path: Path, natural: Any) -> None:
    write_fields(tmp_path / "fields.nc", grid=LINE, times=TIMES, fields=_fields(LINE), units=natural)
    with xr.open_dataset(tmp_path / "fields.nc") as data:
        assert {data[name].units for name in ("x", "time", "psi")} == {"1"}


def test_fields_may_come_one_at_a_time(tmp_path: Path, units: Any) -> None:
    psi = _fields(PLANE)
    path = tmp_path / "fields.nc"
    write_fields(path, grid=PLANE, times=TIMES, fields=iter(psi), units=units)
    with h5py.File(path) as file:
        assert np.array_equal(file["psi"][2, ..., 1], psi[2, 0].imag)


@pytest.mark.parametrize(
    ("label", "power", "wanted"),
    [
        ("1/nm", 0.5, "nm^-0.5"),
        ("1/nm", 2, "nm^-2"),
        ("nm", 1, "nm"),
        ("1/bohr", 1.5, "bohr^-1.5"),
        ("", 2, "1"),
    ],
)
def test_unit_powers(label: str, power: float, wanted: str) -> None:
    assert _power(label, power) == wanted


@pytest.mark.parametrize("room", [0, 100, 3_000, 100_000, 1_000_000])
def test_a_full_disk_leaves_nothing(tmp_path: Path, units: Any, room: int) -> None:
    """Wherever in the file the system refuses, also where HDF5 would crash if it were told."""
    before = resource.getrlimit(resource.RLIMIT_FSIZE)
    handler = signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
    large = Grid((Axis("x", 0.0, 1.0, 2**16),))
    resource.setrlimit(resource.RLIMIT_FSIZE, (room, before[1]))
    try:
        with pytest.raises(RunError, match="could not write"):
            write_fields(tmp_path / "f.nc", grid=large, times=TIMES, fields=_fields(large), units=units)
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, before)
        signal.signal(signal.SIGXFSZ, handler)
    assert os.listdir(tmp_path) == []
