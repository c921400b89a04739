"""Absorbing layers: the published table, and packets sent into them."""

from __future__ import annotations

import math

import numpy as np
import pytest

from wavejob.edges import LayerShape, Momenta, layer, recommended_depth, reflection, tuned
from wavejob.evolve import SPLITTINGS, plan
from wavejob.grid import Axis, Grid, Transform
from wavejob.hamiltonian import Hamiltonian
from wavejob.loading import parse
from wavejob.plan import make_plan
from wavejob.problems import JobFileError

LIMIT = 1e-5


# D. E. Manolopoulos, J. Chem. Phys. 117, 9552 (2002), absorber with delta = 0.2; R integrated as an ordinary
# differential equation from the pole outward, an independent method, to the digits written here.
@pytest.mark.parametrize(
    ("k", "expected", "last_digit"),
    [
        (0.5, 0.1429, 1e-4),
        (0.75, 0.037437, 1e-6),
        (1.0, 0.005837, 1e-6),
        (1.5, 0.00026542, 1e-8),
        (2.0, 4.2716e-05, 1e-9),
        (3.0, 3.513e-06, 1e-9),
        (5.0, 1.3336e-07, 1e-11),
    ],
)
def test_reflection_of_the_published_layer(k: float, expected: float, last_digit: float) -> None:
    shape = LayerShape(depth=6.555144, delta=0.2, gap=0.0, mass=1.0)
    assert shape.k_min == pytest.approx(1.0, rel=1e-6)
    assert reflection(shape, np.array([k]))[0] == pytest.approx(expected, abs=0.51 * last_digit)


def test_published_layer_keeps_its_promise() -> None:
    """Reflection below 1 % for every energy above E_min at delta = 0.2 (same paper)."""
    shape = LayerShape(depth=6.555144, delta=0.2, gap=0.0, mass=1.0)
    assert reflection(shape, np.linspace(1, 12, 200)).max() < 0.01


def test_slope_belongs_to_rate() -> None:
    """Central difference, error step^2 W''' / 6 (textbook)."""
    shape = LayerShape.on_grid(depth=10.0, delta=0.2, mass=0.5, spacing=0.4)
    s, step = np.linspace(0.1, 9.9, 50), 1e-4
    difference = (shape.rate(s + step) - shape.rate(s - step)) / (2 * step)
    np.testing.assert_allclose(shape.slope(s), difference, rtol=1e-6)
    assert np.all(shape.rate(np.linspace(-5, 0, 6)) == 0)
    assert np.all(shape.slope(np.linspace(-5, 0, 6)) == 0)


def test_layers_mirror_each_other() -> None:
    axis = Axis("x", -20, 20, 100)
    shape = LayerShape.on_grid(depth=8.0, delta=0.2, mass=1.0, spacing=axis.spacing)
    low, high = layer(0, axis, shape, "low"), layer(0, axis, shape, "high")
    assert (low.name, low.first, high.name, high.first) == ("x.low", 0, "x.high", 80)
    np.testing.assert_allclose(low.rate, high.rate[::-1])
    np.testing.assert_allclose(low.slope, -high.slope[::-1])
    assert np.all(np.diff(high.rate) > 0)


def test_momenta_count_one_direction_or_both() -> None:
    k = np.linspace(-4, 4, 801)
    weight = np.exp(-((k - 1) ** 2) / 2)
    weight /= weight.sum()
    high, low, both = (Momenta.of_density(k, weight, side) for side in ("high", "low", None))
    assert high.weight.sum() == pytest.approx(weight[k > 0].sum(), rel=1e-12)
    assert low.weight.sum() == pytest.approx(weight[k < 0].sum(), rel=1e-12)
    assert both.k @ both.weight == pytest.approx(np.abs(k) @ weight, rel=1e-12)
    assert len(both.k) <= 64


def test_energies_are_flat() -> None:
    momenta = Momenta.of_energies(0.5, 2.0, mass=2.0)
    assert momenta.weight.sum() == pytest.approx(1)
    assert momenta.k**2 / 4 @ momenta.weight == pytest.approx(1.25)


def test_tuned_is_better_than_the_published_delta() -> None:
    momenta = Momenta.of_energies(0.5, 2.0, mass=1.0)
    published = LayerShape.on_grid(12.0, 0.2, 1.0, 0.3)
    best = tuned(12.0, 1.0, momenta, 0.3)
    assert best.reflected < 0.8 * float(reflection(published, momenta.k) @ momenta.weight)


