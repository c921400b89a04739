"""Free packets and packets in a uniform field: all closed forms."""

from __future__ import annotations

import numpy as np
import pytest
from scipy.special import erf, erfc

from tests.truth import formulas as f
from tests.truth.running import column, run, value

FREE = """
units: natural
grid: {x: {from: -60, to: 60, points: 1024}}
packet: {gaussian: {at: -10, sigma: 1, wavenumber: 2}}
evolve: {until: 5}
observables: [norm, position, momentum, width, energy, ehrenfest, force]
"""


def test_free_packet():
    """Source: Darwin 1927. Without a potential every factor is exact: rounding only."""
    record = run(FREE)
    assert np.abs(record.psi - f.free_gaussian(record.plan.axis.x, 5.0, at=-10, sigma=1, k=2)).max() < 1e-12
    assert value(record, "width.x.final") == pytest.approx(2.69258240357, abs=1e-10)
    assert value(record, "position.x.final") == pytest.approx(0.0, abs=1e-10)
    assert value(record, "momentum.x.final") == pytest.approx(2.0, abs=1e-12)
    assert value(record, "energy.final") == pytest.approx(2 + 1 / 8, abs=1e-12)  # k^2 / 2m + 1 / 8 m sigma^2
    for name in ("norm.drift", "energy.drift", "ehrenfest.position", "ehrenfest.momentum"):
        assert value(record, name) < 1e-11


def test_mass_and_start_time():
    """Source: Darwin 1927, with a mass of 3 and a clock that starts at -2."""
    record = run("""
units: natural
particle: {mass: 3}
grid: {x: {from: -30, to: 30}}
packet: {gaussian: {at: 3, sigma: 0.7, velocity: -1}}
evolve: {start: -2, until: 4}
observables: [position, momentum, width]
""")
    assert record.times[0] == -2
    assert value(record, "width.x.final") == pytest.approx(f.free_width(6, 0.7, 3), abs=1e-9)
    assert value(record, "position.x.final") == pytest.approx(-3, abs=1e-9)
    assert value(record, "momentum.x.final") == pytest.approx(-3, abs=1e-9)


@pytest.mark.parametrize("points", ["", ", points: 1024"])
def test_uniform_field(points):
    """Source: Kennard 1927: <x> = x0 + k t + F t^2 / 2, <p> = k + F t, and the free width. A straight slope is advanced
    exactly but for a phase, so rounding only; left to choose, the default accuracy."""
    record = run(f"""
units: natural
grid: {{x: {{from: -60, to: 60{points}}}}}
potential: [{{linear: {{at: 0, slope: -0.5}}}}]
packet: {{gaussian: {{at: -10, sigma: 1, wavenumber: 1}}}}
evolve: {{until: 6}}
observables: [position, momentum, width, energy, force, ehrenfest]
""")
    close = 1e-9 if points else 1e-4
    assert value(record, "position.x.final") == pytest.approx(5, abs=close)
    assert value(record, "momentum.x.final") == pytest.approx(4, abs=close)
    assert value(record, "width.x.final") == pytest.approx(np.sqrt(10), abs=close)
    assert value(record, "energy.final") == pytest.approx(5.625, abs=close)
    assert np.abs(column(record, "force.x") - 0.5).max() < close
    assert value(record, "ehrenfest.position") < close
    assert value(record, "ehrenfest.momentum") < close


def stored(folder, x, psi, name="packet.txt"):
    """A packet file: columns x, real, imaginary."""
    np.savetxt(folder / name, np.column_stack([x, psi.real, psi.imag]), fmt="%.17g")
    return name


def cells(low: float, high: float, points: int) -> np.ndarray:
    return low + (np.arange(points) + 0.5) * (high - low) / points


@pytest.mark.parametrize("t", [2.0, 4.0])
def test_airy_packet_bends_without_force(tmp_path, t):
    """Source: Siviloglou & Christodoulides 2007, Berry & Balazs 1979: the main lobe moves by t^2 / 4 although no force
    acts and the mean stays. Tolerance: what is left of the packet, e^(alpha x), at the low end of the grid."""
    x = cells(-250, 90, 8192)
    norm = np.sqrt(np.exp(2 * 0.1**3 / 3) / np.sqrt(8 * np.pi * 0.1))
    start, end = (f.airy_packet(x, s, 0.1) / norm for s in (0.0, t))
    name = stored(tmp_path, x, start)
    record = run(
        f"""
units: natural
grid: {{x: {{from: -250, to: 90, points: 8192}}}}
edges: {{x: wrap}}
packet: {{file: {{path: {name}}}}}
evolve: {{until: {t}, step: {t}}}
observables: [norm, position]
""",
        tmp_path,
    )
    assert np.abs(record.psi - end).max() < 1e-9
    places = record.plan.axis.x
    lobes = [places[np.argmax(np.abs(psi))] for psi in (start, record.psi)]
    assert lobes[1] - lobes[0] == pytest.approx(t**2 / 4, abs=0.07)  # exact without decay: 2 spacings, and alpha
    assert np.ptp(column(record, "position.x")) < 1e-7


def test_diffraction_in_time(tmp_path):
    """Source: M. Moshinsky, Phys. Rev. 88 (1952) 625: a beam let go by a shutter has Fresnel's straight-edge pattern in
    time. Tolerance: the cut is smooth over s = 0.039, which lowers fringes of wave number q by q^2 s^2 / 2, by 1 % of
    their height of 0.1 where they are compared."""
    x = cells(-440, 160, 32768)
    cut = erfc(x / (3 * 600 / 32768)) / 2  # as sharp as the points allow
    beam = cut * np.exp(5j * x) * (1 + np.tanh((x + 400) / 5)) / 2
    scale = np.sum(np.abs(beam) ** 2) * 600 / 32768
    name = stored(tmp_path, x, beam)
    record = run(
        f"""
units: natural
grid: {{x: {{from: -440, to: 160, points: 32768}}}}
edges: {{x: wrap}}
packet: {{file: {{path: {name}}}}}
evolve: {{until: 4, step: 4}}
observables: [norm]
""",
        tmp_path,
    )
    near = (x > 10) & (x < 40)
    density = np.abs(record.psi) ** 2 * scale
    assert np.abs(density - f.shutter_density(x, 4.0, 5.0))[near].max() < 2e-3
    assert density[near].max() == pytest.approx(1.3704, abs=2e-3)
    assert np.interp(20.0, x, density) == pytest.approx(0.25, abs=2e-3)


def test_double_slit_in_time(tmp_path):
    """Source: Fraunhofer's two slits (Born & Wolf, section 8.5): bright fringes 2 pi hbar t / m d apart, with slits of
    width 1 at a distance d = 6, t = 200. Near-field correction of the minima below d^2 / t, one spacing 0.2."""
    x = cells(-3276.8, 3276.8, 32768)
    away, soft = np.abs(x) - 3, 3 * 0.2  # edges as sharp as the points allow
    slits = (erf((away + 0.5) / soft) - erf((away - 0.5) / soft)) / 2 + 0j
    name = stored(tmp_path, x, slits)
    record = run(
        f"""
units: natural
grid: {{x: {{from: -3276.8, to: 3276.8, points: 32768}}}}
edges: {{x: wrap}}
packet: {{file: {{path: {name}}}}}
evolve: {{until: 200, step: 200}}
observables: [norm]
""",
        tmp_path,
    )
    density = np.abs(record.psi) ** 2
    first = (x > 70) & (x < 140)
    minimum = x[first][np.argmin(density[first])]
    assert 2 * minimum == pytest.approx(2 * np.pi * 200 / 6, abs=2 * (36 / 200 + 0.2))
