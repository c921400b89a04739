"""A stationary state of the job's potential, or of some terms of their own."""

from __future__ import annotations

from typing import Annotated

import numpy as np
from pydantic import Field

from ..grid import Axis
from ..levels import LevelsError, lowest, residual
from ..models import Choice, Item, whole
from ..potentials.item import POTENTIALS, TermItem
from ..shapes import Landscape
from .base import Array, Packet, PacketError, Surroundings

MOST = 500
UNIQUE = 1e-10  # smallest distance between two levels, over the room of the level above the lowest potential


class EigenstatePacket(Packet):
    """Level `level` (from 0, energies rising) of the potential at the start time, on the job's grid."""

    level: Annotated[int, *whole(0, MOST)] = Field(description="0 for the ground state, 1, 2, ...")
    of: list[Annotated[Item, Choice(POTENTIALS, "potential", TermItem)]] | None = Field(
        None,
        description="terms whose state it is; left out: the job's own potential at the start time",
        max_length=200,
    )

    def landscape(self, surroundings: Surroundings) -> Landscape:
        """The potential whose state it is."""
        if self.of is None:
            return surroundings.landscape
        return Landscape(tuple(item.term(surroundings.setting) for item in self.of))  # type: ignore[attr-defined]

    def field(self, axis: Axis, surroundings: Surroundings) -> Array:
        landscape, mass, start = self.landscape(surroundings), surroundings.mass, surroundings.start
        try:
            found = lowest(axis, mass, lambda a: landscape.sampled(a, start, mass), self.level + 2)
        except LevelsError as error:
            raise PacketError(error.message, error.fix) from None
        room = found.energies[self.level] - float(landscape.sampled(axis, start, mass).min())
        gaps = np.diff(found.energies)[max(self.level - 1, 0) :]
        if gaps.min() < UNIQUE * room:
            raise PacketError(
                f"level {self.level} has the same energy as another one, so its state is not unique",
                "add a weak term that tells them apart",
            )
        return np.asarray(found.states[self.level], dtype=complex)

    def energy(self, axis: Axis, surroundings: Surroundings, psi: Array) -> tuple[float, float]:
        """Mean energy of `psi` in the potential whose state it is, and ||H psi - E psi||."""
        values = self.landscape(surroundings).sampled(axis, surroundings.start, surroundings.mass)
        return residual(axis, surroundings.mass, values, psi.real)
