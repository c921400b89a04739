"""Phase factors exp(i angle), fast."""

from __future__ import annotations

from typing import Any

import numpy as np

Array = np.ndarray

ROUNDING = 2e-15  # a sum of lines may miss its field by this part of the largest value
BLOCK = 4096  # points at a time: the work arrays of a block stay in the first-level cache


class Circle:
    """exp(2 i h) from the half angles h, through t = tan h: cos = 2 / (1 + t^2) - 1, sin = 2 t / (1 + t^2).

    numpy's tangent of doubles is vectorised where its sine and cosine are not: 2.6 ns a point instead of 16.
    The modulus is 1 to rounding, whatever the tangent's own error.
    """

    def __init__(self, shape: tuple[int, ...]) -> None:
        size = int(np.prod(shape))
        self._blocks = [slice(first, min(first + BLOCK, size)) for first in range(0, size, BLOCK)]
        self._tangent, self._inverse = np.empty(min(size, BLOCK)), np.empty(min(size, BLOCK))
        self.half = np.empty(shape)  # filled by the caller, overwritten by nobody

    def into(self, table: Array) -> None:
        """Write exp(2 i half) to the contiguous complex array `table`, of the same shape."""
        half, flat = self.half.reshape(-1), table.reshape(-1)
        for block in self._blocks:
            angles, out = half[block], flat[block]
            t, w = self._tangent[: len(angles)], self._inverse[: len(angles)]
            np.tan(angles, t)
            np.multiply(t, t, w)
            np.add(w, 1, w)
            np.divide(2, w, w)
            np.subtract(w, 1, out.real)
            np.multiply(t, w, out.imag)


class Lines:
    """Real fields that are sums of functions of one coordinate each: exp(i field) is then a product of lines.

    A single axis is folded into rows first, so that a field linear along it is such a sum as well (a uniform
    force): instead of N exponentials it takes 2 sqrt(N).
    """

    def __init__(self, shape: tuple[int, ...], folded: tuple[int, ...], lines: list[Array]) -> None:
        """`lines`: one array for each coordinate, (fields, runs, channels, 1, ..., points, ..., 1)."""
        self.shape, self._folded = shape, (*shape[:2], *folded)
        self._values = np.concatenate([line.reshape(len(line), -1) for line in lines], axis=1)
        self._angles = np.empty(self._values.shape[1])
        self._phases = np.empty(self._values.shape[1], complex)
        ends = np.cumsum([line[0].size for line in lines])
        self._factors = [
            phases.reshape(line.shape[1:])
            for phases, line in zip(np.split(self._phases, ends[:-1]), lines, strict=True)
        ]

    @classmethod
    def of(cls, fields: list[Array], grid: tuple[int, ...]) -> Lines | None:
        """The lines of real `fields` (runs, channels, *grid), or None where one of them has none."""
        folded = grid
        if len(grid) == 1:
            rows = max(n for n in range(1, int(np.sqrt(grid[0])) + 1) if grid[0] % n == 0)
            if rows == 1:
                return None
            folded = (rows, grid[0] // rows)
        shape = np.broadcast_shapes(*(field.shape for field in fields), (1, 1, *grid))
        full = [np.broadcast_to(field, shape).reshape(*shape[:2], *folded) for field in fields]
        split = [_split(field, len(folded)) for field in full]
        for field, lines in zip(full, split, strict=True):
            if np.abs(sum(lines) - field).max() > ROUNDING * np.abs(field).max():
                return None
        return cls(shape, folded, [np.stack(lines) for lines in zip(*split, strict=True)])

    def multiply(self, source: Array, scales: Array, out: Array) -> None:
        """out = source exp(i sum over fields of scale * field); both complex, contiguous, of `shape`."""
        np.dot(scales, self._values, self._angles)
        np.cos(self._angles, self._phases.real)
        np.sin(self._angles, self._phases.imag)
        source, out = source.reshape(self._folded), out.reshape(self._folded)
        for factor in self._factors:
            np.multiply(source, factor, out, casting="same_kind")
            source = out


def _split(field: Array, ndim: int) -> list[Array]:
    """Its values along each of the last `ndim` axes through the first point, which counts once."""
    lines = []
    first = (slice(0, 1),) * ndim
    origin: tuple[Any, ...] = (..., *first)
    for axis in range(ndim):
        along: tuple[Any, ...] = (..., *first[:axis], slice(None), *first[axis + 1 :])
        lines.append(field[along] - (field[origin] if axis else 0))
    return lines
