"""The hot loop: how a state is advanced by whole steps, once everything has been planned."""

from __future__ import annotations

from dataclasses import dataclass
from functools import cached_property
from itertools import chain, repeat
from pathlib import Path

import numpy as np

from ..hamiltonian import Hamiltonian
from ..state import Look
from .factors import Factor, factor
from .splittings import Kick, PlanError, Splitting
from .transforms import Precision, Settings, Spectrum, Transforms

Array = np.ndarray


@dataclass(frozen=True)
class Row:
    """One transform pair of a step: drift there, kick back here, at (step number + `at`) * step."""

    drift: Array
    kick: Factor
    at: float


class Stepper:
    """A planned propagation: owns `psi` and advances it. Made by `plan`.

    psi       complex, aligned, shape (runs, channels, *grid), live: copy what you keep
    absorbed  layer name -> probability it took so far, shape (runs,); norm + absorbed stays the first norm
    """

    def __init__(
        self,
        hamiltonian: Hamiltonian,
        step: float,
        start: float,
        settings: Settings,
        transforms: Transforms,
        *,
        opening: Factor,
        rows: list[Row],
        closing: list[Row],
    ) -> None:
        self.hamiltonian, self.step, self.start = hamiltonian, step, start
        self.psi = transforms.psi
        self.absorbed = {layer.name: np.zeros(len(self.psi)) for layer in hamiltonian.layers}
        self._settings, self._transforms = settings, transforms
        self._opening, self._rows, self._closing = opening, rows, closing

    def time(self, n: int) -> float:
        """The time after step `n`, from the step number: rounding errors do not add up."""
        return self.start + n * self.step

    def advance(self, first: int, count: int) -> None:
        """Carry psi from step number `first` over `count` >= 1 steps; afterwards it is complete."""
        self._opening.refresh(self.time(first), self.absorbed)
        self._opening.apply()
        if self.hamiltonian.depends_on_time or self.hamiltonian.couples:
            self._advance_changing(first, count)
        else:
            self._advance_static(count)
        for kick in {id(row.kick): row.kick for row in (*self._rows, *self._closing)}.values():
            kick.settle(self.absorbed)

    def _advance_static(self, count: int) -> None:
        psi, wave = self._transforms.psi, self._transforms.wave
        forward, backward = self._transforms.forward, self._transforms.backward
        multiply, add = np.multiply, np.add
        rows, closing = (
            [(row.drift, [(t.amplitude, t.squared, t.seen) for t in row.kick.tallies], row.kick.table) for row in step]
            for step in (self._rows, self._closing)
        )
        for drift, layers, kick in chain(chain.from_iterable(repeat(rows, count - 1)), closing):
            forward()
            multiply(wave, drift, wave)
            backward()
            for amplitude, squared, seen in layers:
                multiply(amplitude, amplitude, squared)
                add(seen, squared, seen)
            multiply(psi, kick, psi)

    def _advance_changing(self, first: int, count: int) -> None:
        wave = self._transforms.wave
        forward, backward = self._transforms.forward, self._transforms.backward
        multiply, absorbed = np.multiply, self.absorbed
        last = first + count - 1
        for n in range(first, first + count):
            for row in self._rows if n < last else self._closing:
                forward()
                multiply(wave, row.drift, wave)
                backward()
                row.kick.refresh(self.start + (n + row.at) * self.step, absorbed)
                row.kick.apply()

    def spectrum(self, psi: Array) -> Array:
        """Momentum amplitudes of a field of the shape of `psi`, see `transforms.Spectrum`."""
        return self._spectrum(psi)

    @cached_property
    def _spectrum(self) -> Spectrum:
        """Planned when first needed."""
        return Spectrum(self._settings)

    def look(self, n: int) -> Look:
        """What outputs see after step `n`."""
        return Look(
            n=n,
            t=self.time(n),
            psi=self.psi,
            grid=self.hamiltonian.grid,
            hamiltonian=self.hamiltonian,
            absorbed=self.absorbed,
            to_amplitudes=self.spectrum,
        )


def plan(
    hamiltonian: Hamiltonian,
    splitting: Splitting,
    step: float,
    psi0: Array,
    *,
    start: float = 0.0,
    precision: Precision = "double",
    reproducible: bool = False,
    threads: int = 1,
    cache: Path | None = None,
) -> Stepper:
    """Everything `Stepper.advance` needs, made ready: transforms, factors, work arrays.

    psi0  complex, shape (runs, channels, *grid), copied
    step  length of a step; `start` is the time of step number 0
    reproducible  the same bits in every process on one machine: estimated plans, one thread
    cache  folder for what FFTW learns; None for the user's own (see `wisdom.folder`)

    Raises PlanError where the splitting cannot carry the Hamiltonian.
    """
    grid = hamiltonian.grid
    _refuse_misfits(hamiltonian, splitting)
    if psi0.shape[2:] != grid.shape:
        raise PlanError(f"psi has shape {psi0.shape}, the grid {grid.shape}", "(runs, channels, *grid)")
    runs, channels = psi0.shape[:2]
    settings = Settings(grid, runs, channels, precision, threads, reproducible, cache)
    transforms = Transforms(settings)
    psi = transforms.psi
    psi[...] = psi0

    def potential(kick: Kick, weight: float) -> Factor:
        return factor(hamiltonian, weight * step, kick.gradient * step**2, psi, start)

    energy = hamiltonian.kinetic() + sum(
        part.values(start) for part in hamiltonian.parts if part.representation == "wave number"
    )
    energy = energy.reshape((1,) * (psi.ndim - energy.ndim) + energy.shape)  # numpy is slow to broadcast
    drifts = {
        share: (np.exp(-1j * step * share * energy) / settings.round_trip).astype(psi.dtype)
        for share in splitting.drifts
    }
    first, *inner, last = splitting.kicks
    opening = potential(last, last.weight)
    joined = potential(last, first.weight + last.weight)
    rows = [
        Row(drifts[share], potential(kick, kick.weight), kick.at)
        for share, kick in zip(splitting.drifts, inner, strict=False)
    ]
    final = drifts[splitting.drifts[-1]]
    return Stepper(
        hamiltonian,
        step,
        start,
        settings,
        transforms,
        opening=opening,
        rows=[*rows, Row(final, joined, last.at)],
        closing=[*rows, Row(final, opening, last.at)],
    )


def _refuse_misfits(hamiltonian: Hamiltonian, splitting: Splitting) -> None:
    parts = hamiltonian.parts
    if splitting.uses_gradient and hamiltonian.couples:
        raise PlanError("order 4 is not available where channels couple", "use order 2")
    if splitting.uses_gradient and any(part.gradient is None for part in parts):
        raise PlanError("order 4 needs the gradient of every part of the potential", "use order 2")
    if any(part.representation == "wave number" and (part.depends_on_time or part.couples) for part in parts):
        raise PlanError("parts diagonal in wave number must be constant and must not couple channels")