def test_nothing_absorbs_a_packet_at_rest() -> None:
    """Reflection tends to 1 as k tends to 0 (textbook), so a tail down to k = 0 is never fully absorbed."""
    k = np.linspace(-1, 1, 40001)
    weight = np.exp(-(k**2) / 0.02)
    momenta = Momenta.of_density(k, weight / weight.sum(), "high")
    assert recommended_depth(1.0, momenta, 0.5) == math.inf
    shape = tuned(50.0, 1.0, momenta, 0.5)
    assert reflection(shape, np.array([1e-4]))[0] > 0.9
    assert shape.reflected > 1e-3


def test_nothing_to_absorb() -> None:
    assert tuned(5.0, 1.0, Momenta(np.empty(0), np.empty(0)), 0.5).reflected == 0


# The prediction is stationary, the run is not: they share only W(x). On coarse grids, where 2 k0 reaches the
# largest wave number, aliases of the kink at the entrance subtract from what is predicted.
@pytest.mark.parametrize("transform", ["periodic", "sine"])
@pytest.mark.parametrize(
    ("k0", "sigma", "spacing", "step", "scheme", "least"),
    [
        (2.0, 8.0, 0.4, 0.1, "chin_4a", 0.6),
        (2.0, 8.0, 0.8, 0.2, "strang", 0.2),
        (1.2, 4.0, 0.4, 0.2, "strang", 0.6),
        (1.2, 4.0, 0.8, 0.2, "chin_4a", 0.6),
    ],
)
def test_a_run_reflects_what_is_predicted(
    transform: Transform, k0: float, sigma: float, spacing: float, step: float, scheme: str, least: float
) -> None:
    k = np.linspace(0, 2 * k0, 4001)
    weight = np.exp(-2 * sigma**2 * (k - k0) ** 2)
    momenta = Momenta.of_density(k, weight / weight.sum(), "high")
    depth = recommended_depth(1.0, momenta, spacing)
    assert 3 < depth * k0 < 20  # at most three wavelengths
    points = 2 * math.ceil((8 * sigma + depth) / spacing)
    axis = Axis("x", -points * spacing / 2, points * spacing / 2, points, transform)
    shape = tuned(depth, 1.0, momenta, spacing)
    measured = left_over(axis, shape, k0, sigma, step, scheme)
    assert measured < LIMIT
    assert least * shape.reflected < measured < 1.3 * shape.reflected


def test_layer_covers_whole_cells() -> None:
    momenta = Momenta.of_energies(0.5, 2.0, mass=1.0)
    assert tuned(10.3, 1.0, momenta, 0.5).depth == pytest.approx(10.0)
    assert tuned(10.0, 1.0, momenta, 0.1).depth == pytest.approx(10.0)


def test_a_chosen_layer_leaves_the_packet_alone() -> None:
    """Common practice: what starts inside a layer is lost, so that no figure of the run would be right."""
    text = """
units: natural
grid: {x: {from: -45, to: 45}}
potential: [{barrier: {from: 0, to: 1, height: 2}}]
edges: {x: {absorb: auto}}
packet: {gaussian: {at: -18, sigma: 3, wavenumber: 2}}
evolve: {until: 5, accuracy: 1e-4}
observables: [norm]
"""
    with pytest.raises(JobFileError) as refused:
        make_plan(parse(text))
    assert "of the packet at the start" in refused.value.problems[0].message
    make_plan(parse(text.replace("-45", "-95")))


def left_over(axis: Axis, shape: LayerShape, k0: float, sigma: float, step: float, scheme: str) -> float:
    """Probability left when what was sent back has returned to where the packet began."""
    layers = (layer(0, axis, shape, "low"), layer(0, axis, shape, "high"))
    psi = np.exp(-(axis.x**2) / (4 * sigma**2) + 1j * k0 * axis.x)
    psi /= np.sqrt((np.abs(psi) ** 2).sum() * axis.spacing)
    hamiltonian = Hamiltonian(Grid((axis,)), masses=(1.0,), layers=layers)
    stepper = plan(hamiltonian, SPLITTINGS[scheme], step, psi[None, None], reproducible=True)
    stepper.advance(0, round(axis.length / k0 / step))
    left = float((np.abs(stepper.psi) ** 2).sum() * axis.spacing)
    assert left + sum(stepper.absorbed.values()) == pytest.approx(1, abs=1e-11)
    return left
