"""Probability inside a region, and flux through a detector."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from pydantic import Field, model_validator

from ..grid import Axis
from ..models import Length, Name, in_order
from ..results import Check, Column
from ..state import Look
from .base import Bench, Meter, Observable, Outline, Series, Toward, time_average
from .integrals import Samples, positive_part, running
from .interpolant import at_point, fine_density, region_weights
from .swarm import ClassicalMeter, History, Swarm

Array = np.ndarray
ONE_WAY = 1e-3  # probability that crosses backwards, below which a detector is passed once
STARTS_BEYOND = 1e-6
STILL_COMING = 1e-3
NOTHING = 1e-12  # a crossed probability below this has no meaningful mean time


def probability(look: Look, axis: Axis, weights: Array) -> float:
    """The probability of the region with `weights` (interpolant.region_weights)."""
    density = look.cached("fine density", lambda: fine_density(axis, look.psi[0]).sum(0))
    return float(density @ weights)


class Inside(Observable):
    """The probability between two places."""

    name: Name = Field(description="name in the outputs")
    start: Length = Field(alias="from", description="left end")
    stop: Length = Field(alias="to", description="right end")

    @model_validator(mode="after")
    def _ordered(self) -> Inside:
        in_order(self, "start", "stop")
        return self

    def columns(self, outline: Outline) -> tuple[Column, ...]:
        return (Column(self.name, "number", "probability in the region"),)

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        return (
            Column(f"{self.name}.final", "number", "probability in the region at the end"),
            Column(f"{self.name}.peak", "number", "largest probability in the region recorded"),
            Column(f"{self.name}.peak_time", "time", "when it was largest"),
            Column(f"{self.name}.mean", "number", "probability in the region averaged over time"),
        )

    def classical_figures(self, outline: Outline) -> tuple[Column, ...]:
        return self.figures(outline)

    def classical(self, bench: Bench) -> ClassicalMeter:
        return ClassicalMeter(
            lambda swarm: {self.name: swarm.between(self.start, self.stop)},
            lambda history: region_figures(self.name, history.series(self.name)),
            counts=True,
        )

    def meter(self, bench: Bench) -> Meter:
        return InsideMeter(bench, self)

    def misplaced(self, axis: Axis) -> tuple[str, str, str] | None:
        if self.stop <= axis.low or self.start >= axis.high:
            return "from", "the region lies outside the grid", "move it or extend the grid"
        return None


class InsideMeter(Meter):
    def __init__(self, bench: Bench, inside: Inside) -> None:
        self.bench, self.name = bench, inside.name
        self.weights = region_weights(bench.axis, inside.start, inside.stop)

    def row(self, look: Look) -> Sequence[float]:
        return [probability(look, self.bench.axis, self.weights)]

    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        return region_figures(self.name, series)


def region_figures(name: str, series: Series) -> dict[str, float | None]:
    """What the probability in a region comes to."""
    values = series.values[:, 0]
    top, when = summit(series.times, values)
    return {
        f"{name}.final": float(values[-1]),
        f"{name}.peak": top,
        f"{name}.peak_time": when if top > 0 else None,
        f"{name}.mean": time_average(series),
    }


def summit(times: Array, values: Array) -> tuple[float, float]:
    """The largest value and its time: the top of the polynomial through the largest row and two on each side.

    Where there is one row only on a side, through three.
    """
    i = int(np.argmax(values))
    reach = min(i, len(values) - 1 - i, 2)
    if reach == 0:
        return float(values[i]), float(times[i])
    near = slice(i - reach, i + reach + 1)
    curve = np.polynomial.Polynomial.fit(times[near], values[near], 2 * reach)
    level = curve.deriv().roots()
    level = level.real[(np.abs(level.imag) < 1e-9) & (level.real >= times[i - 1]) & (level.real <= times[i + 1])]
    places = np.append(level, times[i])
    heights = curve(places)
    top = int(np.argmax(heights))
    return max(float(heights[top]), float(values[i])), float(places[top])


class Crossing(Observable):
    """The probability flux through a place, and its integral over time."""

    name: Name = Field(description="name in the outputs")
    x: Length = Field(description="place of the detector")
    toward: Toward = Field(description="direction that counts as forward")

    def columns(self, outline: Outline) -> tuple[Column, ...]:
        return (Column(self.name, "flux", "probability flux through the detector"),)

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        before = "probability at the end still before the detector and inside the grid"
        return (
            Column(f"{self.name}.total", "number", "probability that crossed the detector"),
            Column(f"{self.name}.backward", "number", "probability that crossed it backwards"),
            Column(f"{self.name}.mean_time", "time", "mean time of crossing"),
            Column(f"{self.name}.undecided", "number", before),
        )

    @property
    def forward(self) -> float:
        return 1.0 if self.toward == "+x" else -1.0

    def ahead(self, axis: Axis) -> tuple[float, float]:
        """The part of the axis before the detector."""
        return (axis.low, self.x) if self.forward > 0 else (self.x, axis.high)

    def classical_figures(self, outline: Outline) -> tuple[Column, ...]:
        return self.figures(outline)

    def classical(self, bench: Bench) -> ClassicalMeter:
        waiting = f"{self.name}.undecided"

        def figures(history: History) -> dict[str, float | None]:
            passing = history.passing(self.x)
            flow = passing.toward * self.forward * passing.weight
            total = float(flow.sum())
            return {
                f"{self.name}.total": total,
                f"{self.name}.backward": float(passing.weight[passing.toward != self.forward].sum()),
                f"{self.name}.mean_time": float(flow @ passing.t) / total if abs(total) > NOTHING else None,
                waiting: history.last(waiting),
            }

        def row(swarm: Swarm) -> dict[str, Array]:
            return {waiting: swarm.between(*self.ahead(bench.axis))}

        return ClassicalMeter(row, figures, place=self.x, counts=True)

    def meter(self, bench: Bench) -> Meter:
        return CrossingMeter(bench, self)

    def misplaced(self, axis: Axis) -> tuple[str, str, str] | None:
        if not axis.low < self.x < axis.high:
            return "x", "the detector lies outside the grid", "move it or extend the grid"
        return None


class CrossingMeter(Meter):
    samples = True

    def __init__(self, bench: Bench, crossing: Crossing) -> None:
        axis = bench.axis
        self.bench, self.name, self.x = bench, crossing.name, crossing.x
        self.forward = crossing.forward
        self.point = at_point(axis, crossing.x)
        self.before = region_weights(axis, *crossing.ahead(axis))
        self.flux = Samples()
        self.undecided, self.first_inside = 0.0, 1.0
        self.last = np.zeros((1, axis.points), complex)

    def start(self, look: Look) -> None:
        self.first_inside = probability(look, self.bench.axis, self.before)

    def _flux(self, look: Look) -> float:
        value, slope = self.point @ look.psi[0].T
        return self.forward * float(np.sum((value.conj() * slope).imag)) / self.bench.mass

    def sample(self, look: Look) -> None:
        self.flux.add(look.t, self._flux(look))

    def row(self, look: Look) -> Sequence[float]:
        self.undecided = probability(look, self.bench.axis, self.before)
        self.last[...] = look.psi[0]
        return [self._flux(look)]

    def checks(self) -> list[Check]:
        """Whether the packet starts before the detector, and whether what may still cross has crossed."""
        times, flux = self.flux.thinned(1)
        if positive_part(times, -flux) > ONE_WAY:
            return []  # things go to and fro here: there is no before and after
        coming, beyond, write = self._coming(), 1 - self.first_inside, self.bench.units.rounded
        late = write(2 * times[-1] - times[0], "time")
        behind = write(self.bench.axis.low if self.forward < 0 else self.bench.axis.high, "length")
        return [
            Check(
                f"start before {self.name}",
                beyond <= STARTS_BEYOND,
                beyond,
                STARTS_BEYOND,
                "what starts beyond a detector never crosses it",
                "" if beyond <= STARTS_BEYOND else f"move the detector towards {behind}, or the packet away from it",
            ),
            Check(
                f"undecided {self.name}",
                coming <= STILL_COMING,
                coming,
                STILL_COMING,
                "probability before the detector that moves towards it when the run ends",
                "" if coming <= STILL_COMING else f"set `evolve.until: {late}`",
            ),
        ]

    def _coming(self) -> float:
        """Probability before the detector with momentum towards it, at the end; the cut is a packet's width soft."""
        axis = self.bench.axis
        soft = max(4 * axis.spacing, self.bench.scale("length") / 4)
        kept = 0.5 * (1 + np.tanh(self.forward * (self.x - axis.x) / soft))
        waves = np.fft.fft(self.last * np.sqrt(kept))
        k = 2 * np.pi * np.fft.fftfreq(axis.points, axis.spacing)
        return float(np.sum(np.abs(waves[:, self.forward * k > 0]) ** 2) * axis.spacing / axis.points)

    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        times, flux = self.flux.thinned(stride)
        total = float(running(times, flux)[-1])
        late = float(running(times, times * flux)[-1])
        return {
            f"{self.name}.total": total,
            f"{self.name}.backward": positive_part(times, -flux),
            f"{self.name}.mean_time": late / total if abs(total) > NOTHING else None,
            f"{self.name}.undecided": self.undecided,
        }

    def progress(self) -> list[tuple[str, Array, Array]]:
        times, flux = self.flux.thinned(1)
        return [(self.name, times, running(times, flux))]

    def notes(self) -> dict[str, str]:
        return {f"{self.name}.mean_time": "nothing crossed"}
