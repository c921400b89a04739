"""Levels of the potential at the start time, as they are on the grid."""

from __future__ import annotations

from typing import Annotated

import numpy as np
from pydantic import Field

from ..levels import LevelsError, lowest
from ..models import Name, whole
from ..packets.eigenstate import EigenstatePacket
from ..results import Column
from ..state import Look
from .base import Bench, Meter, Observable, Outline, Series

Array = np.ndarray
MOST = 100


class Levels(Observable):
    """The lowest levels of the potential at the start time; unbound ones depend on the ends of the grid."""

    name: Name = Field("levels", description="name in the outputs")
    count: Annotated[int, *whole(1, MOST)] = Field(5, description="how many, from the ground state up")

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        energies = (
            Column(f"{self.name}.energy[{n}]", "energy", f"energy of level {n} at the start time")
            for n in range(self.count)
        )
        bound = "how many of them lie below the potential at the ends of the grid"
        return (*energies, Column(f"{self.name}.bound", "number", bound))

    def meter(self, bench: Bench) -> Meter:
        return LevelsMeter(bench, self)

    def unfit(self, bench: Bench, psi: Array) -> tuple[str, str, str] | None:
        try:
            self.meter(bench)
        except LevelsError as error:
            return "count", error.message, error.fix
        return None


class LevelsMeter(Meter):
    def __init__(self, bench: Bench, levels: Levels) -> None:
        self.name = levels.name
        axis, mass, potential, start = bench.axis, bench.mass, bench.landscape, bench.start
        self.energies = lowest(axis, mass, lambda a: potential.sampled(a, start, mass), levels.count).energies
        inset = 1e-9 * axis.length
        ends = potential.value(np.array([axis.low + inset, axis.high - inset]), start)
        walls = axis.transform == "sine"
        self.bound = levels.count if walls else int(np.sum(self.energies < ends.min()))

    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        energies = {f"{self.name}.energy[{n}]": float(energy) for n, energy in enumerate(self.energies)}
        return {**energies, f"{self.name}.bound": float(self.bound)}


class StartLevel(Observable):
    """Energy and residual of an initial state that is an eigenstate."""

    packet: EigenstatePacket

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        return (
            Column("eigenstate.energy", "energy", "energy of the initial state in its potential"),
            Column("eigenstate.residual", "energy", "norm of H psi - E psi of the initial state"),
        )

    def meter(self, bench: Bench) -> Meter:
        return StartLevelMeter(bench, self.packet)


class StartLevelMeter(Meter):
    def __init__(self, bench: Bench, packet: EigenstatePacket) -> None:
        self.bench, self.packet = bench, packet
        self.energy = self.residual = 0.0

    def start(self, look: Look) -> None:
        psi = look.psi[0, 0].astype(complex)
        self.energy, self.residual = self.packet.energy(self.bench.axis, self.bench.surroundings, psi)

    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        return {"eigenstate.energy": self.energy, "eigenstate.residual": self.residual}
