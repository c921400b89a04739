"""Eigenstates and levels against closed forms and published digits, each with its source."""

from __future__ import annotations

import math

import numpy as np
import pytest

from wavejob.evidence.assess import assess
from wavejob.loading import parse
from wavejob.plan import make_plan
from wavejob.problems import JobFileError
from wavejob.simulate import Record, simulate

ROUNDING = 2e-11  # what a residual of rounding size does to an energy of order 1 is far below


def ran(low: float, high: float, potential: str, level: int = 0, **more: object) -> Record:
    """A short run that starts in a level of `potential`, in natural units, with the eight lowest levels."""
    return simulate(make_plan(parse(written(low, high, potential, level, **more))))


def written(
    low: float,
    high: float,
    potential: str,
    level: int = 0,
    *,
    points: int = 256,
    count: int = 6,
    mass: float = 1.0,
    edges: str = "wrap",
) -> str:
    return f"""
units: natural
particle: {{mass: {mass}}}
grid: {{x: {{from: {low}, to: {high}, points: {points}}}}}
potential: [{potential}]
edges: {{x: {edges}}}
packet: {{eigenstate: {{level: {level}}}}}
evolve: {{until: 1}}
observables: [norm, {{levels: {{count: {count}}}}}, {{overlap: {{name: stays, with: start}}}}]
film: none
"""


def energies(record: Record, count: int) -> list[float | None]:
    return [record.result(f"levels.energy[{n}]").value for n in range(count)]


@pytest.mark.parametrize("points", [128, 256, 1000, 4096])
def test_harmonic(points: int) -> None:
    """(n + 1/2) omega, textbook; with dense grids and with those that need sharpening."""
    record = ran(-12, 12, "{harmonic: {at: 0, omega: 1.0}}", 3, points=points)
    assert energies(record, 6) == pytest.approx(np.arange(6) + 0.5, abs=ROUNDING)
    assert record.result("eigenstate.energy").value == pytest.approx(3.5, abs=ROUNDING)
    assert record.result("eigenstate.residual").value < 1e-14 * (math.pi * points / 24) ** 2 + 1e-12


def test_quartic() -> None:
    """H = p^2 + x^4: Babenko and Nesterov, arXiv:2505.06317, and earlier tables; digits from memory."""
    known = [1.06036209048418, 3.79967302980139, 7.45569793798674, 11.6447455113782, 16.2618260188502]
    record = ran(-6, 6, "{polynomial: {at: 0, coefficients: [0, 0, 0, 0, 1]}}", mass=0.5)
    assert energies(record, 5) == pytest.approx(known, abs=1e-11)


@pytest.mark.parametrize("points", [512, 4096])
def test_poeschl_teller(points: int) -> None:
    """-(lambda - n)^2 / 2 with lambda = 3 (Landau and Lifshitz, section 23, problem 5), three levels."""
    record = ran(-30, 30, "{sech2: {at: 0, width: 1, height: -6}}", 2, points=points)
    assert energies(record, 3) == pytest.approx([-4.5, -2, -0.5], abs=1e-9)
    assert record.result("levels.bound").value == 3


def test_double_well_splitting() -> None:
    """V = x^2 (1 - sqrt(g) x)^2 / 2 with g = 0.03: E_0 = 0.45404995853 and splitting 0.0198353011 by a
    discrete-variable calculation; Zinn-Justin and Jentschura, Ann. Phys. 313, 197 (2004), agree to 1 %."""
    root = math.sqrt(0.03)
    well = f"{{polynomial: {{at: 0, coefficients: [0, 0, 0.5, {-root}, {0.03 / 2}]}}}}"
    record = ran(-6, 12, well, 1)
    low, high = energies(record, 2)
    assert low == pytest.approx(0.45404995853, abs=1e-11)
    assert high - low == pytest.approx(0.0198353011, abs=1e-10)
    series = 2 / math.sqrt(math.pi * 0.03) * math.exp(-1 / 0.18)
    series *= 1 - 71 / 12 * 0.03 - 6299 / 288 * 0.03**2 - 2691107 / 10368 * 0.03**3
    assert high - low == pytest.approx(series, rel=0.02)


def test_bouncer_above_a_mirror() -> None:
    """|a_n| m g l with the zeros of Ai, DLMF table 9.9.1; walls make the force end abruptly, so the digits
    come with the sixth power of the points."""
    known = np.array([2.338107410459767, 4.087949444130971, 5.520559828095551, 6.786708090071759])
    errors = []
    for points in (128, 256):
        record = ran(0, 20, "{linear: {at: 0, slope: 1}}", points=points, mass=0.5, edges="wall")
        errors.append(np.abs(np.array(energies(record, 4)) - known).max())
    assert errors[1] < 1e-6
    assert errors[1] < errors[0] / 10


HCL = """
units: {{length: pm, time: fs, energy: meV}}
particle: {{mass: 0.979593 dalton}}
grid: {{x: {{from: 60 pm, to: 400 pm, points: 512}}}}
potential: [{{morse: {{at: 127.455 pm, depth: 42341.9012 cm^-1, range: {reach} pm}}}}]
edges: {{x: wall}}
packet: {{eigenstate: {{level: 1}}}}
evolve: {{until: 1 fs}}
observables: [{{levels: {{count: 11}}}}]
film: none
"""


