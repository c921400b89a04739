"""Norm, mean values and their balance laws."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from typing import ClassVar

import numpy as np

from ..results import Check, Column
from ..state import Look
from .base import Bench, Meter, Observable, Outline, Series, over_time, summary
from .integrals import Samples, running
from .interpolant import gradient
from .swarm import ClassicalMeter, History, Swarm

Array = np.ndarray
LEAST_ENERGY_LIMIT = 1e-8  # what rounding leaves of a balance over many steps
ABSORBED_TOO_MUCH = 1e-8  # beyond this, Ehrenfest's theorem does not hold for what is left


def place_density(look: Look) -> Array:
    """Probability per length, summed over channels, shape (points,)."""
    return np.asarray(look.density[0].sum(0))


def norm(look: Look) -> float:
    return float(look.norm[0])


def mean_place(look: Look, bench: Bench) -> float:
    return float(place_density(look) @ bench.axis.x * bench.axis.spacing) / norm(look)


def place_width(look: Look, bench: Bench) -> float:
    away = bench.axis.x - mean_place(look, bench)
    return float(np.sqrt(place_density(look) @ away**2 * bench.axis.spacing / norm(look)))


def mean_momentum(look: Look, bench: Bench) -> float:
    """<p> = Im of the integral of psi* psi'."""
    psi = look.psi[0]
    slopes = look.cached("gradient", lambda: gradient(bench.axis, psi))
    return float(np.vdot(psi, slopes).imag * bench.axis.spacing) / norm(look)


def kinetic_energy(look: Look, bench: Bench) -> float:
    """<p^2> / 2m, not divided by the norm."""
    return float((look.momentum_density[0].sum(0) @ bench.axis.k**2) / (2 * bench.mass))


def potential_on_grid(look: Look, bench: Bench) -> Array:
    return np.asarray(look.cached("potential", lambda: bench.hamiltonian.potential(look.t)[0, 0]))


def potential_energy(look: Look, bench: Bench) -> float:
    """<V>, not divided by the norm."""
    return float(place_density(look) @ potential_on_grid(look, bench) * bench.axis.spacing)


def mean_force(look: Look, bench: Bench) -> float:
    """(2 / hbar) Im <p psi, V psi>, which needs no derivative of V."""
    psi = look.psi[0]
    slopes = look.cached("gradient", lambda: gradient(bench.axis, psi))
    push = np.vdot(-1j * slopes, potential_on_grid(look, bench) * psi)
    return float(2 * push.imag * bench.axis.spacing) / norm(look)


def swarm_place(swarm: Swarm) -> Array:
    return swarm.mean(swarm.x)


def swarm_width(swarm: Swarm) -> Array:
    return swarm.deviation(swarm.x)


def swarm_momentum(swarm: Swarm) -> Array:
    return swarm.mean(swarm.p)


def swarm_force(swarm: Swarm) -> Array:
    """Not a number where there are sharp edges: a trajectory feels them for no time at all."""
    sharp = swarm.landscape.edges(swarm.t)[0].size > 0
    return swarm.mean(swarm.force) * (np.nan if sharp else 1.0)


class Norm(Observable):
    """The norm, what each absorbing end took, and whether the two add up to 1."""

    def columns(self, outline: Outline) -> tuple[Column, ...]:
        return (
            Column("norm", meaning="probability on the grid"),
            *(Column(f"absorbed.{name}", meaning=f"probability absorbed at {name}") for name in outline.layers),
        )

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        return (
            Column("norm.final", meaning="probability on the grid at the end"),
            Column("norm.drift", meaning="largest abs(norm + absorbed - 1)"),
            *(Column(f"absorbed.{name}", meaning=f"probability absorbed at {name}") for name in outline.layers),
        )

    def classical_figures(self, outline: Outline) -> tuple[Column, ...]:
        return tuple(figure for figure in self.figures(outline) if figure.name != "norm.drift")

    def classical(self, bench: Bench) -> ClassicalMeter:
        absorbed = [layer.name for layer in bench.hamiltonian.layers]

        def figures(history: History) -> dict[str, float | None]:
            taken = {f"absorbed.{name}": history.last(f"absorbed.{name}") for name in absorbed}
            return {"norm.final": history.last("norm"), **taken}

        return ClassicalMeter(
            lambda swarm: {"norm": swarm.norm, **{f"absorbed.{name}": swarm.absorbed[name] for name in absorbed}},
            figures,
        )

    def meter(self, bench: Bench) -> Meter:
        return NormMeter([layer.name for layer in bench.hamiltonian.layers])


