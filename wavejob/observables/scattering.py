"""The meter of `transmission`: three places watched, and what they say at each energy."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from functools import cached_property
from typing import TYPE_CHECKING

import numpy as np

from ..results import Check, Column, Curve
from ..state import Look
from .approach import SMALLEST_WEIGHT, Approach, Incoming
from .base import Bench, Meter, Series
from .peaks import Peak, find_peaks, peak_near
from .remainder import Remainder
from .stationary import Probes

if TYPE_CHECKING:
    from .transmission import Transmission

Array = np.ndarray

LATE_LIMIT = 1e-3  # change of T or R by what is still under way, where the packet has weight
SUM_LIMIT = 1e-3  # of R + T from 1, averaged over the packet
HEAVY = 1e-3  # weight from which on an energy counts for these two
FINEST = 4001  # energies at which peaks are looked for, at the most
PER_RESOLUTION = 8  # of them in 2 pi hbar / duration, the width of the narrowest peak a run can show


@dataclass(frozen=True)
class Flow:
    """What flows at some energies, each (energies,), nan where the packet has too little weight."""

    T: Array
    R: Array
    phase: Array  # in (-pi, pi]
    phase_time: Array
    returned: Array  # amplitude that comes back from beyond, over that coming in
    again: Array  # amplitude that comes in a second time from behind, over that coming in


class TransmissionMeter(Meter):
    samples = True

    def __init__(self, bench: Bench, transmission: Transmission) -> None:
        self.bench, self.asked = bench, transmission
        self.energies = transmission.energies.values

    def start(self, look: Look) -> None:
        self.approach = Approach(self.bench, look.psi[0, 0].copy(), self.asked.x)
        self.places = (self.asked.x, self.approach.behind, self.approach.beyond)
        self.probes = Probes(self.bench.axis, self.places, self.bench.start)

    def sample(self, look: Look) -> None:
        self.probes.add(look.t, look.psi[0, 0])

    def row(self, look: Look) -> Sequence[float]:
        self.last, self.ended = look.psi[0, 0].copy(), look.t
        return ()

    @cached_property
    def remainder(self) -> Remainder:
        """What has not passed the places at the end of the run."""
        return Remainder(self.bench, self.last, self.ended, float(self.energies[-1]))

    @cached_property
    def asked_flow(self) -> tuple[Flow, Flow, Incoming]:
        """At the energies asked for: as measured, with what is still under way, and what came in."""
        measured, came = self.flow(self.energies)
        completed, _ = self.flow(self.energies, completed=True)
        return measured, completed, came

    def flow(self, energies: Array, *, stride: int = 1, completed: bool = False) -> tuple[Flow, Incoming]:
        """What flows at `energies`; `completed` counts what is still under way at the end of the run."""
        came = self.approach.incoming(energies)
        held = self.approach.weight_of(came) >= SMALLEST_WEIGHT
        fields = self.probes.at(energies, stride)
        if completed:
            fields = fields + self.remainder.at(np.where(held, energies, np.nan), self.places)
        with np.errstate(divide="ignore", invalid="ignore"):
            flow = self._flow(energies, came, fields)
        blank = {name: np.where(held, values, np.nan) for name, values in vars(flow).items()}
        return Flow(**blank), came

    def _flow(self, energies: Array, came: Incoming, fields: Array) -> Flow:
        mass, forward, k = self.bench.mass, self.approach.forward, came.k
        velocity = k / mass
        at_detector, behind, beyond = fields
        in_flux = 2 * np.pi * np.abs(came.amplitude) ** 2 / velocity
        transmitted = forward * _flux(at_detector, mass)
        # Behind the start, what moves away from the beginning on is taken off.
        parting = np.sqrt(2 * np.pi) / velocity * came.away * np.exp(-1j * forward * k * self.places[1])
        returning = np.stack([behind[0] - parting, behind[1] + 1j * forward * k * parting])
        free = np.sqrt(2 * np.pi) / velocity * came.amplitude * np.exp(1j * forward * k * self.places[0])
        step = float(self.bench.landscape.value(np.array([self.places[2]]), self.bench.start)[0])
        out = np.sqrt(2 * mass * np.maximum(energies - step, 0.0))
        back = np.where(out > 0, beyond[0] - beyond[1] / (1j * forward * out), 0.0) / 2
        return Flow(
            T=transmitted / in_flux,
            R=-forward * _flux(returning, mass) / in_flux,
            phase=np.angle(at_detector[0] / free),
            phase_time=(at_detector[2] / at_detector[0]).real - forward * (self.places[0] - came.centre) / velocity,
            returned=np.abs(back) * np.sqrt(out / mass / in_flux),
            again=np.abs(returning[0] + returning[1] / (1j * forward * k)) / 2 / np.abs(free),
        )

    def curves(self) -> list[Curve]:
        flow, late, came = self.asked_flow
        weight = self.approach.weight_of(came)
        phase = _unwrapped(self.energies, flow.phase, flow.phase_time, weight)
        columns = (
            Column("energy", "energy", "total energy"),
            Column("T", "number", "transmitted over incident flux"),
            Column("R", "number", f"reflected over incident flux, at {self._shown(self.places[1])}"),
            Column("phase", "angle", "phase at the detector against the packet without potential"),
            Column("phase_time", "time", "hbar d(phase)/d(energy): delay against the packet without potential"),
            Column("weight", "number", "density of the packet's wave number, over its largest value"),
        )
        rows = np.stack([self.energies, flow.T, flow.R, phase, flow.phase_time, weight], axis=1)
        return [Curve(self.asked.name, columns, rows, _errors(self, flow, late, came))]

    def _shown(self, x: float) -> str:
        return self.bench.units.rounded(x, "length")

    def _scan(self) -> Array:
        """Energies close enough to see every peak that the run is long enough to show."""
        low, high = float(self.energies[0]), float(self.energies[-1])
        needed = PER_RESOLUTION * (high - low) * (self.ended - self.bench.start) / (2 * np.pi)
        return np.linspace(low, high, int(np.clip(needed, len(self.energies), max(FINEST, len(self.energies)))))

    def peaks(self, stride: int = 1) -> list[Peak]:
        return find_peaks(lambda e: self.flow(e, stride=stride)[0].T, self._scan(), self.asked.peaks)

    def _names(self, index: int) -> tuple[str, str, str]:
        name = f"{self.asked.name}.peak[{index}]"
        return f"{name}.energy", f"{name}.width", f"{name}.lifetime"

    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        if not self.asked.peaks:
            return {}
        values: dict[str, float | None] = {}
        found = self.peaks(stride)
        for index in range(self.asked.peaks):
            peak = found[index] if index < len(found) else None
            width = peak.width if peak else None
            figures = (peak.energy if peak else None, width, 1 / width if width else None)
            values.update(zip(self._names(index), figures, strict=True))
        if stride == 1:
            self.found = found
        return values

    def notes(self) -> dict[str, str]:
        notes = {}
        for index in range(self.asked.peaks):
            energy, width, lifetime = self._names(index)
            notes[energy] = f"T has {len(self.found)} peaks where the packet has weight"
            notes[width] = notes[lifetime] = (
                "T does not fall to half of this peak on both sides where the packet has weight"
                if index < len(self.found)
                else notes[energy]
            )
        return notes

    def own_errors(self) -> dict[str, dict[str, float]]:
        """How peaks change when what is still under way at the end of the run is counted."""
        errors = {}
        for index, peak in enumerate(self.found if self.asked.peaks else []):
            near = self._completed(peak)
            energy, width, lifetime = self._names(index)
            errors[energy] = {"run length": abs(near.energy - peak.energy)}
            if peak.width is not None:
                change = abs(near.width - peak.width) if near.width is not None else peak.width
                errors[width] = {"run length": change}
                errors[lifetime] = {"run length": change / peak.width / max(peak.width - change, peak.width / 10)}
        return errors

    def _completed(self, peak: Peak) -> Peak:
        if self.remainder.empty:
            return peak

        def value(energies: Array) -> Array:
            return self.flow(energies, completed=True)[0].T

        reach = 1.5 * (peak.width or 0.0) + 2 * np.pi / (self.ended - self.bench.start)
        near = peak.energy + np.linspace(-reach, reach, 41)
        values = value(near)
        return peak_near(value, near, values, int(np.nanargmax(values)))

    def checks(self) -> list[Check]:
        flow, late, came = self.asked_flow
        weight = self.approach.weight_of(came)
        heavy = weight >= HEAVY
        change = np.fmax(np.abs(late.T - flow.T), np.abs(late.R - flow.R))
        largest = float(np.nanmax(change[heavy], initial=0.0))
        held = np.isfinite(flow.T)
        apart = float(np.average(np.abs(1 - flow.R - flow.T)[held], weights=weight[held])) if held.any() else 0.0
        advice = f"set `evolve.until` to at least {self.bench.units.rounded(self._until(largest), 'time')}"
        name = self.asked.name
        return [
            Check(
                f"{name}: run length",
                largest <= LATE_LIMIT,
                largest,
                LATE_LIMIT,
                "change of T or R by what has not left the structure or not arrived when the run ends",
                "" if largest <= LATE_LIMIT else advice,
            ),
            Check(
                f"{name}: R + T",
                apart <= SUM_LIMIT,
                apart,
                SUM_LIMIT,
                f"R + T is 1 without loss, R measured at {self._shown(self.places[1])}; mean over the packet",
                "" if apart <= SUM_LIMIT else f"{advice}, give deeper absorbing layers, or more `points`",
            ),
        ]

    def _until(self, change: float) -> float:
        """When what is under way will have left: the lifetime of the narrowest peak, or as long again."""
        duration = self.ended - self.bench.start
        widths = [peak.width for peak in (self.found if self.asked.peaks else []) if peak.width]
        ringing = 2 * np.log(max(change / LATE_LIMIT, 1.0)) / min(widths) if widths else duration
        return self.bench.start + duration + max(float(ringing), duration / 2)


def _flux(field: Array, mass: float) -> Array:
    """Stationary flux of rows psi, psi'."""
    return np.asarray((field[0].conj() * field[1]).imag / mass)


