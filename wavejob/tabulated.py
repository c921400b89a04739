"""Files that a job reads: columns of numbers, checked, and the smooth curve through them."""

from __future__ import annotations

import csv
import hashlib
from dataclasses import dataclass
from pathlib import Path
from typing import Annotated, Any

import numpy as np
from pydantic import Field, ValidationInfo, WithJsonSchema
from pydantic.functional_validators import BeforeValidator

from .models import Reader, refuse
from .problems import shown
from .reading.tree import PathError

Array = np.ndarray
MAX_BYTES = 64 * 2**20


class TableError(ValueError):
    """What is wrong with a table file, and the cure."""

    def __init__(self, message: str, fix: str = "") -> None:
        self.message, self.fix = message, fix
        super().__init__(message, fix)


def read_columns(path: Path, wanted: int) -> Array:
    """The first `wanted` columns of a comma- or blank-separated file, shape (rows, wanted).

    Lines that begin with `#` and one header line are passed over. A gap, a word or a value that is
    not finite is refused with its line.
    """
    if path.stat().st_size > MAX_BYTES:
        raise TableError(f"`{path.name}` is larger than {MAX_BYTES // 2**20} MiB", "thin the table out")
    try:
        text = path.read_text(encoding="utf-8-sig")
    except UnicodeDecodeError as error:
        raise TableError(f"`{path.name}` is not a UTF-8 text file (byte {error.start})", "save it as UTF-8") from None
    rows: list[list[float]] = []
    header = True
    for number, line in enumerate(text.split("\n"), 1):
        line = line.strip()
        if not line or line.startswith("#"):
            continue
        cells = next(csv.reader([line])) if "," in line else line.split()
        try:
            values = [float(cell) for cell in cells[:wanted]]
        except ValueError:
            if header and not rows:
                header = False
                continue
            bad = next(cell for cell in cells if not _is_number(cell))
            raise TableError(
                f"`{path.name}` line {number}: `{bad.strip() or 'an empty cell'}` is no number",
                "fill the gap; decimal points only",
            ) from None
        header = False
        if len(values) < wanted:
            raise TableError(f"`{path.name}` line {number} has {len(values)} of {wanted} columns", "complete the line")
        if not np.all(np.isfinite(values)):
            raise TableError(f"`{path.name}` line {number} holds a value that is not finite", "every value must be finite")
        rows.append(values)
    if len(rows) < 4:
        raise TableError(f"`{path.name}` has {len(rows)} rows of numbers", "at least 4 are needed for a smooth curve")
    return np.array(rows)


def _is_number(cell: str) -> bool:
    try:
        float(cell)
    except ValueError:
        return False
    return True


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
            rows = read_columns(path, 2)
        except TableError as error:
            raise refuse(error.message, error.fix) from None
        falls = np.flatnonzero(np.diff(rows[:, 0]) <= 0)
        if falls.size:
            raise refuse(
                f"the first column of `{written}` does not rise after {rows[falls[0], 0]:g}",
                "sort the rows and drop doubled ones",
            )
        return cls(str(written), rows, digest(path))

    def curve(self, at_scale: float, value_scale: float) -> Curve:
        """The smooth curve with both columns multiplied by their scales."""
        return Curve.through(self.rows[:, 0] * at_scale, self.rows[:, 1] * value_scale)


def named_file(written: Any, info: ValidationInfo) -> Path:
    """The file that `written` names, inside the job tree."""
    reader: Reader = info.context
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