class NormMeter(Meter):
    def __init__(self, layers: list[str]) -> None:
        self.layers = layers
        self.drift = 0.0

    def row(self, look: Look) -> Sequence[float]:
        absorbed = [float(look.absorbed[name][0]) for name in self.layers]
        self.drift = max(self.drift, abs(norm(look) + sum(absorbed) - 1))
        return [norm(look), *absorbed]

    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        taken = {f"absorbed.{name}": float(series.values[-1, 1 + i]) for i, name in enumerate(self.layers)}
        return {"norm.final": float(series.values[-1, 0]), "norm.drift": self.drift, **taken}


class Moment(Observable):
    """A mean value along each axis."""

    title: ClassVar[str]
    dimension: ClassVar[str]
    what: ClassVar[str]
    measure: ClassVar[Callable[[Look, Bench], float]]
    of_swarm: ClassVar[Callable[[Swarm], Array]]

    def columns(self, outline: Outline) -> tuple[Column, ...]:
        return tuple(Column(f"{self.title}.{axis}", self.dimension, self.what) for axis in outline.axes)

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        return tuple(
            figure
            for axis in outline.axes
            for figure in over_time(f"{self.title}.{axis}", self.dimension, f"{self.what} along {axis}")
        )

    def classical_figures(self, outline: Outline) -> tuple[Column, ...]:
        return self.figures(outline)

    def classical(self, bench: Bench) -> ClassicalMeter:
        name, of_swarm = f"{self.title}.{bench.axis.name}", type(self).of_swarm
        return ClassicalMeter(
            lambda swarm: {name: of_swarm(swarm)}, lambda history: summary(name, history.series(name))
        )

    def meter(self, bench: Bench) -> Meter:
        return MomentMeter(bench, f"{self.title}.{bench.axis.name}", type(self).measure)


class MomentMeter(Meter):
    def __init__(self, bench: Bench, name: str, measure: Callable[[Look, Bench], float]) -> None:
        self.bench, self.name, self.measure = bench, name, measure

    def row(self, look: Look) -> Sequence[float]:
        return [self.measure(look, self.bench)]

    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        return summary(self.name, series)


class Position(Moment):
    """Mean position along each axis."""

    title, dimension, what = "position", "length", "mean position"
    measure, of_swarm = mean_place, swarm_place


class Momentum(Moment):
    """Mean momentum along each axis."""

    title, dimension, what = "momentum", "momentum", "mean momentum"
    measure, of_swarm = mean_momentum, swarm_momentum


class Force(Moment):
    """Mean force along each axis, (2 / hbar) Im <p psi, V psi>: right for sharp edges too."""

    title, dimension, what = "force", "force", "mean force"
    measure, of_swarm = mean_force, swarm_force


class Width(Moment):
    """Standard deviation of position along each axis."""

    title, dimension, what = "width", "length", "standard deviation of position"
    measure, of_swarm = place_width, swarm_width


class Energy(Observable):
    """Total, kinetic and potential energy, and whether they balance with work done and energy absorbed."""

    def columns(self, outline: Outline) -> tuple[Column, ...]:
        return (
            Column("energy.total", "energy", "mean energy"),
            Column("energy.kinetic", "energy", "mean kinetic energy"),
            Column("energy.potential", "energy", "mean potential energy"),
        )

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        drift = "largest abs(change - work done + energy absorbed) over the largest mean kinetic energy"
        return (Column("energy.final", "energy", "mean energy at the end"), Column("energy.drift", meaning=drift))

    def classical_figures(self, outline: Outline) -> tuple[Column, ...]:
        return self.figures(outline)[:1]

    def classical(self, bench: Bench) -> ClassicalMeter:
        def row(swarm: Swarm) -> dict[str, Array]:
            kinetic, potential = swarm.mean(swarm.p**2) / (2 * swarm.mass), swarm.mean(swarm.potential)
            return {
                "energy.total": kinetic + potential,
                "energy.kinetic": kinetic,
                "energy.potential": potential,
            }

        return ClassicalMeter(row, lambda history: {"energy.final": history.last("energy.total")})

    def meter(self, bench: Bench) -> Meter:
        return EnergyMeter(bench)


