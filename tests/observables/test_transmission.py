"""Energy-resolved transmission against closed forms, at every energy within its own error bar."""

from __future__ import annotations

import numpy as np
import pytest
from scipy import constants as si

from tests.observables import exact
from wavejob.doubts import doubts
from wavejob.loading import parse
from wavejob.plan import make_plan
from wavejob.problems import JobFileError

Array = np.ndarray
TIGHT = 3e-3  # a bar wider than this would hide a wrong figure: dx^2 at sharp edges leaves less

SHARP = """
units: natural
grid: {x: {from: -240, to: 160, points: 2400}}
potential:
  - POTENTIAL
edges: {x: {absorb: 80}}
packet: {gaussian: {at: -60, sigma: 3, wavenumber: 1.2}}
evolve: {until: 600, step: 0.016}
film: none
error_bars: {box: no}
observables:
  - transmission: {name: T, x: 20, energies: {from: 0.3, to: 1.7, points: 57}}
  - transmission: {name: near, x: 1.5, energies: {from: 0.3, to: 1.7, points: 57}}
"""
BARRIER = SHARP.replace("POTENTIAL", "barrier: {from: 0, to: 2, height: 1}")
STEP = SHARP.replace("POTENTIAL", "step: {at: 0, height: 0.3}").replace("from: 0.3, to: 1.7", "from: 0.4, to: 1.8")

SMOOTH = """
units: natural
grid: {x: {from: -220, to: 140, points: 900}}
potential:
  - POTENTIAL
edges: {x: {absorb: 60}}
packet: {gaussian: {at: -50, sigma: 3, wavenumber: 1.25}}
evolve: {until: 500, step: 0.02}
film: none
error_bars: {box: no}
observables:
  - transmission: {name: T, x: 30, energies: {from: 0.3, to: 2.3, points: 51}, peaks: 0}
"""
TOP = SMOOTH.replace("POTENTIAL", "sech2: {at: 0, width: 1, height: 1}")
ASYMMETRIC = SMOOTH.replace("POTENTIAL", "eckart: {at: 0, width: 0.5, A: -0.4, B: 4}")


def within_bars(text: str, name: str, column: str, wanted: Array, tight: float = TIGHT) -> None:
    """Every value within its bar of what is wanted, and the bars narrow where the packet has weight."""
    run = exact.record(text)
    values, errors = exact.curve(run, name, column)
    weight, _ = exact.curve(run, name, "weight")
    assert np.isfinite(values).all()
    assert np.all(np.abs(values - wanted) <= errors)
    assert errors[weight > 1e-2].max() < tight


def energies(text: str) -> Array:
    return exact.curve(exact.record(text), "T", "energy")[0]


@pytest.mark.parametrize("name", ["T", "near"])
def test_a_rectangular_barrier_seen_from_beyond_it_and_from_inside(name: str) -> None:
    """Landau and Lifshitz, section 25, problem 2; the stationary flux does not depend on the place."""
    wanted = exact.rectangular(energies(BARRIER) + 1e-9)
    within_bars(BARRIER, name, "T", wanted)
    within_bars(BARRIER, name, "R", 1 - wanted)


def test_a_step_counts_the_ratio_of_velocities() -> None:
    """T = 4 k k' / (k + k')^2 (Landau and Lifshitz, section 25, problem 1), to a lower velocity beyond."""
    k, after = np.sqrt(2 * energies(STEP)), np.sqrt(2 * (energies(STEP) - 0.3))
    wanted = 4 * k * after / (k + after) ** 2
    within_bars(STEP, "T", "T", wanted, 1e-2)
    within_bars(STEP, "T", "R", 1 - wanted, 1e-2)


def test_the_phase_of_a_step_is_that_of_the_wave_at_the_detector() -> None:
    """t = 2k / (k + k') is real (textbook), so what is left is (k' - k) x, x = 20."""
    k, after = np.sqrt(2 * energies(STEP)), np.sqrt(2 * (energies(STEP) - 0.3))
    run = exact.record(STEP)
    phase, errors = exact.curve(run, "T", "phase")
    turned = np.angle(np.exp(1j * (phase - (after - k) * 20)))
    assert np.all(np.abs(turned) <= errors)
    assert np.all(np.abs(np.diff(phase)) < np.pi)  # no jumps of 2 pi


