"""The potential of a job on the points of its grid."""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from .grid import Axis, Grid
from .hamiltonian import Hamiltonian, Layer, Part
from .job import Job
from .shapes import ONE_EDGE, Breaks, Term, missed

Array = np.ndarray


def on_grid(job: Job, axis: Axis, layers: tuple[Layer, ...] = ()) -> Hamiltonian:
    """The Hamiltonian of `job` on `axis`. What does not change in time is one part.

    What the grid cannot show of a sharp edge goes with the square of its jump (`shapes.MISSED`): for a term
    with a factor f(t) it is a part with f(t)^2, and where its edge stands on one that does not change, one more
    with f(t).
    """
    mass = job.particle.mass
    still = [term for term in job.landscape.terms if not term.moves and term.in_time is None]
    edges = [term.shape.breaks for term in still if term.shape.breaks is not None]
    fixed = Breaks.summed(edges, ONE_EDGE * axis.length) if edges else Breaks.of()
    parts = []
    if still:
        sampled = [term.sampled(axis, 0.0) for term in still if term.shape.breaks is None]
        parts.append(_constant([*sampled, fixed.resolved(axis, mass).sampled(axis)] if edges else sampled))
    for term in job.landscape.terms:
        if term.moves:
            parts.append(_moving(term, axis, mass))
        elif term.in_time is not None:
            parts += _pulsing(term, axis, mass, fixed)
    return Hamiltonian(Grid((axis,)), (mass,), tuple(parts), layers)


def _constant(sampled: list[tuple[Array, Array]]) -> Part:
    values, slopes = (np.sum(tables, axis=0)[None, None] for tables in zip(*sampled, strict=True))
    return Part("position", lambda t: values, lambda t: (slopes,))


def _moving(term: Term, axis: Axis, mass: float) -> Part:
    """Sampled anew at every time, with the factor where there are peaks, which go with its square."""
    breaks = term.shape.breaks
    if breaks is None:
        return Part(
            "position",
            lambda t: term.sampled(axis, t)[0][None, None],
            lambda t: (term.sampled(axis, t)[1][None, None],),
            term.in_time,
            moves=True,
        )

    def sampled(t: float) -> tuple[Array, Array]:
        return breaks.moved(term.shift(t)).scaled(term.strength(t)).resolved(axis, mass).sampled(axis)

    return Part("position", lambda t: sampled(t)[0][None, None], lambda t: (sampled(t)[1][None, None],), moves=True)


def _pulsing(term: Term, axis: Axis, mass: float, fixed: Breaks) -> list[Part]:
    """A term that stands still and has a factor f(t): parts with f, and f^2 for its peaks."""
    factor, breaks = term.strength, term.shape.breaks
    linear = [term.sampled(axis, 0.0)]
    if breaks is None:
        return [_with_factor(linear, factor)]
    shared = np.abs(breaks.positions[:, None] - fixed.positions) < ONE_EDGE * axis.length
    there = shared @ fixed.jumps if fixed.positions.size else np.zeros(breaks.positions.size)
    nothing = np.zeros(breaks.positions.size)

    def peaks(products: Array) -> tuple[Array, Array]:
        return Breaks(breaks.positions, nothing, nothing, missed(axis, mass) * products).sampled(axis)

    if there.any():
        linear.append(peaks(2 * breaks.jumps * there))
    squared = _with_factor([peaks(breaks.jumps**2)], lambda t: factor(t) ** 2)
    return [_with_factor(linear, factor), squared]


def _with_factor(sampled: list[tuple[Array, Array]], factor: Callable[[float], float]) -> Part:
    values, slopes = (np.sum(tables, axis=0)[None, None] for tables in zip(*sampled, strict=True))
    return Part("position", lambda t: values, lambda t: (slopes,), factor)
