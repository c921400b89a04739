"""Files that a job reads: columns of numbers, checked, and the smooth curve through them."""

from __future__ import annotations

import hashlib
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Any

import numpy as np
from pydantic import Field, ValidationInfo, WithJsonSchema
from pydantic.functional_validators import BeforeValidator

from .models import reader_of, refuse
from .problems import shown
from .reading.tree import PathError

Array = np.ndarray
MAX_BYTES = 16 * 2**20
FEWEST_ROWS = 4


class TableError(ValueError):
    """What is wrong with a table file, and the cure."""

    def __init__(self, message: str, fix: str = "") -> None:
        self.message, self.fix = message, fix
        super().__init__(message, fix)


def read_columns(path: Path, written: str, wanted: int) -> Array:
    """The first `wanted` columns of the comma- or blank-separated file that a job names as `written`.

    Shape (rows, wanted). Lines that begin with `#` and one header line, without any number, are passed over.
    A gap, a word or a value that is not finite is refused with its line.
    """
    size = path.stat().st_size
    if size > MAX_BYTES:
        said = f"`{written}` has {size / 2**20:.3g} MiB, at most {MAX_BYTES // 2**20} are read"
        raise TableError(said, "thin the table out")
    try:
        text = path.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        raise TableError(
            f"`{written}` is no UTF-8 text (byte {error.start})", "name a text file with columns"
        ) from None
    rows: list[list[float]] = []
    header = True
    for number, line in enumerate(text.split("\n"), 1):
        line = line.strip()
        if not line or line.startswith("#"):
            continue
        cells = [cell.strip().strip('"') for cell in line.split(",")] if "," in line else line.split()
        values = [_number(cell) for cell in cells[:wanted]]
        if header and all(value is None for value in values):
            header = False
            continue
        header = False
        known = [value for value in values if value is not None]
        if len(known) < wanted:
            raise TableError(*_faulty(f"`{written}`, line {number}", cells[:wanted], wanted))
        if not np.all(np.isfinite(known)):
            raise TableError(f"`{written}`, line {number}: a value is not finite", "every value must be finite")
        rows.append(known)
    if len(rows) < FEWEST_ROWS:
        said = f"`{written}` has {len(rows)} rows of numbers"
        raise TableError(said, f"at least {FEWEST_ROWS} are needed for a smooth curve")
    return np.array(rows)


def _number(cell: str) -> float | None:
    """The number in a cell, or None: digits of other scripts and `1_000` are no numbers here."""
    if not cell.isascii() or "_" in cell:
        return None
    try:
        return float(cell)
    except ValueError:
        return None


def _faulty(where: str, cells: list[str], wanted: int) -> tuple[str, str]:
    """Message and cure for a line whose first cells are not all numbers."""
    bad = next((cell for cell in cells if _number(cell) is None), None)
    if bad == "":
        return f"{where}: a cell is empty", "fill the gap or drop the line"
    if bad is not None and ";" in bad:
        return (
            f"{where}: {shown(bad)} is no number",
            "separate columns with commas or blanks, write decimal points",
        )
    if bad is not None:
        return f"{where}: {shown(bad)} is no number", "write plain numbers with decimal points"
    return (
        f"{where}: {len(cells)} of {wanted} columns",
        "complete the line; columns stand between commas or blanks",
    )


@dataclass(frozen=True)
class Curve:
    """The cubic spline through (at, value): twice continuously differentiable ("not-a-knot" ends)."""

    low: float
    high: float
    value: Any
    slope: Any

    @classmethod
    def through(cls, at: Array, values: Array) -> Curve:
        from scipy.interpolate import CubicSpline

        spline = CubicSpline(at, values)
        return cls(float(at[0]), float(at[-1]), spline, spline.derivative())


@dataclass(frozen=True)
class TableFile:
    """A table as a job names it: the path as written, its rows, and a digest of its contents."""

    written: str
    rows: Array
    digest: str

    @classmethod
    def read(cls, written: Any, info: ValidationInfo) -> TableFile:
        """Reads columns `at`, `value`; `at` must rise."""
        if isinstance(written, TableFile):
            return written
        path = named_file(written, info)
        try:
            rows = read_columns(path, str(written), 2)
        except TableError as error:
            raise refuse(error.message, error.fix) from None
        falls = np.flatnonzero(np.diff(rows[:, 0]) <= 0)
        if falls.size:
            said = f"the first column of `{written}` does not rise after {rows[falls[0], 0]:g}"
            raise refuse(said, "sort the rows and drop doubled ones")
        return cls(str(written), rows, digest(path))

    def curve(self, at_scale: float, value_scale: float) -> Curve:
        """The smooth curve with both columns multiplied by their scales."""
        return Curve.through(self.rows[:, 0] * at_scale, self.rows[:, 1] * value_scale)


def named_file(written: Any, info: ValidationInfo) -> Path:
    """The file that `written` names, inside the job tree."""
    reader = reader_of(info)
    if not isinstance(written, str) or not written:
        raise refuse(f"{shown(written)} is no path", "write a path relative to this file")
    if reader.open_path is None:
        raise refuse("no file can be read here", "")
    try:
        return reader.open_path(written)
    except PathError as error:
        raise refuse(error.message, error.fix) from None


def digest(path: Path) -> str:
    """SHA-256 of the file's contents."""
    return hashlib.sha256(path.read_bytes()).hexdigest()


TablePath = Annotated[
    TableFile,
    BeforeValidator(TableFile.read),
    WithJsonSchema({"type": "string"}),
    Field(description="path of a text table, relative to this file"),
]
