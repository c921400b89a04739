"""Trajectories against closed forms of the mechanics textbook, from memory unless a source is named."""

from __future__ import annotations

import math

import numpy as np
import pytest

from wavejob.classical import path
from wavejob.newton import Motion, Trajectories
from wavejob.shapes import Breaks, Landscape, Shape, Term

Array = np.ndarray
NUDGED = 1e-9  # a few edges, each met within 1e-12 of an axis 100 long, at changing speed


def oscillator(mass: float = 1.0, omega: float = 1.0) -> Term:
    stiffness = mass * omega**2
    return Term(Shape(lambda x, _t: stiffness * x**2 / 2, lambda x, _t: stiffness * x))


def field(force: float) -> Term:
    return Term(Shape(lambda x, _t: -force * x, lambda x, _t: np.full(np.shape(x), -force)))


def sharp(*edges: tuple[float, float, float]) -> Term:
    return Term(Shape.sharp(Breaks.of(*edges)))


def barrier(low: float, high: float, height: float) -> Term:
    return sharp((low, height, 0.0), (high, -height, 0.0))


def test_oscillator() -> None:
    """x = x0 cos wt + p0 / (m w) sin wt."""
    times = np.linspace(0, 20, 41)
    found = path(Landscape((oscillator(2.0, 0.7),)), 2.0, 1.5, -0.8, times, low=-10, high=10)
    np.testing.assert_allclose(found.x, 1.5 * np.cos(0.7 * times) - 0.8 / 1.4 * np.sin(0.7 * times), atol=1e-8)
    assert found.error < 1e-8


def test_actions_of_the_oscillator() -> None:
    """S = m w [(x^2 + x'^2) cos wt - 2 x x'] / (2 sin wt), Feynman and Hibbs 1965, problem 3-8, is
    0.0519185609146 for x' = 0.4, x = 1.1, t = 0.8; the integral of p dx is that of L dt plus E t."""
    p0 = (1.1 - 0.4 * math.cos(0.8)) / math.sin(0.8)
    found = path(Landscape((oscillator(),)), 1.0, 0.4, p0, np.array([0, 0.8]), low=-10, high=10)
    assert found.x[-1] == pytest.approx(1.1, abs=1e-9)
    assert found.lagrangian_action[-1] == pytest.approx(0.0519185609146, abs=1e-9)
    energy = (p0**2 + 0.4**2) / 2
    assert found.action[-1] == pytest.approx(0.0519185609146 + 0.8 * energy, abs=1e-9)


def test_uniform_field() -> None:
    times = np.linspace(1, 5, 9)
    found = path(Landscape((field(0.5),)), 2.0, -3.0, 1.0, times, low=-50, high=50)
    since = times - 1
    np.testing.assert_allclose(found.x, -3 + since / 2 + 0.5 * since**2 / 4, atol=1e-11)
    np.testing.assert_allclose(found.p, 1 + 0.5 * since, atol=1e-12)


@pytest.mark.parametrize("smooth", [(), (oscillator(1.0, 0.05),)])
def test_step_above(smooth: tuple[Term, ...]) -> None:
    """Momentum sqrt(p^2 - 2 m V) behind a step, met at its exact place: times add up."""
    motion = Motion(Landscape((sharp((1.0, 0.3, 0.0)), *smooth)), 1.0, -50, 50)
    start = Trajectories.start(np.linspace(-5, 0, 7), 1.0)
    end = motion.advance(start, 0.0, 10.0, 37)
    np.testing.assert_allclose(motion.energy(end, 10.0), motion.energy(start, 0.0), rtol=1e-9)
    if not smooth:
        behind = math.sqrt(1 - 0.6)
        np.testing.assert_allclose(end.p, behind, rtol=1e-12)
        np.testing.assert_allclose(end.x, 1 + behind * (10 - (1 - start.x)), atol=NUDGED)


def test_step_down_and_back() -> None:
    """A fall speeds up by the same rule."""
    motion = Motion(Landscape((sharp((1.0, 0.3, 0.0)),)), 1.0, -50, 50)
    end = motion.advance(Trajectories.start(3.0, -0.5), 0.0, 10.0, 3)
    assert end.p[0] == pytest.approx(-math.sqrt(0.25 + 0.6), rel=1e-12)


