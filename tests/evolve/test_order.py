"""Order and error constant of every splitting, by closed form and by measurement."""

from __future__ import annotations

from fractions import Fraction

import numpy as np
import pytest
from mpmath import acos, matrix, mp, mpf

from wavejob.evolve import SPLITTINGS, PlanError, Splitting, evolve, plan
from wavejob.grid import Axis, Grid
from wavejob.hamiltonian import Hamiltonian, Layer, Part

# leading coefficient c of the oscillator's frequency 1 + c h^p, and half that frequency at h = 0.1. Strang
# (2/h) arcsin(h/2); S. A. Chin, Phys. Lett. A 226 (1997) 344. Closed forms evaluated with 40 digits.
OSCILLATOR = {"strang": (0.04166666667, 0.5002085681), "chin_4a": (-0.0002314814815, 0.4999999884)}


def exact(coefficient: float) -> mpf:
    """1/6 as the table means it, not as the nearest double."""
    ratio = Fraction(coefficient).limit_denominator(1000)
    return mpf(ratio.numerator) / ratio.denominator


def classical_step(splitting: Splitting, h: float) -> matrix:
    """The (x, p) matrix of one step of the oscillator m = omega = 1, where |V'|^2 = x^2 as V = x^2 / 2."""
    total = matrix([[1, 0], [0, 1]])
    for i, kick in enumerate(splitting.kicks):
        if i:
            total = matrix([[1, exact(splitting.drifts[i - 1]) * h], [0, 1]]) * total
        slope = h * exact(kick.weight) * (1 - 2 * exact(kick.gradient) * h**2)
        total = matrix([[1, 0], [-slope, 1]]) * total
    return total


@pytest.mark.parametrize("name", SPLITTINGS)
def test_error_constant_of_the_table(name):
    """Source: closed form on the oscillator, cos(w h) = half the trace; digits as above."""
    splitting, (constant, half) = SPLITTINGS[name], OSCILLATOR[name]
    with mp.workdps(40):
        h, order = mpf("0.001"), splitting.order
        frequencies = [acos(classical_step(splitting, s)[0, 0]) / s for s in (h, 2 * h, mpf("0.1"))]
        first, second = ((w - 1) / s**order for w, s in zip(frequencies, (h, 2 * h), strict=False))
    assert float((4 * first - second) / 3) == pytest.approx(constant, rel=3e-10)
    assert float(frequencies[2]) / 2 == pytest.approx(half, abs=6e-11)


@pytest.mark.parametrize("name", SPLITTINGS)
def test_ground_state_phase_of_the_oscillator(name):
    """Source: the same closed form; the step's own ground state turns by exactly w h / 2 a step."""
    splitting, h, steps = SPLITTINGS[name], 0.1, 50
    step = classical_step(splitting, mpf(h))
    width = float(mp.sqrt(-step[1, 0] / step[0, 1]))
    axis = Axis("x", -12.0, 12.0, 96)
    x = axis.x[None, None]
    part = Part("position", lambda _: x**2 / 2, lambda _: (x,))
    psi0 = np.exp(-width * x**2 / 2) / np.sqrt(np.exp(-width * x**2).sum()) + 0j
    stepper = plan(Hamiltonian(Grid((axis,)), (1.0,), (part,)), splitting, h, psi0, reproducible=True)
    evolve(stepper, steps=steps)
    phase = -np.angle(np.vdot(psi0, stepper.psi)) / (steps * h)
    assert phase == pytest.approx(float(mp.acos(step[0, 0])) / h / 2, abs=1e-13)


AXIS = Axis("x", -16.0, 16.0, 128)  # largest kinetic phase k^2 step / 2 below pi for the steps used
X = AXIS.x[None, None]


def static() -> Part:
    return Part("position", lambda _: 1.5 / np.cosh(X) ** 2, lambda _: (-3 * np.tanh(X) / np.cosh(X) ** 2,))


def trap() -> Part:
    return Part("position", lambda _: X**2 / 2, lambda _: (X,))


def driven() -> Part:
    return Part(
        "position",
        lambda _: np.sin(np.pi * X / 16),
        lambda _: (np.pi / 16 * np.cos(np.pi * X / 16),),
        in_time=lambda t: np.sin(3 * t),
    )


