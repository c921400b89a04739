"""Transmission, reflection and phase at each energy, from the flux of one packet."""

from __future__ import annotations

from typing import Annotated

import numpy as np
from pydantic import Field, model_validator

from ..grid import Axis
from ..models import Energy, Length, Model, Name, refuse
from ..results import Column
from .approach import ASTRAY, SMALLEST_WEIGHT, Approach
from .base import Bench, Meter, Observable, Outline
from .scattering import TransmissionMeter

Array = np.ndarray

HELD = "the packet holds only energies from {} to {} that move this way"


class EnergyRange(Model):
    """Evenly spaced energies, both ends included."""

    start: Energy = Field(alias="from", description="lowest energy, on the scale of the potential")
    stop: Energy = Field(alias="to", description="highest energy")
    points: Annotated[int, Field(ge=2, le=20001)] = Field(description="number of energies")

    @model_validator(mode="after")
    def _ordered(self) -> EnergyRange:
        if not self.start < self.stop:
            raise refuse("`from` must lie before `to`", "swap them")
        return self

    @property
    def values(self) -> Array:
        return np.linspace(self.start, self.stop, self.points)


class Transmission(Observable):
    """T, R and phase at each energy, from one packet.

    T(E) = J(E) / J_in(E). J(E) is the flux at the detector of the field there, Fourier transformed in time at
    the total energy E; J_in(E) = 2 pi abs(phi(k))^2 / v is that of the initial state at the wave number k and
    velocity v it has at this energy where it starts. T contains the ratio of the velocities on both sides.
    R(E) is the flux, over J_in, that comes back to a second place: half-way between the back of the packet
    and the absorbing layer or end of the grid behind it. Nothing ties R to T, so that R + T = 1 is a check.

    The stationary flux does not depend on the place: the detector may stand inside the structure or anywhere
    beyond, on a potential of any height, but not in an absorbing layer, the packet, or before the structure.

    `phase` is that of the field at the detector against the field the same packet would have there without
    any potential but that of its start: arg t where the potential is the same on both sides, and
    arg t + (k' - k) x where t e^(ik'x) goes out of e^(ikx) coming in. `phase_time` is hbar d(phase)/dE: by
    how much the packet comes later than without potential; a structure of length d takes phase_time + d/v
    (Wigner 1955). `weight` is abs(phi(k))^2 over its largest value; below 1e-8 of it there are no values.

    `.peak[i]` are the lowest peaks of T: energy of the top, full width at half of it, lifetime hbar / width.
    The error of each value holds what comes back from the ends, the part of the packet that does not start
    where the potential is flat, and what has not left the structure yet when the run ends.
    """

    name: Name = Field(description="name in the outputs")
    x: Length = Field(description="place of the detector, beyond the structure or in it")
    energies: EnergyRange = Field(description="total energies at which T is wanted: {from:, to:, points:}")
    peaks: Annotated[int, Field(ge=0, le=100)] = Field(1, description="how many peaks of T are looked for")

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        return tuple(
            column
            for i in range(self.peaks)
            for column in (
                Column(f"{self.name}.peak[{i}].energy", "energy", f"energy of the top of peak {i} of T"),
                Column(f"{self.name}.peak[{i}].width", "energy", f"full width of peak {i} at half its height"),
                Column(f"{self.name}.peak[{i}].lifetime", "time", f"hbar over the width of peak {i}"),
            )
        )

    def meter(self, bench: Bench) -> Meter:
        return TransmissionMeter(bench, self)

    def misplaced(self, axis: Axis) -> tuple[str, str, str] | None:
        if not axis.low < self.x < axis.high:
            return "x", "the detector lies outside the grid", "move it or extend the grid"
        return None

    def unfit(self, bench: Bench, psi: Array) -> tuple[str, str, str] | None:
        if bench.hamiltonian.depends_on_time:
            said = "the potential changes in time: energy is not conserved, and a flux belongs to no one energy"
            return "energies", said, "drop `in_time`, `path` and t, or use `crossing`"
        approach = Approach(bench, psi, self.x)
        return (
            self._misplaced(approach)
            or self._uneven(approach)
            or self._too_early(approach)
            or self._without_energies(approach)
        )

    def _misplaced(self, approach: Approach) -> tuple[str, str, str] | None:
        (low, high), written = approach.span, approach.written
        if not low < self.x < high:
            return (
                "x",
                "the detector stands in an absorbing layer",
                f"keep it from {written(low)} to {written(high)}",
            )
        passed = float(approach.density[approach.ahead > abs(self.x - approach.start)].sum())
        if passed > ASTRAY:
            said = f"{passed:.1e} of the packet starts beyond the detector"
            return "x", said, "move one of the two away from the other"
        return None

    def _uneven(self, approach: Approach) -> tuple[str, str, str] | None:
        """Where the potential is not flat at the start and behind it."""
        x, uneven, away = approach.axis.x, approach.uneven, np.abs(approach.ahead)
        started = float(approach.density[uneven].sum())
        if started > ASTRAY:
            nearest = approach.written(x[uneven][np.argmin(away[uneven])])
            said = (
                f"the potential is not flat where the packet starts: it changes at {nearest}, "
                f"and {started:.1e} of the packet stands beyond"
            )
            return "x", said, f"start the packet farther from {nearest}, or make it narrower"
        low, high = approach.span
        rear = uneven & (x > low) & (x < high) & (approach.ahead < 0)
        if rear.any():
            nearest = approach.written(x[rear][np.argmin(away[rear])])
            said = f"behind the start the potential changes at {nearest} and sends back what was reflected"
            return "x", said, "start the packet on the other side of it, or keep the potential flat there"
        return None

    def _too_early(self, approach: Approach) -> tuple[str, str, str] | None:
        """Where the detector stands between start and structure."""
        structure = approach.ahead[approach.uneven & (approach.ahead > 0)]
        if structure.size and abs(self.x - approach.start) < structure.min():
            first = approach.written(approach.start + approach.forward * float(structure.min()))
            return "x", "the detector stands between the start and the structure", f"move it beyond {first}"
        return None

    def _without_energies(self, approach: Approach) -> tuple[str, str, str] | None:
        if approach.relative_weight(self.energies.values).max() >= SMALLEST_WEIGHT:
            return None
        held = approach.held()
        if held is None:
            return "x", "nothing of the packet moves towards the detector", "turn one of the two round"
        cure = "ask for those, or give the packet another energy or a smaller sigma"
        return "energies", HELD.format(*(approach.written(e, "energy") for e in held)), cure

    def doubtful(self, bench: Bench, psi: Array) -> tuple[str, str, str] | None:
        approach, values = Approach(bench, psi, self.x), self.energies.values
        missing = int(np.sum(approach.relative_weight(values) < SMALLEST_WEIGHT))
        held = approach.held()
        if not missing or held is None:
            return None
        said = HELD.format(*(approach.written(e, "energy") for e in held))
        cure = "ask for those, or make the packet narrower"
        return "energies", f"{said}: {missing} of {len(values)} energies stay without a value", cure
