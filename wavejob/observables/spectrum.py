"""Energies and weights of the states a packet is made of, from its autocorrelation."""

from __future__ import annotations

import math
from typing import Annotated

import numpy as np
from pydantic import Field

from ..models import Name, PositiveEnergy, Quantity
from ..results import Check, Column, Curve
from ..state import Look
from .base import Bench, Meter, Observable, Outline, Series
from .integrals import every
from .lines import LEAKAGE, Lines, Signal, hidden_splitting, resolution

Array = np.ndarray

ONE_LINE = 1e-3  # deviation from one line shape, over its height, beyond which a line is not one
CURVE_SIGMAS = 8.0  # standard deviations of energy that the curve covers
PER_RESOLUTION = 4  # rows of the curve in one resolution
MOST_ROWS = 20001

Lightest = Annotated[float, Quantity("number", at_least=1e-5, at_most=1.0)]


class Spectrum(Observable):
    """The lines of the packet: energies of the states it is made of, and the probability of each.

    The overlap <psi(0), psi(t)>, times a Kaiser window (beta 14), is Fourier transformed. A line leaks at
    most 5.1e-6 of its height to other energies, and what the lines found leak into each other is taken off
    by fitting all their heights and places together. Lines closer than `.resolution` = 14.35 hbar / duration
    may not be told apart: a line whose shape differs from that of one line by more than 1e-3 is said to be
    unresolved (two lines, or a state that decays), and its error bar covers the splitting this allows.

    `.line[i]` are the energies of the `lines` lowest lines of weight above `weight_above`, in rising order,
    `.weight[i]` their probabilities. A state the packet does not contain is not seen: i is no quantum number.
    """

    name: Name = Field("spectrum", description="name in the outputs")
    lines: Annotated[int, Field(ge=1, le=400)] = Field(1, description="how many lines are listed, from the lowest on")
    weight_above: Lightest = Field(1e-3, description="probability from which on a line is listed")
    resolution: PositiveEnergy | None = Field(
        None, description="lines this far apart must be told apart: a run that is too short is refused"
    )

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        closest = "lines closer than this may not be told apart"
        lines = tuple(
            column
            for i in range(self.lines)
            for column in (
                Column(
                    f"{self.name}.line[{i}]",
                    "energy",
                    f"energy of line {i} of weight above {self.weight_above:g}",
                ),
                Column(f"{self.name}.weight[{i}]", "number", f"probability of line {i}"),
            )
        )
        return (*lines, Column(f"{self.name}.resolution", "energy", closest))

    def meter(self, bench: Bench) -> Meter:
        return SpectrumMeter(bench, self)

    def unfit(self, bench: Bench, psi: Array) -> tuple[str, str, str] | None:
        if bench.hamiltonian.depends_on_time:
            said = "the potential changes in time, so that there are no energies to be seen"
            return "name", said, "drop `in_time`, `path` and t, or use `autocorrelation`"
        duration = bench.stop - bench.start
        reached = resolution(duration)
        if self.resolution is not None and reached > self.resolution:
            until = bench.start + 1.001 * duration * reached / self.resolution
            said = f"a run this long tells lines apart only from {bench.units.rounded(reached, 'energy')} on"
            return "resolution", said, f"set `evolve.until: {bench.units.rounded(until, 'time')}`"
        return None