def pulled() -> Part:
    """A uniform force: linear, which has a short cut of its own."""
    return Part("position", lambda _: 0.3 * X, lambda _: (np.full_like(X, 0.3),), in_time=lambda t: np.cos(3 * t))


def moving() -> Part:
    def hill(t: float) -> np.ndarray:
        return np.exp(-((X - np.sin(2 * t)) ** 2) / 2)

    return Part("position", hill, lambda t: (-(X - np.sin(2 * t)) * hill(t),), moves=True)


def tent(axis: Axis, points: int, strength: float) -> tuple[Layer, ...]:
    """A smooth layer at each end: strength sin^2, joined smoothly over the wrap."""
    depth = (np.arange(2 * points) + 0.5) / (2 * points)
    rate = strength * np.sin(np.pi * depth) ** 4
    slope = strength * 4 * np.sin(np.pi * depth) ** 3 * np.cos(np.pi * depth)
    slope *= np.pi / (2 * points * axis.spacing)
    return (
        Layer("x.high", 0, axis.points - points, rate[:points], slope[:points]),
        Layer("x.low", 0, 0, rate[points:], slope[points:]),
    )


CASES = {
    "static": ((static(),), ()),
    "driven": ((static(), driven()), ()),
    "pulled": ((trap(), pulled()), ()),  # the trap keeps the packet from the ends, where the force jumps
    "moving": ((static(), driven(), moving()), ()),
    "absorbing": ((static(),), tent(AXIS, 32, 2.0)),
    "driven and absorbing": ((static(), driven()), tent(AXIS, 32, 2.0)),
}


def end(case: str, splitting: Splitting, steps: int) -> np.ndarray:
    parts, layers = CASES[case]
    psi0 = np.exp(-((X + 4) ** 2) / 4 + 1.5j * X)
    stepper = plan(Hamiltonian(Grid((AXIS,)), (1.0,), parts, layers), splitting, 4.0 / steps, psi0, reproducible=True)
    evolve(stepper, steps=steps)
    return stepper.psi.copy()


@pytest.mark.parametrize("case", CASES)
@pytest.mark.parametrize("splitting", SPLITTINGS.values(), ids=SPLITTINGS)
def test_measured_order(splitting, case):
    """Source: the order the scheme's author gives; regression over three steps, own limit as reference."""
    counts = np.array([128, 192, 288])
    limit = end(case, SPLITTINGS["chin_4a"], 2000)
    errors = [np.linalg.norm(end(case, splitting, n) - limit) for n in counts]
    order = -np.polyfit(np.log(counts), np.log(errors), 1)[0]
    assert order == pytest.approx(splitting.order, abs=0.15)


def test_a_layer_never_becomes_a_source():
    """Where the squared gradient outweighs a steep layer, the factor stays within modulus 1."""
    wall = Part("position", lambda _: 50 * X, lambda _: (50 + 0 * X,))
    layers = tent(AXIS, 4, 5.0)
    psi0 = np.ones_like(X) + 0j
    stepper = plan(Hamiltonian(Grid((AXIS,)), (1.0,), (wall,), layers), SPLITTINGS["chin_4a"], 0.2, psi0)
    before = stepper.look(0).norm
    stepper.advance(0, 20)
    look = stepper.look(20)
    assert all((taken >= 0).all() for taken in look.absorbed.values())
    assert look.norm < before
    np.testing.assert_allclose(look.norm + sum(look.absorbed.values()), before, rtol=1e-13)


def test_order_4_is_refused_without_gradient():
    part = Part("position", lambda _: X)
    with pytest.raises(PlanError, match="gradient"):
        plan(Hamiltonian(Grid((AXIS,)), (1.0,), (part,)), SPLITTINGS["chin_4a"], 0.1, X + 0j)


def test_order_4_is_refused_where_channels_couple():
    part = Part("position", lambda _: np.zeros((1, 2, 2, 128)), lambda _: (X,), couples=True)
    with pytest.raises(PlanError, match="couple"):
        plan(Hamiltonian(Grid((AXIS,)), (1.0,), (part,)), SPLITTINGS["chin_4a"], 0.1, X + 0j)