class EnergyMeter(Meter):
    samples = True

    def __init__(self, bench: Bench) -> None:
        self.bench = bench
        self.open = bool(bench.hamiltonian.layers) or bench.hamiltonian.depends_on_time
        self.total, self.gain = Samples(), Samples()
        self.largest_kinetic = 0.0
        self.drift: float | None = None

    def checks(self) -> list[Check]:
        """Whether energy change, work done and energy absorbed add up."""
        if self.drift is None:
            return []
        limit = max(self.bench.accuracy, LEAST_ENERGY_LIMIT)
        passed = self.drift <= limit
        return [
            Check(
                "energy",
                passed,
                self.drift,
                limit,
                "energy change, work done and energy absorbed add up to the accuracy wanted",
                "" if passed else "give a smaller `evolve.accuracy`, or half the `evolve.step` where it is fixed",
            )
        ]

    def sample(self, look: Look) -> None:
        kinetic = kinetic_energy(look, self.bench)
        self.largest_kinetic = max(self.largest_kinetic, kinetic / norm(look))
        self.total.add(look.t, kinetic + potential_energy(look, self.bench))
        if self.open:
            self.gain.add(look.t, self._power(look) - self._absorption(look))

    def _power(self, look: Look) -> float:
        """<dV/dt>, by the five-point difference formula."""
        total = 0.0
        h = min((self.bench.stop - self.bench.start) * 1e-4, self.bench.fastest * 1e-2)
        for part in self.bench.hamiltonian.parts:
            if not part.depends_on_time:
                continue
            ahead = {n: part.factor(look.t + n * h) * part.values(look.t + n * h) for n in (-2, -1, 1, 2)}
            rate = (8 * (ahead[1] - ahead[-1]) - (ahead[2] - ahead[-2])) / (12 * h)
            total += float(np.sum(look.density[0] * rate[0])) * self.bench.axis.spacing
        return total

    def _absorption(self, look: Look) -> float:
        """2 Re <psi, rate H psi>: the energy that the layers take per time."""
        layers = self.bench.hamiltonian.layers
        if not layers:
            return 0.0
        psi, axis = look.psi[0], self.bench.axis
        slopes = look.cached("gradient", lambda: gradient(axis, psi))
        total = 0.0
        for layer in layers:
            at = slice(layer.first, layer.first + layer.rate.size)
            here, slope = psi[:, at], slopes[:, at]
            # Integrated by parts, so that only first derivatives appear.
            kinetic = layer.rate * np.abs(slope) ** 2 + layer.slope * (here.conj() * slope).real
            potential = layer.rate * potential_on_grid(look, self.bench)[at] * np.abs(here) ** 2
            total += float(np.sum(kinetic / self.bench.mass + 2 * potential)) * axis.spacing
        return total

    def row(self, look: Look) -> Sequence[float]:
        kinetic, potential = kinetic_energy(look, self.bench), potential_energy(look, self.bench)
        return [(kinetic + potential) / norm(look), kinetic / norm(look), potential / norm(look)]

    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        _, total = self.total.thinned(stride)
        change = total - total[0]
        if self.open:
            change = change - running(*self.gain.thinned(stride))
        drift = float(np.max(np.abs(change))) / self.largest_kinetic if self.largest_kinetic > 0 else None
        self.drift = drift if stride == 1 else self.drift
        return {"energy.final": float(series.values[-1, 0]), "energy.drift": drift}


class Ehrenfest(Observable):
    """How well d<x>/dt = <p>/m and d<p>/dt = <F> hold (Ehrenfest 1927)."""

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        return (
            Column("ehrenfest.position", meaning="largest abs(<x> - <x>_0 - integral of <p>/m) over the initial width"),
            Column(
                "ehrenfest.momentum",
                meaning="largest abs(<p> - <p>_0 - integral of <F>) over the initial momentum width",
            ),
        )

    def meter(self, bench: Bench) -> Meter:
        return EhrenfestMeter(bench)


NAMES = ("ehrenfest.position", "ehrenfest.momentum")


class EhrenfestMeter(Meter):
    samples = True

    def __init__(self, bench: Bench) -> None:
        self.bench = bench
        self.place, self.momentum, self.force = Samples(), Samples(), Samples()
        self.absorbed = 0.0

    def sample(self, look: Look) -> None:
        self.place.add(look.t, mean_place(look, self.bench))
        self.momentum.add(look.t, mean_momentum(look, self.bench))
        self.force.add(look.t, mean_force(look, self.bench))
        self.absorbed = 1 - norm(look)

    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        if self.absorbed > ABSORBED_TOO_MUCH:
            return dict.fromkeys(NAMES)
        times, momenta = self.momentum.thinned(stride)
        places, forces = self.place.thinned(stride)[1], self.force.thinned(stride)[1]
        moved, pushed = running(times, momenta) / self.bench.mass, running(times, forces)
        place = np.max(np.abs(places - places[0] - moved))
        momentum = np.max(np.abs(momenta - momenta[0] - pushed))
        scale = self.bench.scale
        return dict(zip(NAMES, (float(place / scale("length")), float(momentum / scale("momentum"))), strict=True))

    def notes(self) -> dict[str, str]:
        if self.absorbed <= ABSORBED_TOO_MUCH:
            return {}
        return dict.fromkeys(NAMES, "more than 1e-8 was absorbed: the theorem does not hold for what is left")
