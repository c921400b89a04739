"""Reflection and transmission of packets, against plane-wave formulas averaged over the packet's momenta.

Points and step are left out: the job must keep the accuracy it asks for, which is the tolerance, beside the share of
the packet that has not yet passed at the end (the formulas hold for infinite time).
"""

from __future__ import annotations

import numpy as np
import pytest

from tests.truth import formulas as f
from tests.truth.running import run, value


def scattered(potential: str, *, right: float, at: float, sigma: float, k: float, until: float, accuracy: float):
    """The run of one packet coming from the left; `right` is where what was let through begins."""
    return run(f"""
units: natural
grid: {{x: {{from: -160, to: 160}}}}
potential: [{potential}]
edges: {{x: wrap}}
packet: {{gaussian: {{at: {at}, sigma: {sigma}, wavenumber: {k}}}}}
evolve: {{until: {until}, accuracy: {accuracy}}}
observables:
  - norm
  - inside: {{name: right, from: {right}, to: 160}}
  - inside: {{name: left, from: -160, to: -8}}
  - crossing: {{name: through, x: 8, toward: +x}}
""")


SHARP = {
    # potential, exact T(k), packet
    "step": ("step: {at: 0.1, height: 1}", lambda k: 1 - f.step_reflection(k, 1.0), (8, 2.0, 62)),
    "barrier, tunnelling": (
        "barrier: {from: -0.3, to: 1.7, height: 1}",
        lambda k: f.barrier_transmission(k, 1, 2),
        (8, 1.2, 105),
    ),
    "barrier, above": (
        "barrier: {from: -1, to: 1, height: 1}",
        lambda k: f.barrier_transmission(k, 1, 2),
        (8, 1.8, 70),
    ),
    "well": ("well: {from: -1, to: 1, depth: 1}", lambda k: f.barrier_transmission(k, -1, 2), (8, 1.2, 105)),
    "two barriers": (
        "stack: {at: -2, layers: [{thickness: 1, height: 1}, {thickness: 2, height: 0}, {thickness: 1, height: 1}]}",
        lambda k: f.layered_transmission(k, [0, 1, 3, 4], [1, 0, 1]),
        (8, 1.2, 105),
    ),
}


@pytest.mark.parametrize("case", SHARP)
def test_sharp_edges(case):
    """Sources: Landau & Lifshitz, section 25, and Tsu & Esaki 1973, see formulas.py."""
    potential, share, (sigma, k, until) = SHARP[case]
    wanted = f.over_momenta(share, sigma=sigma, k=k)
    record = scattered(potential, right=8, at=-60, sigma=sigma, k=k, until=until, accuracy=1e-4)
    late = 1 - value(record, "right.final") - value(record, "left.final")
    assert late < 2e-5
    assert value(record, "right.final") == pytest.approx(wanted, abs=1e-4 + late)
    assert value(record, "left.final") == pytest.approx(1 - wanted, abs=1e-4 + late)
    assert value(record, "through.total") == pytest.approx(value(record, "right.final"), abs=1e-6)


SMOOTH = {
    "sech2 barrier": ("sech2: {at: 0, width: 1, height: 1}", lambda k: f.sech2_transmission(k, 1, 1), 1.3),
    "sech2 well": ("sech2: {at: 0, width: 1, height: -1.875}", lambda k: f.sech2_transmission(k, -1.875, 1), 1.3),
    "Eckart": ("eckart: {at: 0, width: 0.5, A: -0.4, B: 4}", lambda k: f.eckart_transmission(k, -0.4, 4, 0.5), 1.25),
}


@pytest.mark.parametrize("case", SMOOTH)
def test_smooth_barriers(case):
    """Sources: Landau & Lifshitz, section 25, problem 4; C. Eckart, Phys. Rev. 35 (1930) 1303."""
    potential, share, k = SMOOTH[case]
    wanted = f.over_momenta(share, sigma=5, k=k)
    record = scattered(potential, right=8, at=-50, sigma=5, k=k, until=85, accuracy=1e-6)
    late = 1 - value(record, "right.final") - value(record, "left.final")
    assert late < 2e-5
    assert value(record, "right.final") == pytest.approx(wanted, abs=1e-6 + late)


@pytest.mark.parametrize("n", [1, 2, 3])
def test_wells_without_reflection(n):
    """Source: V = -n (n + 1) / 2 cosh^2 x lets all through (Bargmann 1949; Landau & Lifshitz, section 25), with
    t(k) = product of (k + i j) / (k - i j): ahead of a free packet by the mean of sum over j of 2 j / (k^2 + j^2)."""
    ahead = f.over_momenta(lambda k: sum(2 * j / (k**2 + j**2) for j in range(1, n + 1)), sigma=4, k=1.5)
    record = run(f"""
units: natural
grid: {{x: {{from: -100, to: 130}}}}
potential: [{{sech2: {{at: 0, width: 1, height: {-n * (n + 1) / 2}}}}}]
edges: {{x: wrap}}
packet: {{gaussian: {{at: -40, sigma: 4, wavenumber: 1.5}}}}
evolve: {{until: 60, accuracy: 1e-6}}
observables:
  - position
  - inside: {{name: back, from: -100, to: -10}}
""")
    assert value(record, "back.final") < 2e-6
    # slow parts still inside the well: their share, below 1e-6, times their distance from where they will be
    assert value(record, "position.x.final") - (-40 + 1.5 * 60) == pytest.approx(ahead, abs=4e-6 + 1e-6 * 4)