def test_morse_of_hydrogen_chloride() -> None:
    """omega_e (v + 1/2) - omega_e x_e (v + 1/2)^2 for 2990.9463 and 52.8186 cm^-1 (Huber and Herzberg 1979,
    NIST WebBook), from P. M. Morse, Phys. Rev. 34, 57 (1929). The digits of the mass limit the agreement."""
    record = simulate(make_plan(parse(HCL.format(reach=100 / 1.75193476))))
    units = record.plan.job.units
    wavenumber = units.read("1 cm^-1", "energy")
    v = np.arange(11) + 0.5
    found = np.array(energies(record, 11)) / wavenumber
    assert found == pytest.approx(2990.9463 * v - 52.8186 * v**2, rel=1e-6)
    assert found[1] - found[0] == pytest.approx(2885.3091, abs=3e-3)


@pytest.mark.parametrize("level", [0, 1, 4])
def test_stays_put(level: int) -> None:
    """A stationary state keeps its overlap with the start at 1 and its mean place at rest."""
    record = ran(-6, 12, "{polynomial: {at: 0, coefficients: [0, 0, 0.5, -0.1, 0.015]}}", level)
    assert record.result("stays.min").value == pytest.approx(1, abs=1e-8)


def test_sign_and_nodes() -> None:
    """Level n has n nodes (oscillation theorem), and its first lobe of size is positive whatever the grid."""
    for points in (256, 400, 1024):
        psi = make_plan(parse(written(-12, 12, "{harmonic: {at: 0.3, omega: 1.0}}", 3, points=points))).psi
        assert np.all(psi.imag == 0)
        strong = psi.real[np.abs(psi) > 1e-6]
        assert np.count_nonzero(np.diff(np.sign(strong))) == 3
        assert strong[0] > 0


def test_sharp_well_has_an_honest_bar() -> None:
    """Even levels of a square well: k tan(k a) = sqrt(2 m V - k^2) (textbook), to within the error bar."""
    from scipy.optimize import brentq

    k = brentq(lambda k: k * math.tan(k) - math.sqrt(6 - k**2), 0.5, 1.5)
    text = written(-20, 20, "{well: {from: -1, to: 1, depth: 3}}", points=512)
    energy = assess(make_plan(parse(text))).record.result("eigenstate.energy")
    assert energy.value is not None
    assert energy.error is not None
    assert abs(energy.value - (k**2 / 2 - 3)) < max(energy.error, 1e-6)
    assert energy.error < 1e-2


def test_state_of_other_terms() -> None:
    """`of` names the potential: a harmonic ground state released in free space spreads as a Gaussian packet,
    sigma(t)^2 = sigma^2 + (t / 2 m sigma)^2 (textbook), sigma^2 = 1 / 2 m omega."""
    record = simulate(
        make_plan(
            parse(
                """
units: natural
grid: {x: {from: -15, to: 15, points: 256}}
packet: {eigenstate: {level: 0, of: [{harmonic: {at: 1, omega: 2.0}}]}}
evolve: {until: 2}
observables: [width, position]
"""
            )
        )
    )
    assert record.result("eigenstate.energy").value == pytest.approx(1.0, abs=1e-11)
    assert record.result("position.x.final").value == pytest.approx(1.0, abs=1e-9)
    assert record.result("width.x.final").value == pytest.approx(math.sqrt(0.25 + 4), rel=1e-9)


def test_overlap_with_an_eigenstate() -> None:
    """A displaced ground state holds level n with probability exp(-a) a^n / n! with a = d^2 m omega / 2
    (Glauber 1963)."""
    record = simulate(
        make_plan(
            parse(
                """
units: natural
grid: {x: {from: -12, to: 12, points: 256}}
potential: [{harmonic: {at: 0, omega: 1.0}}]
packet: {gaussian: {at: 1.5, sigma: 0.7071067811865476}}
evolve: {until: 1}
observables: [{overlap: {name: second, with: {eigenstate: {level: 2}}}}]
"""
            )
        )
    )
    mean = 1.5**2 / 2
    assert record.result("second.final").value == pytest.approx(math.exp(-mean) * mean**2 / 2, abs=1e-5)
    assert record.result("second.max").value == pytest.approx(math.exp(-mean) * mean**2 / 2, abs=1e-5)


def test_degenerate_level_is_refused() -> None:
    """Waves to the right and to the left have the same energy on a ring."""
    with pytest.raises(JobFileError, match="not unique"):
        make_plan(parse(written(-5, 5, "", 1)))


def test_more_levels_than_points_is_refused() -> None:
    with pytest.raises(JobFileError, match="cannot hold"):
        make_plan(parse(written(-5, 5, "{harmonic: {at: 0, omega: 1.0}}", 40, points=64)))


def test_state_that_is_not_bound_is_doubtful() -> None:
    """Above the barrier the box, not the potential, makes the state: it stands at the ends of the grid."""
    text = written(-10, 10, "{sech2: {at: 0, width: 1, height: -1}}", 3).replace("edges: {x: wrap}\n", "")
    record = simulate(make_plan(parse(text)))
    assert record.verdict == "doubtful"
    assert any(check.name == "edge leakage" and not check.passed for check in record.checks)
