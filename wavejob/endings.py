"""The absorbing ends of a job: what comes to them, and how deep their layers are."""

from __future__ import annotations

import math
from dataclasses import dataclass
from functools import cached_property

import numpy as np

from .edges import LayerShape, Momenta, layer, recommended_depth, tuned
from .grid import Axis
from .hamiltonian import Layer
from .job import Job
from .points import initial_state, wave_numbers
from .problems import JobFileError
from .settings import Absorb

Array = np.ndarray

DEEPEST, SHALLOWEST = 1e-9, 1e-5  # limits of what a layer whose depth is chosen may send back
LONGEST_LAYER = 0.4  # of the axis
OVERLAP = 0.01  # of the accuracy wanted: probability that a layer whose depth is chosen may hold at the start


@dataclass(frozen=True)
class Ending:
    """One absorbing end: the layer, with what it reflects as predicted, and what it must absorb."""

    side: str
    shape: LayerShape
    momenta: Momenta
    spacing: float

    @cached_property
    def recommended(self) -> float:
        """The depth that would do; found when first asked for, because it takes a while."""
        return recommended_depth(self.shape.mass, self.momenta, self.spacing)

    def deeper(self, by: float) -> Ending:
        """The same end with its layer deeper, tuned anew."""
        shape = tuned(self.shape.depth + by, self.shape.mass, self.momenta, self.spacing)
        return Ending(self.side, shape, self.momenta, self.spacing)


def layers(axis: Axis, endings: tuple[Ending, ...]) -> tuple[Layer, ...]:
    """The absorbing layers on the points of `axis`."""
    return tuple(layer(0, axis, ending.shape, "low" if ending.side == "low" else "high") for ending in endings)


def absorbing_ends(job: Job, axis: Axis, psi: Array) -> tuple[Ending, ...]:
    """The absorbing ends, each layer as deep as written, or as deep as the accuracy wanted needs."""
    found = []
    for side in ("low", "high"):
        end = getattr(job.keys.edges.x, side)
        if isinstance(end, Absorb):
            momenta = _arriving(job, axis, psi, side, end)
            depth = end.absorb if isinstance(end.absorb, float) else _needed_depth(job, axis, psi, momenta, side)
            shape = tuned(depth, job.particle.mass, momenta, axis.spacing)
            found.append(Ending(side, shape, momenta, axis.spacing))
    return tuple(found)


def retuned(job: Job, axis: Axis, endings: tuple[Ending, ...]) -> tuple[Ending, ...]:
    """The same absorbing ends on another grid: the same depths, tuned anew."""
    psi, found = initial_state(job, axis), []
    for ending in endings:
        momenta = _arriving(job, axis, psi, ending.side, getattr(job.keys.edges.x, ending.side))
        shape = tuned(ending.shape.depth, job.particle.mass, momenta, axis.spacing)
        found.append(Ending(ending.side, shape, momenta, axis.spacing))
    return tuple(found)


def _needed_depth(job: Job, axis: Axis, psi: Array, momenta: Momenta, side: str) -> float:
    """The depth that sends back so little that it changes probabilities by less than the accuracy wanted.

    A share R that comes back changes a probability by up to 2 sqrt(R) times the amplitude it meets, which is
    small by then: 2 accuracy^2 leaves room for a tenth.
    """
    limit = min(max(2 * job.accuracy.first**2, DEEPEST), SHALLOWEST)
    depth = recommended_depth(job.particle.mass, momenta, axis.spacing, limit)
    if depth > LONGEST_LAYER * axis.length:
        fix = "give `energies:` of what it must absorb, extend the grid, or give a depth"
        if math.isfinite(depth):
            wanted = job.write(depth, "length")
            said = f"a layer at x.{side} that sends back less than {limit:.0e} needs {wanted}, too much of this grid"
        else:
            said = f"no layer at x.{side} absorbs waves as slow as some of this packet's"
        raise JobFileError([job.problem(("edges", "x"), said, fix)])
    away = axis.x - axis.low if side == "low" else axis.high - axis.x
    inside = float(np.sum(np.abs(psi[away < depth]) ** 2) * axis.spacing)
    if inside > OVERLAP * job.accuracy.first:
        said = f"a layer at x.{side} that sends back less than {limit:.0e} needs {job.write(depth, 'length')} and "
        said += f"would hold {inside:.1e} of the packet at the start"
        fix = "extend the grid, start the packet farther away, or give `energies:` of what the layer must absorb"
        raise JobFileError([job.problem(("edges", "x"), said, fix)])
    return depth


def _arriving(job: Job, axis: Axis, psi: Array, side: str, end: Absorb) -> Momenta:
    """The wave numbers that may come to one end: those of the energies given, or the packet's, turned back or let
    through, at the end's potential."""
    mass, landscape, start = job.particle.mass, job.landscape, job.evolve.start
    if end.energies is not None:
        return Momenta.of_energies(end.energies.start, end.energies.stop, mass)
    k, weight = wave_numbers(axis, psi)
    if not landscape.terms:
        return Momenta.of_density(k, weight, "low" if side == "low" else "high")
    extent = job.packet.extent()
    middle = 0.5 * (extent[0] + extent[1]) if extent else 0.5 * (axis.low + axis.high)
    here = float(landscape.value(np.array([middle]), start)[0])
    inset = axis.low + 2 * axis.spacing if side == "low" else axis.high - 2 * axis.spacing
    there = float(landscape.value(np.array([inset]), start)[0])
    squared = k**2 + 2 * mass * (here - there)
    kept = squared > 0
    return Momenta.of_density(np.sqrt(squared[kept]), weight[kept])