@pytest.mark.slow
def test_double_barrier_of_gallium_arsenide():
    """Source: transfer matrix (Tsu & Esaki 1973) averaged over the packet; 0.067 electron masses, 300 meV, 3 - 5 -
    3 nm, resonance at 88.6 meV with a width of 4.73 meV, so a lifetime of 140 fs."""
    unit = 38.0998211 / 0.067  # hbar^2 / 2m in meV nm^2, CODATA 2022
    high = 300 / unit / 2
    record = run("""
units: {length: nm, time: fs, energy: meV}
particle: {mass: 0.067 electron_mass, charge: -1 e}
grid: {x: {from: -1000, to: 1000}}
potential:
  - stack:
      at: 0
      layers: [{thickness: 3, height: 300}, {thickness: 5, height: 0}, {thickness: 3, height: 300}]
edges: {x: wrap}
packet: {gaussian: {at: -110, sigma: 15, energy: 88 meV, toward: +x}}
evolve: {until: 1100}
observables:
  - inside: {name: right, from: 11.5, to: 1000}
  - inside: {name: within, from: -0.5, to: 11.5}
""")
    wanted = f.over_momenta(
        lambda k: f.layered_transmission(k, [0, 3, 8, 11], [high, 0, high]), sigma=15, k=np.sqrt(88 / unit)
    )
    within = value(record, "within.final")
    assert within < 1e-3
    assert value(record, "right.final") == pytest.approx(wanted, abs=1e-4 + within)


def time_inside(points: int, step: float) -> float:
    """Integral over time of the probability inside a barrier."""
    record = run(f"""
units: natural
grid: {{x: {{from: -160, to: 160, points: {points}}}}}
potential: [{{barrier: {{from: 0, to: 2, height: 1}}}}]
edges: {{x: wrap}}
packet: {{gaussian: {{at: -60, sigma: 8, wavenumber: 1.2}}}}
evolve: {{until: 105, step: {step}, order: 4}}
observables: [{{inside: {{name: barrier, from: 0, to: 2}}}}]
""")
    return value(record, "barrier.mean") * 105


def test_dwell_time_of_a_barrier():
    """Source: M. Buettiker, Phys. Rev. B 27 (1983) 6178: the integral of the probability inside over time is the mean
    of the dwell time over the packet's momenta. An edge on a grid errs in the second or a higher power of the spacing,
    so by 0.8 of what 1.5 times the points change, or less."""
    wanted = f.over_momenta(lambda k: f.barrier_dwell(k, 1.0, 2.0), sigma=8, k=1.2)
    assert wanted == pytest.approx(1.307595, abs=1e-6)  # found apart from this package
    coarse, fine = time_inside(1000, 0.035), time_inside(1500, 0.0175)
    assert abs(fine - coarse) < 4e-3
    assert fine == pytest.approx(wanted, abs=abs(fine - coarse) / (1.5**2 - 1))


def through_barrier(width: float, points: int, step: float) -> float:
    """Mean time at which a packet with most momenta below the top appears behind a barrier of height 1."""
    record = run(f"""
units: natural
grid: {{x: {{from: -150, to: 150, points: {points}}}}}
potential: [{{barrier: {{from: 0, to: {width}, height: 1}}}}]
edges: {{x: wrap}}
packet: {{gaussian: {{at: -70, sigma: 10, wavenumber: 1}}}}
evolve: {{until: 170, step: {step}, order: 4}}
observables: [{{crossing: {{name: through, x: {width}, toward: +x}}}}]
""")
    return value(record, "through.mean_time")


def test_a_thicker_barrier_takes_no_longer():
    """Source: T. E. Hartman, J. Appl. Phys. 33 (1962) 3427: the phase time behind a thick barrier no longer grows with
    its width. Exact for a packet: the mean over what each momentum lets through of the way there over its speed plus
    its phase time. Tolerance: three times what points and step change."""
    wanted, found = [], []
    for width in (3.0, 3.5):

        def share(k, width=width):
            return f.barrier_transmission(k, 1, width)

        def late(k, width=width):
            return share(k, width) * (70 / k + f.barrier_phase_time(k, 1, width))

        wanted.append(f.over_momenta(late, sigma=10, k=1) / f.over_momenta(share, sigma=10, k=1))
        coarse, fine = through_barrier(width, 1000, 0.034), through_barrier(width, 1500, 0.017)
        assert abs(fine - coarse) < 0.02
        assert fine == pytest.approx(wanted[-1], abs=3 * abs(fine - coarse) + 1e-3)
        found.append(fine)
    assert found[1] - found[0] < 0.5 * 0.5  # half of what a particle of speed 1 needs for the added width
