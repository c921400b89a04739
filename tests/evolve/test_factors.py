"""Each kind of potential factor gives what the formula says, whatever short cut it takes."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.linalg import expm

from wavejob.evolve.channels import matrix_exponential
from wavejob.evolve.factors import Factor, PhaseFactor, SeparableFactor, StaticFactor, factor
from wavejob.evolve.phases import BLOCK, Circle
from wavejob.grid import Axis, Grid
from wavejob.hamiltonian import Hamiltonian, Layer, Part

SHARE = 0.3


def made(grid: Grid, *parts: Part, layers: tuple[Layer, ...] = (), runs: int = 1) -> Factor:
    psi = np.ones((runs, 1, *grid.shape), complex)
    result = factor(Hamiltonian(grid, (1.0,) * len(grid.axes), parts, layers), SHARE, 0.0, psi, 0.0)
    result.refresh(0.7, {})
    return result


LINE = Grid((Axis("x", -50.0, 70.0, 600),))
PLANE = Grid((Axis("x", -5.0, 7.0, 24), Axis("y", -3.0, 3.0, 30)))
LX, PX, PY = LINE.axes[0].x, PLANE.axes[0].x[:, None], PLANE.axes[1].x
EDGE = Layer("x.low", 0, 0, np.linspace(3, 0, 10), np.zeros(10))

FIELDS = {
    "uniform force": (LINE, np.array([0.4 * LX])[None], SeparableFactor),
    "a force for each run": (LINE, np.array([0.4, -1.0])[:, None, None] * LX, SeparableFactor),
    "constant": (LINE, np.full((1, 1, 1), 2.0), SeparableFactor),
    "bowl": (PLANE, (PX**2 + 0.3 * PY**2)[None, None], SeparableFactor),
    "along one axis": (PLANE, np.exp(-(PX**2))[None, None], SeparableFactor),
    "curved": (LINE, np.cos(LX / 9)[None, None], PhaseFactor),
    "saddle": (PLANE, (PX * PY)[None, None], PhaseFactor),
}


@pytest.mark.parametrize("name", FIELDS)
def test_driven_field(name):
    """Source: the definition, exp(-i share (V + f(t) W) - share rate) written out."""
    grid, field, kind = FIELDS[name]
    rest = (0.1 * grid.along(0, grid.axes[0].x) ** 2 + np.zeros(grid.shape))[None, None]
    found = made(
        grid,
        Part("position", lambda _: rest),
        Part("position", lambda _: field, in_time=lambda t: np.sin(t)),
        layers=(EDGE,),
        runs=len(field),
    )
    expected = np.exp(-1j * SHARE * (rest + np.sin(0.7) * field))
    expected[:, :, :10] *= np.exp(-SHARE * grid.along(0, EDGE.rate))[: 10 if len(grid.axes) == 1 else None]
    assert type(found) is kind
    np.testing.assert_allclose(found.table, expected, rtol=0, atol=1e-12)


def test_what_does_not_change_is_not_computed_again():
    """A pulse that is over costs nothing: the factor is made anew only where f(t) has changed."""
    calls = []

    def values(t: float) -> np.ndarray:
        calls.append(t)
        return np.exp(-((LX - 5) ** 2))[None, None]

    driven = made(LINE, Part("position", values, in_time=lambda t: max(0.0, 1 - t)))
    driven.refresh(2.0, {})
    over = driven.table.copy()
    driven._set = lambda t: pytest.fail(f"computed again at {t}")
    driven.refresh(3.0, {})
    np.testing.assert_array_equal(driven.table, over)
    assert set(calls) == {0.0}


def test_static_potentials_have_a_static_factor():
    assert type(made(LINE, Part("position", lambda _: LX[None, None]))) is StaticFactor


@pytest.mark.parametrize("size", [1, 100, BLOCK, 2 * BLOCK + 7])
def test_circle_is_the_complex_exponential(size):
    """Source: numpy's complex exponential; angles up to a thousand turns, infinite tangents among them."""
    circle, table = Circle((size,)), np.empty(size, complex)
    circle.half[:] = np.random.default_rng(0).uniform(-3000, 3000, size)
    circle.half[:4] = [0, np.pi / 2, -np.pi / 2, np.pi][:size]
    circle.into(table)
    np.testing.assert_allclose(table, np.exp(2j * circle.half), rtol=0, atol=2e-12)
    np.testing.assert_allclose(np.abs(table), 1.0, rtol=0, atol=5e-16)


@pytest.mark.parametrize("channels", [2, 3, 4])
def test_matrix_exponential_is_scipys(channels):
    """Source: scipy.linalg.expm at each point, uncoupled and degenerate points among them."""
    rng = np.random.default_rng(channels)
    half = rng.normal(size=(2, channels, channels, 5)) + 1j * rng.normal(size=(2, channels, channels, 5))
    coupling, diagonal = half + half.conj().swapaxes(1, 2), rng.normal(size=(1, channels, 5))
    coupling[..., 0] = 0
    diagonal[..., :2] = 1.5
    found = matrix_exponential(diagonal, coupling, SHARE)
    for run in range(2):
        for point in range(5):
            matrix = coupling[run, ..., point] + np.diag(diagonal[0, :, point])
            np.testing.assert_allclose(found[run, ..., point], expm(-1j * SHARE * matrix), atol=1e-13)