def _unwrapped(energies: Array, phase: Array, slope: Array, weight: Array) -> Array:
    """The phase without jumps, by its slope; within (-pi, pi] where the packet has most weight."""
    held = np.flatnonzero(np.isfinite(phase))
    if not held.size:
        return phase
    rise = np.diff(energies[held]) * (slope[held][1:] + slope[held][:-1]) / 2
    expected = np.concatenate([[0.0], np.cumsum(rise)])
    anchor = int(np.argmax(weight[held]))
    expected += phase[held][anchor] - expected[anchor]
    turns = np.round((expected - phase[held]) / (2 * np.pi))
    found = phase.copy()
    found[held] += 2 * np.pi * (turns - turns[anchor])
    return found


def _errors(meter: TransmissionMeter, flow: Flow, late: Flow, came: Incoming) -> dict[str, Array]:
    """What the method adds to the error of each column: by what comes back, strays, or is late."""
    low, high = meter.approach.span
    t, r = np.sqrt(np.abs(flow.T)), np.sqrt(np.abs(flow.R))
    back, again, stray = flow.returned, flow.again, came.stray
    squares = (back + again + stray) ** 2
    with np.errstate(divide="ignore", invalid="ignore"):
        astray = back * r + again * t + stray * (1 + t)
        transmitted = 2 * t * astray + squares
        reflected = 2 * r * (back * t + again * r + stray * (1 + r)) + squares
        share = np.minimum(astray / t, 1.0)
        detour = np.minimum(2 * (high - low) * meter.bench.mass / came.k, meter.ended - meter.bench.start)
        turned = np.abs(np.angle(np.exp(1j * (late.phase - flow.phase))))
    return {
        "T": transmitted + np.abs(late.T - flow.T),
        "R": reflected + np.abs(late.R - flow.R),
        "phase": np.minimum(np.pi * share + turned, np.pi),
        "phase_time": share * detour + np.abs(late.phase_time - flow.phase_time),
        "weight": np.zeros(len(t)),
    }