def test_barrier_turns_back() -> None:
    motion = Motion(Landscape((barrier(1.0, 2.0, 0.51),)), 1.0, -50, 50)
    end = motion.advance(Trajectories.start(-2.0, 1.0), 0.0, 7.0, 11)
    assert end.p[0] == pytest.approx(-1.0, rel=1e-14)
    assert end.x[0] == pytest.approx(-3.0, abs=NUDGED)


def test_double_barrier_above_in_one_step() -> None:
    """Four edges within one step; inside each barrier the speed is sqrt(1 - 2 V)."""
    landscape = Landscape((barrier(0.0, 0.5, 0.4), barrier(1.5, 2.0, 0.3)))
    end = Motion(landscape, 1.0, -50, 50).advance(Trajectories.start(-1.0, 1.0), 0.0, 20.0, 1)
    spent = 1.0 + 0.5 / math.sqrt(0.2) + 1.0 + 0.5 / math.sqrt(0.4)
    assert end.p[0] == pytest.approx(1.0, rel=1e-12)
    assert end.x[0] == pytest.approx(2.0 + 20.0 - spent, abs=NUDGED)


def test_barrier_of_no_width_is_none() -> None:
    end = Motion(Landscape((barrier(1.0, 1.0, 7.0),)), 1.0, -50, 50).advance(
        Trajectories.start(np.array([0.0, 3.0]), np.array([1.0, -1.0])), 0.0, 2.0, 3
    )
    np.testing.assert_allclose(end.p, [1.0, -1.0])
    np.testing.assert_allclose(end.x, [2.0, 1.0], atol=NUDGED)


def test_bouncing_neutron() -> None:
    """Period 2 sqrt(2 h / g) above a mirror; back at the start after 25 of them."""
    mass, gravity, height = 1.3, 0.7, 2.5
    period = 2 * math.sqrt(2 * height / gravity)
    found = path(
        Landscape((field(-mass * gravity),)),
        mass,
        height,
        0.0,
        np.array([0, 0.5, 1, 25]) * period,
        low=0,
        high=10,
        ends="sine",
    )
    np.testing.assert_allclose(found.x, [height, 0, height, height], atol=1e-8)


def test_walls() -> None:
    found = path(Landscape(), 1.0, 0.0, 1.0, np.array([0, 1.5, 2.5, 8]), low=-1, high=1, ends="sine")
    np.testing.assert_allclose(found.x, [0, 0.5, -0.5, 0], atol=1e-10)


def test_wrap() -> None:
    found = path(Landscape(), 1.0, 0.0, 1.0, np.array([0, 1.5, 2.5, 8]), low=-1, high=1)
    np.testing.assert_allclose(found.x, [0, -0.5, 0.5, 0], atol=1e-10)


def test_wrap_meets_the_difference_of_the_ends() -> None:
    """A step inside a wrapping axis makes a second edge at the seam."""
    motion = Motion(Landscape((sharp((0.0, 0.3, 0.0)),)), 1.0, -1, 1)
    start = Trajectories.start(-0.5, 1.0)
    slow = math.sqrt(0.4)
    end = motion.advance(start, 0.0, 0.5 + 1 / slow + 0.25, 7)
    assert end.p[0] == pytest.approx(1.0, rel=1e-12)
    assert end.x[0] == pytest.approx(-0.75, abs=1e-10)


@pytest.mark.parametrize("velocity", [0.5, -0.3])
def test_moving_wall(velocity: float) -> None:
    """A high step moving with u turns v into 2 u - v."""
    landscape = Landscape((Term(Shape.sharp(Breaks.of((2.0, 50.0, 0.0))), path=lambda t: -velocity * t),))
    motion = Motion(landscape, 2.0, -50, 50)
    end = motion.advance(Trajectories.start(np.array([0.0, -1.0]), 2.0), 0.0, 6.0, 50)
    np.testing.assert_allclose(end.p, 2 * (-2 * velocity - 1.0), rtol=1e-9)
    met = (2.0 - np.array([0.0, -1.0])) / (1.0 + velocity)
    np.testing.assert_allclose(end.x, 2.0 - velocity * met - (2 * velocity + 1.0) * (6 - met), atol=1e-8)