class SpectrumMeter(Meter):
    samples = True

    def __init__(self, bench: Bench, asked: Spectrum) -> None:
        self.bench, self.asked = bench, asked
        self.overlaps: list[complex] = []
        self.times: list[float] = []

    def start(self, look: Look) -> None:
        axis, psi = self.bench.axis, look.psi[0, 0]
        self.state = psi.conj() * axis.spacing
        potential = self.bench.hamiltonian.potential(look.t)[0, 0]
        kinetic = float(look.momentum_density[0].sum(0) @ axis.k**2) / (2 * self.bench.mass)
        self.mean = kinetic + float(look.density[0].sum(0) @ potential) * axis.spacing
        self.bottom = float(potential.min())
        self.sigma = self._spread(psi, potential)

    def _spread(self, psi: Array, potential: Array) -> float:
        """Standard deviation of energy."""
        axis = self.bench.axis
        if axis.transform == "sine":
            from scipy import fft

            amplitudes = fft.dst(psi.real, type=2) + 1j * fft.dst(psi.imag, type=2)
            amplitudes *= axis.k**2
            bent = fft.idst(amplitudes.real, type=2) + 1j * fft.idst(amplitudes.imag, type=2)
        else:
            bent = np.fft.ifft(axis.k**2 * np.fft.fft(psi))
        applied = bent / (2 * self.bench.mass) + (potential - self.mean) * psi
        return math.sqrt(float(np.vdot(applied, applied).real * axis.spacing))

    def sample(self, look: Look) -> None:
        self.times.append(look.t - self.bench.start)
        self.overlaps.append(complex(self.state @ look.psi[0, 0]))

    def _signal(self, stride: int = 1) -> Signal:
        """The samples of every `stride`-th time; a last one at another distance is left out."""
        kept = every(stride, len(self.times))
        if len(kept) > 2 and (kept[-1] - kept[-2]) != stride:
            kept = kept[:-1]
        times, values = np.array(self.times)[kept], np.array(self.overlaps)[kept]
        return Signal(float(times[-1] - times[0]) / (len(times) - 1), values)

    def _lines(self, stride: int = 1) -> Lines:
        signal = self._signal(stride)
        reach = self.sigma / math.sqrt(self.asked.weight_above)  # no line of this weight is farther (Chebyshev)
        margin = resolution(signal.duration)
        low = max(self.bottom, self.mean - reach) - margin
        high = min(self.mean + reach + margin, low + 0.98 * 2 * np.pi / signal.spacing)
        found = signal.lines(low, high, self.asked.weight_above)
        listed = slice(self.asked.lines)
        return Lines(found.energies[listed], found.weights[listed], found.deviations[listed])

    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        lines, name = self._lines(stride), self.asked.name
        if stride == 1:
            self.found = lines
        values: dict[str, float | None] = {}
        for i in range(self.asked.lines):
            there = i < len(lines.energies)
            values[f"{name}.line[{i}]"] = float(lines.energies[i]) if there else None
            values[f"{name}.weight[{i}]"] = float(lines.weights[i]) if there else None
        return {**values, f"{name}.resolution": resolution(self._signal().duration)}

    def notes(self) -> dict[str, str]:
        count, name = len(self.found.energies), self.asked.name
        said = f"the packet holds only {count} lines of weight above {self.asked.weight_above:g}"
        return {f"{name}.{kind}[{i}]": said for i in range(count, self.asked.lines) for kind in ("line", "weight")}

    def own_errors(self) -> dict[str, dict[str, float]]:
        """What the shape of each line allows it to be beside one line."""
        duration, name, errors = self._signal().duration, self.asked.name, {}
        for i, (weight, away) in enumerate(zip(self.found.weights, self.found.deviations, strict=True)):
            hidden = float(hidden_splitting(away / weight, duration))
            errors[f"{name}.line[{i}]"] = {"resolution": min(hidden, resolution(duration))}
            errors[f"{name}.weight[{i}]"] = {"resolution": 2 * float(away)}
        return errors

    def checks(self) -> list[Check]:
        if not len(self.found.energies):
            return []
        duration, units = self._signal().duration, self.bench.units
        deviations = self.found.deviations / self.found.weights
        worst = int(np.argmax(deviations))
        passed = bool(deviations[worst] <= ONE_LINE)
        unresolved = ", ".join(f"line[{i}]" for i in np.flatnonzero(deviations > ONE_LINE))
        longer = duration * resolution(duration) / float(hidden_splitting(deviations[worst], duration))
        until = units.rounded(self.bench.start + max(longer, 1.5 * duration), "time")
        closest = units.rounded(resolution(duration), "energy")
        return [
            Check(
                f"{self.asked.name}: lines resolved",
                passed,
                float(deviations[worst]),
                ONE_LINE,
                f"deviation from the shape of one line; the window leaks at most {LEAKAGE:.1e}",
                ""
                if passed
                else f"not resolved: {unresolved} is more than one line within {closest}, or decays; "
                f"set `evolve.until: {until}`",
            )
        ]

    def curves(self) -> list[Curve]:
        signal = self._signal()
        margin = resolution(signal.duration)
        low = max(self.bottom, self.mean - CURVE_SIGMAS * self.sigma) - margin
        high = self.mean + CURVE_SIGMAS * self.sigma + margin
        count = int(np.clip(math.ceil((high - low) / margin * PER_RESOLUTION) + 1, 9, MOST_ROWS))
        step = (high - low) / (count - 1)
        columns = (
            Column("energy", "energy"),
            Column("intensity", "number", "probability of a line, seen through the window"),
        )
        rows = np.stack([low + step * np.arange(count), signal.intensity(low, step, count)], axis=1)
        return [Curve(self.asked.name, columns, rows, {"intensity": np.full(count, LEAKAGE)})]
