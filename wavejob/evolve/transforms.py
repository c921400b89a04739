"""Planned FFTW transforms between points and wave numbers. The only module that knows FFTW.

Each axis of the grid asks for one of two transforms, both unnormalised:
    periodic  the complex discrete Fourier transform, wave numbers in the order of `numpy.fft`;
    sine      DST-II forward and DST-III back, applied to real and imaginary parts: points at
              low + (j + 1/2) dx, wave numbers pi n / L with n = 1 ... N, zero at both ends.
"""

from __future__ import annotations

import os
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Literal

# Spinning OpenMP threads starve other processes; the library reads this when it is loaded.
os.environ.setdefault("OMP_WAIT_POLICY", "passive")

import numpy as np
import pyfftw

from ..grid import Grid, Transform
from . import wisdom

Array = np.ndarray
Precision = Literal["double", "single"]
Action = Callable[[], None]

COMPLEX: dict[Precision, type] = {"double": np.complex128, "single": np.complex64}

# Up to here psi and its transform stay in the first-level cache together, and FFTW is faster from one array
# to another than in place; above, touching less memory wins. Measured on x86-64 with 48 kB.
OUT_OF_PLACE_UP_TO = 2048


@dataclass(frozen=True)
class Settings:
    """What a set of plans is for.

    threads       of FFTW itself; with `reproducible` always one, and plans that do not depend on timing
    cache         folder for what FFTW learns; None for the user's own (`wisdom.folder`)
    """

    grid: Grid
    runs: int
    channels: int
    precision: Precision = "double"
    threads: int = 1
    reproducible: bool = False
    cache: Path | None = None

    @property
    def shape(self) -> tuple[int, ...]:
        return (self.runs, self.channels, *self.grid.shape)

    @property
    def round_trip(self) -> float:
        """What forward and backward together multiply by."""
        return float(np.prod([axis.points * (2 if axis.transform == "sine" else 1) for axis in self.grid.axes]))

    def axes(self, kind: Transform) -> tuple[int, ...]:
        """Array axes that use transform `kind`."""
        return tuple(i + 2 for i, axis in enumerate(self.grid.axes) if axis.transform == kind)


class Transforms:
    """Forward from `psi` to `wave` and back, planned once.

    psi, wave  complex, shape (runs, channels, *grid); one and the same array where that is faster.
    forward, backward  called without arguments, in the hot loop; they overwrite their target.
    """

    def __init__(self, settings: Settings) -> None:
        small = int(np.prod(settings.shape)) <= OUT_OF_PLACE_UP_TO and not settings.axes("sine")
        self.psi = _aligned(settings)
        self.wave = _aligned(settings) if small else self.psi
        if settings.reproducible:
            pyfftw.forget_wisdom()
            self._plan(settings, "FFTW_ESTIMATE", 1)
            return
        kinds = ",".join(axis.transform for axis in settings.grid.axes)
        key = " | ".join(
            str(part)
            for part in (
                pyfftw.fftw_version,
                wisdom.processor(),
                settings.shape,
                kinds,
                settings.precision,
                settings.threads,
            )
        )
        where = settings.cache or wisdom.folder()
        known = wisdom.load(where, key)
        learnt = known is not None and any(pyfftw.import_wisdom(known))
        self._plan(settings, "FFTW_MEASURE", settings.threads)
        if not learnt:
            wisdom.save(where, key, pyfftw.export_wisdom())

    def _plan(self, settings: Settings, effort: str, threads: int) -> None:
        """Set `forward` and `backward`. Planning overwrites the arrays.

        There is no time limit: cut short, FFTW falls back to estimates, which in 2D can be 10 times slower.
        """
        how = {"flags": (effort,), "threads": threads}
        there: list[Action] = []
        back: list[Action] = []
        if axes := settings.axes("periodic"):
            for source, target, direction, plans in (
                (self.psi, self.wave, "FFTW_FORWARD", there),
                (self.wave, self.psi, "FFTW_BACKWARD", back),
            ):
                plan = pyfftw.FFTW(source, target, axes=axes, direction=direction, **how)
                plans.append(plan.execute)
        if axes := settings.axes("sine"):
            pairs = self.psi.view(self.psi.real.dtype).reshape(*self.psi.shape, 2)
            for direction, plans in (("FFTW_RODFT10", there), ("FFTW_RODFT01", back)):
                plan = pyfftw.FFTW(pairs, pairs, axes=axes, direction=(direction,) * len(axes), **how)
                plans.append(plan.execute)
        self.forward: Action = _in_turn(there)
        self.backward: Action = _in_turn(back)


def _aligned(settings: Settings) -> Array:
    """An empty array at an address that vector instructions like."""
    array: Array = pyfftw.empty_aligned(settings.shape, dtype=COMPLEX[settings.precision])
    return array


def _in_turn(actions: list[Action]) -> Action:
    if len(actions) == 1:
        return actions[0]

    def run() -> None:
        for action in actions:
            action()

    return run


class Spectrum:
    """psi -> its amplitudes on the wave numbers, normalised: sum |a|^2 = sum |psi|^2 * cell.

    Periodic axes: psi(x) = sum over k of a_k exp(i k (x - x_0)) / sqrt(L), x_0 the first point, k = `axis.k`.
    Sine axes: psi(x) = sum over n = 1 ... N of a_n sqrt(2 / L) sin(k_n (x - low)), the last one over sqrt(2).
    """

    def __init__(self, settings: Settings) -> None:
        grid = settings.grid
        self._transforms = Transforms(settings)
        self._scale = np.full((1,) * len(grid.axes), np.sqrt(grid.cell / settings.round_trip))
        for index, axis in enumerate(grid.axes):
            if axis.transform == "sine":  # the highest mode counts once where the others count twice
                last = np.where(np.arange(axis.points) == axis.points - 1, np.sqrt(0.5), 1.0)
                self._scale = self._scale * grid.along(index, last)

    def __call__(self, psi: Array) -> Array:
        """A new complex128 array of the shape of `psi`."""
        self._transforms.psi[...] = psi
        self._transforms.forward()
        amplitudes: Array = self._transforms.wave * self._scale
        return amplitudes
