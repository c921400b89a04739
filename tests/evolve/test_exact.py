"""The stepper against closed forms, and what it must conserve."""

from __future__ import annotations

import numpy as np
import pytest

from tests.evolve.test_order import AXIS, X, driven, static, tent
from wavejob.evolve import SPLITTINGS, PlanError, Stepper, evolve, plan
from wavejob.grid import Axis, Grid
from wavejob.hamiltonian import Hamiltonian, Part

STRANG, CHIN = SPLITTINGS["strang"], SPLITTINGS["chin_4a"]


def packet(x: np.ndarray, at: float, sigma: float, k: float, t: float = 0.0) -> np.ndarray:
    """Free Gaussian packet, hbar = m = 1 (C. G. Darwin, Proc. R. Soc. A 117 (1927) 258)."""
    tau = t / (2 * sigma**2)
    spread = sigma**2 * (1 + 1j * tau)
    amplitude = (2 * np.pi * sigma**2) ** -0.25 / np.sqrt(1 + 1j * tau)
    return amplitude * np.exp(-((x - at - k * t) ** 2) / (4 * spread) + 1j * k * (x - at) - 0.5j * k**2 * t)


def free(axis: Axis, psi0: np.ndarray, time: float, steps: int = 1, **options: object) -> Stepper:
    stepper = plan(Hamiltonian(Grid((axis,)), (1.0,)), STRANG, time / steps, psi0[None, None] + 0j, **options)
    evolve(stepper, steps=steps)
    return stepper


def test_free_packet_is_exact_in_one_step():
    """Source: Darwin 1927; spreading, phase and drift to machine precision while inside the box."""
    axis = Axis("x", -60.0, 60.0, 1024)
    stepper = free(axis, packet(axis.x, -10, 1, 2), 5.0)
    assert np.abs(stepper.psi[0, 0] - packet(axis.x, -10, 1, 2, t=5)).max() < 3e-15


@pytest.mark.parametrize("steps", [1, 7])
def test_revival_on_a_ring(steps):
    """Source: Aronstein & Stroud, Phys. Rev. A 55 (1997) 4526: T = L^2 / pi, half time moves by L / 2."""
    axis = Axis("x", 0.0, 10.0, 256)
    psi0, revival = packet(axis.x, 3, 0.5, 4), 100 / np.pi
    assert np.abs(free(axis, psi0, revival, steps).psi[0, 0] - psi0).max() < 2e-13
    assert np.abs(free(axis, psi0, revival / 2, steps).psi[0, 0] - np.roll(psi0, 128)).max() < 2e-13


@pytest.mark.parametrize("steps", [1, 7])
def test_revival_between_walls(steps):
    """Source: Aronstein & Stroud 1997: T = 4 L^2 / pi; at half time psi(x) becomes -psi(L - x)."""
    axis = Axis("x", 0.0, 5.0, 128, "sine")
    psi0, revival = packet(axis.x, 2, 0.3, 4), 100 / np.pi
    psi0 *= np.sin(np.pi * axis.x / 5)
    assert np.abs(free(axis, psi0, revival, steps).psi[0, 0] - psi0).max() < 4e-13
    assert np.abs(free(axis, psi0, revival / 2, steps).psi[0, 0] + psi0[::-1]).max() < 4e-13


def test_levels_between_walls():
    """Source: E_n = n^2 pi^2 / 2 L^2 (any textbook); each level only turns its phase."""
    axis, time = Axis("x", -1.0, 4.0, 64, "sine"), 0.7
    for n in (1, 5, 64):
        level = np.sin(n * np.pi * (axis.x + 1) / 5)
        turned = level * np.exp(-0.5j * (n * np.pi / 5) ** 2 * time)
        assert np.abs(free(axis, level, time).psi[0, 0] - turned).max() < 1e-12


def test_one_step_is_the_short_time_propagator():
    """Source: Feynman & Hibbs, Quantum Mechanics and Path Integrals (1965), section 2-4, V by trapezium rule.

    The kernel sqrt(m / 2 pi i tau) exp(i m (x - x')^2 / 2 tau - i tau [V(x) + V(x')] / 2) summed over the
    grid. The sum equals the integral while its local wave number m |x - x'| / tau stays below pi / dx.
    """
    tau, mass, axis = 2.0, 1.3, Axis("x", -60.0, 60.0, 2048)
    x = axis.x
    barrier = 1.5 / np.cosh(x) ** 2
    psi0 = packet(x, -3, 1, 1)
    part = Part("position", lambda _: barrier[None, None])
    stepper = plan(Hamiltonian(Grid((axis,)), (mass,), (part,)), STRANG, tau, psi0[None, None])
    stepper.advance(0, 1)
    phase = mass * (x[:, None] - x) ** 2 / (2 * tau) - tau * (barrier[:, None] + barrier) / 2
    kernel = np.sqrt(mass / (2j * np.pi * tau)) * np.exp(1j * phase)
    inside = np.abs(x) < 30
    summed = kernel @ psi0 * axis.spacing
    assert np.abs(stepper.psi[0, 0] - summed)[inside].max() < 1e-12


@pytest.mark.parametrize("splitting", SPLITTINGS.values(), ids=SPLITTINGS)
@pytest.mark.parametrize("parts", [(static(),), (static(), driven())], ids=["static", "driven"])
def test_norm_is_kept(splitting, parts):
    """Each factor is unitary; rounding alone may change the norm, by about 2e-16 a step."""
    psi0 = packet(X, -4, 1, 1.5)
    stepper = plan(Hamiltonian(Grid((AXIS,)), (1.0,), parts), splitting, 0.02, psi0)
    evolve(stepper, steps=500)
    assert stepper.look(500).norm == pytest.approx(1.0, abs=5e-13)


