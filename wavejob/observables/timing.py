"""When a packet arrives at a place, and how long it dwells in a region."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from ..results import Check, Column
from ..state import Look
from .base import Bench, Meter, Outline, Series
from .integrals import Samples, running
from .places import NOTHING, Crossing, CrossingMeter, Inside, InsideMeter, probability
from .swarm import ClassicalMeter, History

Array = np.ndarray

BACKWARD_LIMIT = 1e-3  # of what arrives: beyond it a flux is no distribution of arrival times
LATE_LIMIT = 1e-3  # share that is still to come


class Arrival(Crossing):
    """The distribution of arrival times at a detector: its flux over the integral of the flux.

    `.mean` and `.sigma` are mean and standard deviation of this distribution. Where probability also flows
    back through the detector, the flux is no distribution of times and the figures are doubtful.
    """

    def columns(self, outline: Outline) -> tuple[Column, ...]:
        return (Column(self.name, "flux", "density of arrival times"),)

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        return (
            Column(f"{self.name}.mean", "time", "mean arrival time"),
            Column(f"{self.name}.sigma", "time", "standard deviation of the arrival time"),
        )

    def classical(self, bench: Bench) -> ClassicalMeter:
        def figures(history: History) -> dict[str, float | None]:
            passing = history.passing(self.x)
            flow = passing.toward * self.forward * passing.weight
            total = float(flow.sum())
            if total <= NOTHING:
                return {f"{self.name}.mean": None, f"{self.name}.sigma": None}
            mean = float(flow @ passing.t) / total
            variance = float(flow @ (passing.t - mean) ** 2) / total
            return {f"{self.name}.mean": mean, f"{self.name}.sigma": float(np.sqrt(max(variance, 0.0)))}

        return ClassicalMeter(lambda _: {}, figures, place=self.x)

    def meter(self, bench: Bench) -> Meter:
        return ArrivalMeter(bench, self)

    def unfit(self, bench: Bench, psi: Array) -> tuple[str, str, str] | None:
        axis = bench.axis
        for layer in bench.hamiltonian.layers:
            inside = (self.x - axis.low) / axis.spacing - layer.first
            if 0 <= inside <= layer.rate.size:
                return "x", f"the detector stands in the absorbing layer {layer.name}", "move it out"
        ahead = 1.0 if self.toward == "+x" else -1.0
        there = float(np.sum(np.abs(psi[ahead * (axis.x - self.x) > 0]) ** 2) * axis.spacing)
        if there > BACKWARD_LIMIT:
            return "x", f"{there:.1e} of the packet starts beyond the detector", "move it or turn it round"
        return None


class ArrivalMeter(CrossingMeter):
    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        times, flux = self.flux.thinned(stride)
        total = float(running(times, flux)[-1])
        if total <= NOTHING:
            return {f"{self.name}.mean": None, f"{self.name}.sigma": None}
        mean = float(running(times, times * flux)[-1]) / total
        variance = float(running(times, (times - mean) ** 2 * flux)[-1]) / total
        sigma = float(np.sqrt(variance)) if variance >= 0 else None
        return {f"{self.name}.mean": mean, f"{self.name}.sigma": sigma}

    def finished(self, series: Series) -> Series:
        total = float(running(*self.flux.thinned(1))[-1])
        return Series(series.times, series.values / total if total > NOTHING else series.values * np.nan)

    def notes(self) -> dict[str, str]:
        return {
            f"{self.name}.mean": "nothing arrived",
            f"{self.name}.sigma": "nothing arrived, or so much went back that the flux is no distribution",
        }

    def _late(self) -> float:
        """Share that would still arrive if the flux at the end went on for as long as the run was."""
        times, flux = self.flux.thinned(1)
        total = float(running(times, flux)[-1])
        return abs(float(flux[-1])) * (self.bench.stop - self.bench.start) / total if total > NOTHING else 0.0

    def own_errors(self) -> dict[str, dict[str, float]]:
        missed = self._late() * (self.bench.stop - self.bench.start)
        return {f"{self.name}.{what}": {"run length": missed} for what in ("mean", "sigma")}

    def checks(self) -> list[Check]:
        figures = super().results(Series(np.empty(0), np.empty((0, 1))))
        total, backward = figures[f"{self.name}.total"] or 0.0, figures[f"{self.name}.backward"] or 0.0
        share, late = backward / max(total, backward, NOTHING), self._late()
        return [
            Check(
                f"{self.name}: flux backwards",
                share <= BACKWARD_LIMIT,
                share,
                BACKWARD_LIMIT,
                "where probability also flows back, the flux is no distribution of arrival times",
                "" if share <= BACKWARD_LIMIT else "move the detector to where the packet only passes once",
            ),
            Check(
                f"{self.name}: run length",
                late <= LATE_LIMIT,
                late,
                LATE_LIMIT,
                "share that would still arrive if the flux at the end went on as long as the run",
                "" if late <= LATE_LIMIT else "set `evolve.until` later",
            ),
        ]


class Dwell(Inside):
    """How long the packet stays between two places: the integral over time of the probability there.

    It is not divided by the probability of transmission or reflection (Buettiker 1983).
    """

    def columns(self, outline: Outline) -> tuple[Column, ...]:
        return ()

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        return (Column(f"{self.name}.time", "time", "integral over time of the probability in the region"),)

    def classical(self, bench: Bench) -> ClassicalMeter:
        inside = f"{self.name}.inside"
        return ClassicalMeter(
            lambda swarm: {inside: swarm.between(self.start, self.stop)},
            lambda history: {f"{self.name}.time": float(np.trapezoid(history.rows[inside], history.times))},
        )

    def meter(self, bench: Bench) -> Meter:
        return DwellMeter(bench, self)


class DwellMeter(InsideMeter):
    samples = True

    def __init__(self, bench: Bench, dwell: Dwell) -> None:
        super().__init__(bench, dwell)
        self.inside = Samples()

    def sample(self, look: Look) -> None:
        self.inside.add(look.t, probability(look, self.bench.axis, self.weights))

    def row(self, look: Look) -> Sequence[float]:
        return ()

    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        return {f"{self.name}.time": float(running(*self.inside.thinned(stride))[-1])}

    def _late(self) -> float:
        """What would be added if the probability at the end fell off over the time that the run was long."""
        times, inside = self.inside.thinned(1)
        return float(inside[-1] * (times[-1] - times[0]))

    def own_errors(self) -> dict[str, dict[str, float]]:
        return {f"{self.name}.time": {"run length": self._late()}}

    def checks(self) -> list[Check]:
        total = float(running(*self.inside.thinned(1))[-1])
        share = self._late() / total if total > 0 else 0.0
        return [
            Check(
                f"{self.name}: run length",
                share <= LATE_LIMIT,
                share,
                LATE_LIMIT,
                "share of it that would be added if what is still inside stayed as long as the run",
                "" if share <= LATE_LIMIT else "set `evolve.until` later, or read it as the time so far",
            )
        ]