@pytest.mark.parametrize(
    ("text", "wanted"), [(TOP, exact.sech2), (ASYMMETRIC, lambda e: exact.eckart(e, 0.5, -0.4, 4.0))]
)
def test_smooth_barriers(text: str, wanted: object) -> None:
    """Eckart, Phys. Rev. 35 (1930) 1303, symmetric and with a lower potential beyond."""
    assert callable(wanted)
    within_bars(text, "T", "T", wanted(energies(text)), 1e-3)


def test_reflection_and_transmission_are_measured_apart_and_add_up() -> None:
    """Conservation of probability: R is a flux at another place, so the sum is no identity."""
    run = exact.record(TOP)
    sum_ = exact.curve(run, "T", "T")[0] + exact.curve(run, "T", "R")[0]
    errors = exact.curve(run, "T", "T")[1] + exact.curve(run, "T", "R")[1]
    assert np.all(np.abs(sum_ - 1) <= errors)
    assert np.abs(sum_ - 1).max() > 0
    assert all(check.passed for check in run.checks if check.name.startswith("T:"))


def test_the_phase_time_of_a_rectangular_barrier() -> None:
    """Buettiker 1983, eq. 3.3, is d arg(t e^(ikd)) / dE: the delay and d / v. At E = 0.5: 1.92805516."""
    run, e = exact.record(BARRIER), energies(BARRIER)
    below = e < 0.95
    delay, errors = exact.curve(run, "T", "phase_time")
    k = np.sqrt(2 * e[below])
    assert exact.phase_time(np.array([1.0]))[0] == pytest.approx(1.92805516, abs=1e-8)
    assert np.all(np.abs(delay[below] + 2 / k - exact.phase_time(k)) <= errors[below])
    dense = (e > 0.4) & below
    assert errors[dense].max() < 0.1


def test_the_phase_of_a_rectangular_barrier() -> None:
    """arg t of the matched waves (textbook)."""
    run, e = exact.record(BARRIER), energies(BARRIER)
    phase, errors = exact.curve(run, "T", "phase")
    t, _, _ = exact.layered(np.sqrt(2 * e) + 1e-9, [0, 2, 0], [0, 2])
    assert np.all(np.abs(np.angle(np.exp(1j * phase) / t)) <= errors)
    assert errors[e > 0.4].max() < 0.01


def test_bars_widen_where_the_packet_has_no_weight() -> None:
    """Common practice: a spectrum says nothing where nothing was sent in."""
    run = exact.record(TOP)
    errors, weight = exact.curve(run, "T", "T")[1], exact.curve(run, "T", "weight")[0]
    assert np.median(errors[weight < 1e-3]) > 3 * np.median(errors[weight > 0.1])


RESONANCE = """
units: {length: nm, time: fs, energy: meV}
particle: {mass: 0.067 electron_mass}
grid: {x: {from: -260, to: 200, points: 1200}}
potential: [{barrier: {from: 0, to: 3, height: 300}}, {barrier: {from: 8, to: 11, height: 300}}]
edges: {x: {absorb: 100}}
packet: {gaussian: {at: -40, sigma: 5, energy: 92 meV, toward: +x}}
evolve: {until: 2400, step: 0.048}
film: none
error_bars: {box: no}
observables:
  - transmission: {name: T, x: 40, energies: {from: 75, to: 105, points: 61}}
  - transmission: {name: well, x: 5.25, energies: {from: 75, to: 105, points: 61}}
"""


def double_barrier(meV: Array) -> Array:
    """T of two barriers of 0.3 eV and 3 nm, 5 nm apart (matched waves; Tsu and Esaki 1973)."""
    square = 2 * 0.067 * si.m_e * si.e * 1e-3 / si.hbar**2 * 1e-18  # per meV, in 1 / nm^2
    t, _, _ = exact.layered(np.sqrt(square * meV), [0, 300 * square, 0, 300 * square, 0], [0, 3, 8, 11])
    return np.asarray(np.abs(t) ** 2)