def test_moving_step_is_crossed_in_its_frame() -> None:
    """(v' - u)^2 = (v - u)^2 - 2 V / m."""
    landscape = Landscape((Term(Shape.sharp(Breaks.of((2.0, 0.4, 0.0))), path=lambda t: -0.5 * t),))
    end = Motion(landscape, 1.0, -50, 50).advance(Trajectories.start(0.0, 1.0), 0.0, 6.0, 60)
    assert end.p[0] == pytest.approx(math.sqrt(1.5**2 - 0.8) - 0.5, rel=1e-9)


def test_height_at_the_time_of_crossing() -> None:
    landscape = Landscape((Term(Shape.sharp(Breaks.of((2.0, 1.0, 0.0))), in_time=lambda t: 0.1 * t),))
    end = Motion(landscape, 1.0, -50, 50).advance(Trajectories.start(np.array([0.0, -1.0]), 1.0), 0.0, 6.0, 5)
    np.testing.assert_allclose(end.p, [math.sqrt(1 - 0.4), math.sqrt(1 - 0.6)], rtol=1e-10)


def test_energy_stays_in_a_landscape_with_everything() -> None:
    """Relative drift below 1e-6 over some oscillations with edges and corners (common practice)."""
    landscape = Landscape(
        (
            oscillator(),
            sharp((-0.3, 0.2, 0.0), (0.4, -0.3, 0.1)),
            Term(Shape(lambda x, _t: np.exp(-(x**2) * 8), lambda x, _t: -16 * x * np.exp(-(x**2) * 8))),
        )
    )
    times = np.linspace(0, 20, 21)
    found = path(landscape, 1.0, -2.0, 0.3, times, low=-10, high=10)
    energy = found.p**2 / 2 + landscape.value(found.x, 0.0)
    assert np.abs(energy / energy[0] - 1).max() < 1e-6
    assert found.error < 1e-6


def test_order_four_across_an_edge() -> None:
    """Halving the step divides the error by about 16, as the edge is met at its exact place."""
    motion = Motion(Landscape((oscillator(), sharp((0.5, 0.6, 0.0)))), 1.0, -10, 10)
    start = Trajectories.start(-2.0, 0.3)
    x = [motion.advance(start, 0.0, 4.0, steps).x[0] for steps in (8, 16, 1024)]
    assert 10 < abs(x[0] - x[2]) / abs(x[1] - x[2]) < 24


@pytest.mark.parametrize("velocity", [0.0, 0.2])
def test_pressed_against_a_floor_stays_on_it(velocity: float) -> None:
    floor = Term(Shape.sharp(Breaks.of((0.0, -9.0, 0.0))), path=lambda t: velocity * t)
    motion = Motion(Landscape((field(-1.0), floor)), 1.0, -5, 5)
    end = motion.advance(Trajectories.start(1e-13, velocity), 0.0, 5.0, 20)
    assert end.x[0] == pytest.approx(5 * velocity, abs=NUDGED)


def test_absorbing_layers_lower_the_weight() -> None:
    """exp(-2 W t) in a uniform W, hbar = 1."""
    motion = Motion(Landscape(), 1.0, -50, 50, absorption=lambda x, _: np.where(x > 5, 0.3, 0.0))
    end = motion.advance(Trajectories.start(np.array([6.0, -6.0]), 1.0, 0.5), 0.0, 2.0, 4)
    np.testing.assert_allclose(end.weight, [0.5 * math.exp(-1.2), 0.5], rtol=1e-12)


def test_many_agree_with_one() -> None:
    """Each of many trajectories moves as it would alone."""
    shaken = Term(field(1.0).shape, in_time=lambda t: 0.3 * math.sin(2 * t))
    landscape = Landscape((oscillator(), barrier(0.2, 0.7, 1.0), shaken))
    motion = Motion(landscape, 1.0, -10, 10)
    x, p = np.linspace(-3, 3, 9), np.linspace(1, -2, 9)
    together = motion.advance(Trajectories.start(x, p), 0.0, 7.0, 100)
    for number in range(9):
        alone = motion.advance(Trajectories.start(x[number], p[number]), 0.0, 7.0, 100)
        assert alone.x[0] == pytest.approx(together.x[number], abs=1e-9)
