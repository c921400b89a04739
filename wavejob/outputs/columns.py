"""From grid points to pixel columns, and from recorded times to pixel rows."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

Array = np.ndarray


@dataclass(frozen=True)
class Columns:
    """`width` pixel columns over `low` to `high`, fed from points `x` (rising, evenly spaced).

    Where several points share a column, curves show the highest and carpets the mean; where a column lies
    between points, both are interpolated linearly. Beyond the points there is nothing.
    """

    x: Array
    low: float
    high: float
    width: int

    @property
    def centres(self) -> Array:
        """x at the middle of each column, shape (width,)."""
        return self.low + (np.arange(self.width) + 0.5) * (self.high - self.low) / self.width

    @property
    def crowded(self) -> bool:
        """Whether every column holds at least one point."""
        return bool((self.high - self.low) / self.width >= self.x[1] - self.x[0])

    def highest(self, values: Array) -> Array:
        """(F, M) -> (F, width), the largest value in each column."""
        return self._gather(values, np.maximum)

    def mean(self, values: Array) -> Array:
        """(F, M) -> (F, width), the mean in each column."""
        return self._gather(values, np.add)

    def _gather(self, values: Array, combine: np.ufunc) -> Array:
        inside = self._inside()
        if not self.crowded:
            left, share = self._neighbours()
            return np.where(inside, values[:, left] * (1 - share) + values[:, left + 1] * share, 0)
        edges = np.linspace(self.low, self.high, self.width + 1)
        starts = np.searchsorted(self.x, edges)
        first = np.minimum(starts[:-1], self.x.size - 1)
        held = values[:, : max(int(starts[-1]), 1)]
        gathered = combine.reduceat(held, np.minimum(first, held.shape[1] - 1), axis=1)
        if combine is np.add:
            gathered = gathered / np.maximum(np.diff(starts), 1)
        return np.where(inside, gathered, 0)

    def phase(self, values: Array) -> Array:
        """Phases (M,) at the middle of each column, shape (width,), radians."""
        left, share = self._neighbours()
        turned = np.exp(1j * values[left]) * (1 - share) + np.exp(1j * values[left + 1]) * share
        return np.asarray(np.angle(turned))

    def _neighbours(self) -> tuple[Array, Array]:
        """The point left of each column's middle and the share of the point right of it."""
        step = self.x[1] - self.x[0]
        place = np.clip((self.centres - self.x[0]) / step, 0, self.x.size - 1)
        left = np.minimum(place.astype(int), self.x.size - 2)
        return left, (place - left).astype(np.float32)

    def _inside(self) -> Array:
        half = (self.x[1] - self.x[0]) / 2
        return np.asarray((self.centres > self.x[0] - half) & (self.centres < self.x[-1] + half))


def rows_in_time(values: Array, times: Array, height: int) -> Array:
    """(F, width) -> (height, width): linear between the recorded times, which fill `height` rows evenly."""
    if times.size == 1:
        return np.repeat(values, height, axis=0)
    wanted = times[0] + (np.arange(height) + 0.5) / height * (times[-1] - times[0])
    after = np.clip(np.searchsorted(times, wanted), 1, times.size - 1)
    share = ((wanted - times[after - 1]) / (times[after] - times[after - 1]))[:, None].astype(np.float32)
    return np.asarray(values[after - 1] * (1 - share) + values[after] * share)
