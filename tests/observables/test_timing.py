"""Arrival and dwell times against closed forms."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.integrate import quad

from tests.observables import exact
from wavejob.loading import parse
from wavejob.plan import make_plan
from wavejob.problems import JobFileError

FREE = """
units: natural
grid: {x: {from: -40, to: 90, points: 650}}
packet: {gaussian: {at: 0, sigma: 2, wavenumber: 3}}
edges: {x: {absorb: 25}}
evolve: {until: 40, step: 0.02}
film: none
observables: [{arrival: {name: t, x: 30, toward: +x}}]
"""


def free_flux(t: float, x: float = 30.0, sigma: float = 2.0, k: float = 3.0) -> float:
    """Flux of a free Gaussian packet: density times local velocity (textbook, Cohen-Tannoudji G_I)."""
    square = sigma**2 + (t / (2 * sigma)) ** 2
    density = np.exp(-((x - k * t) ** 2) / (2 * square)) / np.sqrt(2 * np.pi * square)
    return float(density * (k + (x - k * t) * t / (4 * sigma**2 * square)))


def test_when_a_free_packet_arrives() -> None:
    total, first = (quad(lambda t, n=n: t**n * free_flux(t), 1e-9, 40, epsabs=1e-12)[0] for n in (0, 1))
    mean = first / total
    variance = quad(lambda t: (t - mean) ** 2 * free_flux(t), 1e-9, 40, epsabs=1e-12)[0] / total
    run = exact.record(FREE)
    for name, wanted in (("t.mean", mean), ("t.sigma", np.sqrt(variance))):
        result = run.result(name)
        assert result.value is not None
        assert result.error is not None
        assert abs(result.value - wanted) <= result.error < 1e-3
    assert mean > 30 / 3  # the slow part of a packet delays the mean more than the fast part advances it


def test_the_series_is_a_density() -> None:
    """Over all times it integrates to 1; its values are the flux over what arrives in all."""
    run = exact.record(FREE)
    density = run.column("t")
    assert np.trapezoid(density, run.times) == pytest.approx(1, abs=1e-4)
    middle = int(np.argmax(density))
    assert density[middle] == pytest.approx(free_flux(run.times[middle]), abs=1e-6)


def test_a_flux_that_turns_back_is_doubtful() -> None:
    """A packet that a step throws back crosses a detector before the step twice (textbook)."""
    text = FREE.replace("packet:", "potential: [{step: {at: 40, height: 20}}]\npacket:").replace(
        "points: 650", "points: 1300"
    )
    check = next(c for c in exact.record(text).checks if c.name == "t: flux backwards")
    assert not check.passed
    assert exact.record(text).verdict == "doubtful"


@pytest.mark.parametrize(("x", "said"), [("80", "absorbing layer"), ("-5", "starts beyond the detector")])
def test_detectors_that_cannot_tell_are_refused(x: str, said: str) -> None:
    with pytest.raises(JobFileError, match=said):
        make_plan(parse(FREE.replace("x: 30", f"x: {x}")))


BARRIER = """
units: natural
grid: {x: {from: -200, to: 200, points: 4000}}
potential: [{barrier: {from: 0, to: 2, height: 1}}]
packet: {gaussian: {at: -60, sigma: 8, wavenumber: 1.2}}
evolve: {until: 120, step: 0.02}
film: none
observables: [{dwell: {name: inside, from: 0, to: 2}}]
"""


def test_how_long_a_packet_dwells_in_a_barrier() -> None:
    """The integral over abs(phi(k))^2 of Buettiker's dwell time (Phys. Rev. B 27 (1983) 6178): 1.307595."""

    def average(k: float) -> float:
        weight = np.sqrt(2 * 64 / np.pi) * np.exp(-128 * (k - 1.2) ** 2)
        return float(weight * exact.dwell_time(np.array([k]))[0])

    wanted = quad(average, 0.5, 1.9, points=[1.2, 1.4], epsabs=1e-12)[0]
    assert wanted == pytest.approx(1.307595, abs=1e-6)
    result = exact.record(BARRIER).result("inside.time")
    assert result.value is not None
    assert result.error is not None
    assert abs(result.value - wanted) <= result.error < 5e-3