@pytest.mark.parametrize("splitting", SPLITTINGS.values(), ids=SPLITTINGS)
@pytest.mark.parametrize("parts", [(static(),), (static(), driven())], ids=["static", "driven"])
def test_norm_and_absorbed_are_one(splitting, parts):
    """What the layers took is booked at every factor, to rounding; much of the packet is absorbed here."""
    psi0 = np.concatenate([packet(X, -4, 1, 1.5), packet(X, 2, 1, -2)])
    hamiltonian = Hamiltonian(Grid((AXIS,)), (1.0,), parts, tent(AXIS, 32, 2.0))
    stepper = plan(hamiltonian, splitting, 0.02, psi0)
    evolve(stepper, steps=500)
    look = stepper.look(500)
    assert (look.norm < 0.8).all()
    assert all((taken > 1e-3).all() for taken in look.absorbed.values())
    np.testing.assert_allclose(look.norm + sum(look.absorbed.values()), 1.0, atol=5e-13)


def test_layers_that_cross_in_a_corner_share_what_they_take():
    """By symmetry: two equal layers on a square take equal parts, and nothing is booked twice."""
    axes = Axis("x", -16.0, 16.0, 64), Axis("y", -16.0, 16.0, 64)
    layers = tuple(
        type(layer)(f"{axis.name}.{layer.name[2:]}", i, layer.first, layer.rate, layer.slope)
        for i, axis in enumerate(axes)
        for layer in tent(axis, 16, 2.0)
    )
    one = packet(axes[0].x, 2, 1, 2)
    psi0 = (one[:, None] * one)[None, None]
    stepper = plan(Hamiltonian(Grid(axes), (1.0, 1.0), (), layers), CHIN, 0.02, psi0)
    evolve(stepper, steps=300)
    taken = stepper.absorbed
    np.testing.assert_allclose(taken["x.high"], taken["y.high"], rtol=1e-10)
    np.testing.assert_allclose(stepper.look(300).norm + sum(taken.values()), 1.0, atol=5e-13)


def test_single_precision_follows_double():
    """Rounding of 6e-8 in each of 4 factors a step for 200 steps: 5e-5 at worst, if all err to one side."""
    psi0, ends = packet(X, -4, 1, 1.5), {}
    hamiltonian = Hamiltonian(Grid((AXIS,)), (1.0,), (static(), driven()), tent(AXIS, 32, 2.0))
    for precision in ("single", "double"):
        stepper = plan(hamiltonian, CHIN, 0.02, psi0, precision=precision)
        evolve(stepper, steps=200)
        ends[precision] = stepper.psi
        look = stepper.look(200)
        total = look.norm + sum(look.absorbed.values())
        assert total == pytest.approx(1.0, abs=5e-5 if precision == "single" else 5e-13)
    assert ends["single"].dtype == np.complex64
    assert np.abs(ends["single"] - ends["double"]).max() < 5e-5


@pytest.mark.parametrize("transform", ["periodic", "sine"])
@pytest.mark.parametrize("points", [64, 4096])
def test_amplitudes_are_those_of_the_waves_written_out(transform, points):
    """Source: the definition, psi as a sum of orthonormal plane waves or sines; Parseval's theorem."""
    axis = Axis("x", -3.0, 5.0, points, transform)
    psi = packet(axis.x, 1, 0.8, 3)[None, None] * np.sin(np.pi * (axis.x + 3) / 8)
    look = plan(Hamiltonian(Grid((axis,)), (1.0,)), STRANG, 0.1, psi).look(0)
    few = np.arange(0, points, points // 16 - 1)
    if transform == "sine":
        waves = np.sqrt(2 / 8) * np.sin(np.outer(axis.k[few], axis.x + 3))
        waves[few == points - 1] /= np.sqrt(2)
    else:
        waves = np.exp(-1j * np.outer(axis.k[few], axis.x - axis.x[0])) / np.sqrt(8)
    np.testing.assert_allclose(look.amplitudes[0, 0, few], waves @ psi[0, 0] * axis.spacing, atol=1e-13)
    assert look.momentum_density.sum() == pytest.approx(float(look.norm[0]), rel=1e-13)
    np.testing.assert_array_equal(look.psi, psi)


def test_threads_change_nothing_but_time():
    """Two threads of FFTW against one: equal to rounding."""
    axes = Axis("x", -16.0, 16.0, 64), Axis("y", -16.0, 16.0, 64, "sine")
    psi0 = (packet(axes[0].x, -4, 1, 2)[:, None] * packet(axes[1].x, 0, 1, -1))[None, None]
    ends = []
    for threads in (1, 2):
        stepper = plan(Hamiltonian(Grid(axes), (1.0, 2.0)), STRANG, 0.1, psi0, threads=threads)
        evolve(stepper, steps=10)
        ends.append(stepper.psi)
    np.testing.assert_allclose(ends[1], ends[0], rtol=0, atol=1e-14)


def test_psi_of_another_grid_is_refused():
    with pytest.raises(PlanError, match=r"psi has shape \(1, 1, 5\)"):
        plan(Hamiltonian(Grid((AXIS,)), (1.0,)), STRANG, 0.1, np.ones((1, 1, 5)))


def test_changing_parts_in_wave_number_are_refused():
    part = Part("wave number", lambda _: AXIS.k[None, None], in_time=lambda t: t)
    with pytest.raises(PlanError, match="wave number must be constant"):
        plan(Hamiltonian(Grid((AXIS,)), (1.0,), (part,)), STRANG, 0.1, X + 0j)
