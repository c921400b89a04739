"""Everything at once through the one loop, against dense matrices: 2 runs x 2 or 3 channels x 2 axes."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import solve_ivp
from scipy.linalg import expm

from tests.evolve.dense import matrix
from wavejob.evolve import SPLITTINGS, evolve, plan
from wavejob.grid import Axis, Grid
from wavejob.hamiltonian import Hamiltonian, Layer, Part

RUNS, TIME = 2, 0.4
RATE = np.array([2.0, 1.0, 0.3])
LAYERS = (
    Layer("x.low", 0, 0, RATE, np.zeros(3)),
    Layer("y.high", 1, 4, RATE[::-1], np.zeros(3)),
)


def grid(second: str) -> Grid:
    return Grid((Axis("x", -3.0, 3.0, 6), Axis("y", -2.0, 1.5, 7, second)))


def field(rng: np.random.Generator, shape: tuple[int, ...]) -> np.ndarray:
    return rng.normal(size=shape) + 1j * rng.normal(size=shape)


def hermitian(rng: np.random.Generator, channels: int, shape: tuple[int, ...]) -> np.ndarray:
    values = field(rng, (RUNS, channels, channels, *shape))
    return values + values.conj().swapaxes(1, 2)


def richardson(hamiltonian: Hamiltonian, psi0: np.ndarray, steps: int) -> np.ndarray:
    """Strang with `steps` and twice as many, extrapolated: error of order step^4."""
    ends = []
    for n in (steps, 2 * steps):
        stepper = plan(hamiltonian, SPLITTINGS["strang"], TIME / n, psi0, start=0.3, reproducible=True)
        evolve(stepper, steps=n)
        ends.append(stepper.psi.copy())
    return (4 * ends[1] - ends[0]) / 3


@pytest.mark.parametrize("second", ["periodic", "sine"])
@pytest.mark.parametrize("channels", [2, 3])
def test_coupled_channels_equal_the_matrix_exponential(second, channels):
    """Source: scipy.linalg.expm of the dense Hamiltonian, layers included."""
    rng, g = np.random.default_rng(1), grid(second)
    diagonal, coupling = rng.normal(size=(RUNS, channels, 6, 7)), hermitian(rng, channels, g.shape) / 2
    parts = (
        Part("position", lambda _: diagonal),
        Part("position", lambda _: coupling, couples=True),
        Part("wave number", lambda _: 0.1 * np.cos(g.along(0, g.axes[0].k))[None, None]),
    )
    hamiltonian = Hamiltonian(g, (1.0, 0.5), parts, LAYERS)
    psi0 = field(rng, (RUNS, channels, 6, 7))
    k = 2 * np.pi * np.fft.fftfreq(6, g.axes[0].spacing)
    waves = np.exp(1j * np.outer(g.axes[0].x, k)) / np.sqrt(6)
    extra = np.kron(np.eye(channels), np.kron((waves * 0.1 * np.cos(k)) @ waves.conj().T, np.eye(7)))
    in_space = Hamiltonian(g, (1.0, 0.5), parts[:2], LAYERS)
    dense = matrix(in_space, 0.0, runs=RUNS, channels=channels)
    exact = [expm(-1j * TIME * (h + extra)) @ psi.ravel() for h, psi in zip(dense, psi0, strict=True)]
    found = richardson(hamiltonian, psi0, 200)
    # Strang's own error at 400 steps is 1e-4 here, so the extrapolated one is of order 1e-8
    np.testing.assert_allclose(found.reshape(RUNS, -1), exact, rtol=0, atol=1e-7)


@pytest.mark.parametrize("second", ["periodic", "sine"])
def test_time_dependent_coupling_equals_dop853(second):
    """Source: scipy's DOP853 on the dense Hamiltonian, tolerance 1e-10."""
    rng, g = np.random.default_rng(2), grid(second)
    diagonal, coupling = rng.normal(size=(1, 2, 6, 7)), hermitian(rng, 2, g.shape) / 2
    x = g.along(0, g.axes[0].x)[None, None]
    parts = (
        Part("position", lambda _: diagonal),
        Part("position", lambda _: coupling, in_time=lambda t: np.sin(3 * t), couples=True),
        Part("position", lambda t: np.exp(-((x - t) ** 2)), moves=True),
        Part("position", lambda _: x, in_time=lambda t: np.cos(2 * t)),
    )
    hamiltonian = Hamiltonian(g, (1.0, 0.5), parts, LAYERS)
    psi0 = field(rng, (RUNS, 2, 6, 7))

    def slope(t: float, y: np.ndarray) -> np.ndarray:
        dense = matrix(hamiltonian, t, runs=RUNS, channels=2)
        return np.concatenate([-1j * h @ p for h, p in zip(dense, np.split(y, RUNS), strict=True)])

    exact = solve_ivp(slope, (0.3, 0.3 + TIME), psi0.ravel(), "DOP853", rtol=1e-10, atol=1e-10).y[:, -1]
    np.testing.assert_allclose(richardson(hamiltonian, psi0, 200).ravel(), exact, rtol=0, atol=1e-7)


@pytest.mark.parametrize("splitting", SPLITTINGS.values(), ids=SPLITTINGS)
def test_uncoupled_channels_and_runs_with_their_own_potentials(splitting):
    """Source: scipy.linalg.expm; smooth potentials, so that order 4 is reached on a coarse grid."""
    rng = np.random.default_rng(3)
    axes = Axis("x", -3.0, 3.0, 16), Axis("y", -2.0, 1.5, 12, "sine")
    g = Grid(axes)
    x, y = g.along(0, axes[0].x), g.along(1, axes[1].x - axes[1].low)
    depth = np.array([[1.0, 0.5], [-0.7, 0.2]])[:, :, None, None]
    p, q = 2 * np.pi / axes[0].length, np.pi / axes[1].length
    part = Part(
        "position",
        lambda _: depth * np.cos(p * x) * np.cos(q * y),
        lambda _: (-depth * p * np.sin(p * x) * np.cos(q * y), -depth * q * np.cos(p * x) * np.sin(q * y)),
    )
    hamiltonian = Hamiltonian(g, (1.0, 0.5), (part,))
    # long waves only: the squared gradient is the double commutator for fields the grid resolves
    psi0 = field(rng, (2, 2, 1, 1)) * (1 + np.exp(1j * p * x)) * np.sin(q * y)
    stepper = plan(hamiltonian, splitting, TIME / 100, psi0, reproducible=True)
    evolve(stepper, steps=100)
    exact = [
        expm(-1j * TIME * h) @ psi.ravel()
        for h, psi in zip(matrix(hamiltonian, 0.0, runs=2, channels=2), psi0, strict=True)
    ]
    limit = {2: 3e-5, 4: 1e-10}[splitting.order]
    np.testing.assert_allclose(stepper.psi.reshape(2, -1), exact, atol=limit, rtol=0)
