"""A finished run, read back: figures, tables and fields as numpy arrays, or as xarray where installed."""

from __future__ import annotations

import csv
import json
from dataclasses import dataclass
from functools import cached_property
from pathlib import Path
from typing import Any

import numpy as np

from .problems import JobFileError, Place, Problem

Array = np.ndarray

FIELDS = "fields.nc"


@dataclass(frozen=True)
class Figure:
    """One result in the file's unit; `value` is None where it could not be had, `error` without a bar."""

    value: float | None
    error: float | None
    unit: str
    meaning: str


@dataclass(frozen=True)
class Table:
    """Columns by name, each of shape (rows,), nan where a cell is empty; `units` by the same names."""

    columns: dict[str, Array]
    units: dict[str, str]

    def __getitem__(self, name: str) -> Array:
        return self.columns[name]


@dataclass(frozen=True)
class Run:
    """The folder of a finished run. Files are read when first asked for; all is in the job file's units."""

    folder: Path

    @cached_property
    def document(self) -> dict[str, Any]:
        """results.json as it stands."""
        return _json(self.folder / "results.json")

    @cached_property
    def manifest(self) -> dict[str, Any]:
        """manifest.json as it stands."""
        return _json(self.folder / "manifest.json")

    @property
    def verdict(self) -> str:
        """trusted, doubtful or failed."""
        return str(self.document["verdict"])

    @cached_property
    def results(self) -> dict[str, Figure]:
        """The figures by name."""
        return {
            name: Figure(entry["value"], entry["error"], entry["unit"], entry["meaning"])
            for name, entry in self.document["results"].items()
        }

    @cached_property
    def series(self) -> Table:
        """The time series; its first column is `time`."""
        return _table(self.folder / "series.csv")

    def curve(self, name: str) -> Table:
        """The curve of the observable called `name`."""
        return _table(self.folder / f"{name}.csv")

    @cached_property
    def fields(self) -> dict[str, Array]:
        """Everything in fields.nc by name: `x`, `time`, and `psi`, complex, of shape (times, points)."""
        import h5py

        with h5py.File(self.folder / FIELDS, "r") as file:
            found = {name: np.asarray(file[name]) for name in file if name != "ri"}
        psi = found["psi"]
        return {**found, "psi": psi[..., 0] + 1j * psi[..., 1]}

    def dataset(self) -> Any:
        """fields.nc as an xarray.Dataset with units, `psi` complex. Needs xarray."""
        import xarray

        with xarray.open_dataset(self.folder / FIELDS, engine="h5netcdf", decode_times=False) as stored:
            found = stored.load()
        psi = found["psi"]
        return found.drop_vars("psi").assign(psi=psi.isel(ri=0) + 1j * psi.isel(ri=1))


def open_run(folder: str | Path) -> Run:
    """The finished run in `folder`. Raises JobFileError where there is none."""
    folder = Path(folder)
    if not (folder / "manifest.json").is_file():
        there = "it is unfinished: run its job again" if (folder / ".job").is_file() else "name a folder below `runs/`"
        raise JobFileError([Problem("holds no finished run", there, place=Place(str(folder)))])
    return Run(folder)


def _json(path: Path) -> dict[str, Any]:
    document: dict[str, Any] = json.loads(path.read_text(encoding="utf-8"))
    return document


def _table(path: Path) -> Table:
    with path.open(encoding="utf-8", newline="") as file:
        header, *rows = csv.reader(file)
    names = [cell.partition(" [")[0] for cell in header]
    units = [cell.partition(" [")[2].removesuffix("]") for cell in header]
    numbers = np.array([[float(cell) if cell else np.nan for cell in row] for row in rows]).reshape(-1, len(names))
    return Table(dict(zip(names, numbers.T, strict=True)), dict(zip(names, units, strict=True)))