@pytest.mark.parametrize("name", ["T", "well"])
def test_a_resonance_seen_from_beyond_and_from_the_well(name: str) -> None:
    """Top at 88.5987 meV, full width at half height 4.7298 meV (transfer matrix, Tsu and Esaki 1973)."""
    run = exact.record(RESONANCE)
    units = run.plan.job.units
    e, _ = exact.curve(run, name, "energy")
    values, errors = exact.curve(run, name, "T")
    assert np.all(np.abs(values - double_barrier(units.to_file(e, "energy"))) <= errors)
    figures = (("energy", 88.5987116, 0.15), ("width", 4.72980351, 0.1))
    for figure, wanted, tight in figures:
        result = run.result(f"{name}.peak[0].{figure}")
        assert result.value is not None
        assert result.error is not None
        value, error = (units.to_file(x, "energy") for x in (result.value, result.error))
        assert abs(value - wanted) <= error < tight
    lifetime, width = run.result(f"{name}.peak[0].lifetime").value, run.result(f"{name}.peak[0].width").value
    assert lifetime is not None
    assert width is not None
    assert lifetime * width == pytest.approx(1)  # hbar


def test_a_run_that_ends_before_the_resonance_has_rung_down_says_so() -> None:
    """The lifetime is 140 fs: after 300 fs of ringing much is still inside, and the bars hold it."""
    run = exact.record(RESONANCE.replace("until: 2400", "until: 480"))
    check = next(check for check in run.checks if check.name == "T: run length")
    assert not check.passed
    assert "`evolve.until`" in check.advice
    assert run.verdict == "doubtful"
    e, _ = exact.curve(run, "T", "energy")
    values, errors = exact.curve(run, "T", "T")
    wanted = double_barrier(run.plan.job.units.to_file(e, "energy"))
    assert np.all(np.abs(values - wanted) <= 1.1 * errors)
    assert np.abs(values - wanted).max() > 0.01


def test_peaks_that_are_not_there_are_said_not_to_be() -> None:
    """Below its top, T of a single barrier only rises (Landau and Lifshitz, section 25, problem 2)."""
    result = exact.record(BARRIER).result("T.peak[0].energy")
    assert result.value is None
    assert "peak" in result.note


def test_a_packet_from_the_other_side() -> None:
    """T of the mirrored job is the same number for number but for rounding."""
    mirrored = (
        TOP.replace("from: -220, to: 140", "from: -140, to: 220")
        .replace("at: -50", "at: 50")
        .replace("wavenumber: 1.25", "wavenumber: -1.25")
        .replace("x: 30", "x: -30")
    )
    here, there = (exact.curve(exact.record(text), "T", "T")[0] for text in (TOP, mirrored))
    np.testing.assert_allclose(there, here, atol=1e-9)


@pytest.mark.parametrize(
    ("old", "new", "said", "cure"),
    [
        ("x: 20,", "x: 90,", "in an absorbing layer", "keep it from"),
        ("x: 20,", "x: -30,", "between the start and the structure", "beyond"),
        ("x: 20,", "x: -61,", "starts beyond the detector", "move one"),
        ("at: -60", "at: -8", "not flat where the packet starts", "farther"),
        ("wavenumber: 1.2", "wavenumber: -1.2", "nothing of the packet moves", "turn"),
        (
            "barrier: {from: 0",
            "barrier: {from: -100, to: -99, height: 1}\n  - barrier: {from: 0",
            "behind the start",
            "flat",
        ),
        ("from: 0.3, to: 1.7", "from: 4.2, to: 5.6", "holds only energies from", "ask for those"),
        (
            "height: 1}",
            "height: 1}\n    in_time: {sine: {amplitude: 1, frequency: 1}}",
            "changes in time",
            "crossing",
        ),
    ],
)
def test_what_cannot_be_had_is_refused_with_place_and_cure(old: str, new: str, said: str, cure: str) -> None:
    text = BARRIER.replace(old, new)
    assert text != BARRIER
    with pytest.raises(JobFileError) as caught:
        make_plan(parse(text))
    problems = [p for p in caught.value.problems if p.key.startswith("observables[0].transmission")]
    assert problems
    assert said in problems[0].message
    assert cure in problems[0].fix


def test_energies_of_which_there_is_too_little_stay_empty_and_are_told_before() -> None:
    text = BARRIER.replace("from: 0.3, to: 1.7", "from: 0.3, to: 9")
    plan = make_plan(parse(text.replace("until: 600", "until: 10")))
    said = [p for p in doubts(plan) if "stay without a value" in p.message]
    assert said
    assert said[0].severity == "warning"
