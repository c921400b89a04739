"""The classical companion against closed forms.

F = m a carries the Wigner function exactly in potentials up to the second power (E. Wigner, Phys. Rev. 40,
749, 1932): there both answers agree to the statistical error.
"""

from __future__ import annotations

import json
import math
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from wavejob import wigner
from wavejob.classical_companion import sentence, with_companion
from wavejob.edges import LayerShape
from wavejob.ensemble import trajectories
from wavejob.loading import load, parse
from wavejob.plan import make_plan
from wavejob.problems import JobFileError
from wavejob.reading.tree import JobTree
from wavejob.run import run_job
from wavejob.simulate import Record, simulate

Array = np.ndarray

OSCILLATOR = """
units: natural
grid: {x: {from: -12, to: 12, points: 128}}
potential: [{harmonic: {at: 0, omega: 1}}]
packet: {gaussian: {at: 2, sigma: 0.5, wavenumber: 0.7}}
evolve: {until: 7}
observables: [norm, position, momentum, width, energy, force, {inside: {name: right, from: 0, to: 12}}]
classical: {trajectories: 1024}
"""
SCATTERING = """
units: natural
grid: {{x: {{from: -60, to: 60, points: 512}}}}
potential: [{potential}]
edges: {{x: {edges}}}
packet: {{gaussian: {{at: -20, sigma: 2, wavenumber: 1.5}}}}
evolve: {{until: {until}, step: 0.05}}
observables: [norm, position, force, {{crossing: {{name: through, x: {detector}, toward: +x}}}}]
classical: {{trajectories: {number}, seed: {seed}}}
"""


@cache
def both(text: str) -> Record:
    return with_companion(simulate(make_plan(parse(text))))


def scattering(
    potential: str,
    *,
    edges: str = "wrap",
    until: float = 25,
    detector: float = 5,
    number: int = 1024,
    seed: int = 1,
) -> Record:
    return both(
        SCATTERING.format(potential=potential, edges=edges, until=until, detector=detector, number=number, seed=seed)
    )


def share_above(energy: float) -> float:
    """Probability that a packet of mean wave number 1.5 and sigma 2 has a larger energy, mass 1."""
    return 0.5 * math.erfc((math.sqrt(2 * energy) - 1.5) / 0.25 / math.sqrt(2))


def value(record: Record, name: str) -> float:
    found = record.result(name).value
    assert found is not None
    return found


def error(record: Record, name: str) -> float:
    found = record.result(name).error
    assert found is not None
    return found


def oscillator_state(n: int) -> tuple[Array, Array]:
    x = np.linspace(-9, 9, 300)
    return x, np.polynomial.hermite.hermval(x, [0] * n + [1]) * np.exp(-(x**2) / 2).astype(complex)


@pytest.mark.parametrize(("n", "negative"), [(0, 0.0), (1, 4 / math.sqrt(math.e) - 2), (2, 0.72899)])
def test_negative_part_of_a_wigner_function(n: int, negative: float) -> None:
    """Total size less 1 of oscillator states: 4 / sqrt(e) - 2 for the first, 0.72899 for the second, Kenfack
    and Zyczkowski, J. Opt. B 6, 396 (2004), from memory."""
    x, psi = oscillator_state(n)
    places, momenta, found = wigner.function(x, psi)
    cell = (places[1] - places[0]) * (momenta[1] - momenta[0])
    assert found.sum() * cell == pytest.approx(1, abs=1e-12)
    assert np.abs(found).sum() * cell - 1 == pytest.approx(negative, abs=2e-3)


def test_margin_of_a_wigner_function_is_the_density() -> None:
    """Summed over p it is |psi|^2 (Wigner 1932)."""
    x, psi = oscillator_state(3)
    places, momenta, found = wigner.function(x, psi)
    margin = found.sum(axis=1) * (momenta[1] - momenta[0])
    density = np.abs(psi) ** 2 / (np.sum(np.abs(psi) ** 2) * (x[1] - x[0]))
    assert margin == pytest.approx(np.interp(places, x, density), abs=2e-3)


def test_gaussian_start() -> None:
    """Standard deviations sigma and 1 / 2 sigma, means without any error, all weights alike."""
    start = wigner.gaussian(1.0, 1.3, 4.0, 4096, 3)
    assert start.x.shape == (wigner.GROUPS, 4096 // wigner.GROUPS)
    assert start.weight.sum(axis=1) == pytest.approx(1, abs=1e-12)
    assert start.x.mean(axis=1) == pytest.approx(1, abs=1e-12)
    assert start.p.mean(axis=1) == pytest.approx(4, abs=1e-12)
    assert start.x.std() == pytest.approx(1.3, rel=0.01)
    assert start.p.std() == pytest.approx(1 / 2.6, rel=0.01)


def test_start_from_a_field_with_signs() -> None:
    """Means over signed weights: norm 1, <x^2> = <p^2> = n + 1/2."""
    start = wigner.sampled(*oscillator_state(2), 16384, 1)
    weight = start.weight / wigner.GROUPS
    assert np.any(weight < 0)
    spread = [
        float(values.std(ddof=1)) / 4 for values in (start.weight.sum(axis=1), (start.weight * start.x**2).sum(1))
    ]
    assert abs(weight.sum() - 1) < 3 * spread[0]
    assert abs((weight * start.x**2).sum() - 2.5) < 3 * spread[1]
    assert (weight * start.p**2).sum() == pytest.approx(2.5, abs=0.1)


def test_too_negative_a_start_is_refused() -> None:
    """Packets far apart interfere in ever finer fringes."""
    x = np.linspace(-400, 400, 8192)
    far = (np.exp(-((x - 300) ** 2) / 4) + np.exp(-((x + 300) ** 2) / 4)).astype(complex)
    with pytest.raises(wigner.WignerError, match="places"):
        wigner.function(x, far)


def test_oscillator_agrees_in_everything() -> None:
    record = both(OSCILLATOR)
    compared = [r for r in record.results if r.name.startswith("classical.") and r.name[10:] in record.plan.job.figures]
    assert len(compared) == 1 + 5 * 4 + 1 - 4 + 4
    for result in compared:
        quantum, tolerance = value(record, result.name[10:]), 2 * (result.error or 0.0) + 1e-4
        if result.name.endswith("peak_time"):
            continue
        assert abs(value(record, result.name) - quantum) < tolerance, result.name
    assert value(record, "classical.largest_gap") < 1e-6
    assert record.result("classical.gap_opens").value is None


def test_means_of_the_oscillator_have_no_error() -> None:
    """Mirrored pairs: mean place and momentum follow the mean start exactly, x0 cos t + p0 sin t."""
    record = both(OSCILLATOR)
    times = record.times
    found = record.column("classical.position.x")
    assert found == pytest.approx(2 * np.cos(times) + 0.7 * np.sin(times), abs=1e-6)
    assert error(record, "classical.position.x.final") < 1e-10


def test_actions_of_the_mean_start() -> None:
    """Integral of p dx of x0 cos t + p0 sin t, and of L dt, from the mechanics textbook."""
    record = both(OSCILLATOR)
    t = np.linspace(0, 7, 20001)
    x, p = 2 * np.cos(t) + 0.7 * np.sin(t), -2 * np.sin(t) + 0.7 * np.cos(t)
    assert value(record, "classical.action") == pytest.approx(np.trapezoid(p**2, t), abs=1e-5)
    assert value(record, "classical.lagrangian_action") == pytest.approx(np.trapezoid((p**2 - x**2) / 2, t), abs=1e-5)


@pytest.mark.parametrize(
    "potential",
    [
        "{step: {at: 0, height: 1.0}}",
        "{barrier: {from: -1, to: 1, height: 1.0}}",
        "{gaussian: {at: 0, sigma: 1, height: 1.0}}",
        "{sech2: {at: 0, width: 1, height: 1.0}}",
    ],
)
def test_passes_what_has_the_energy(potential: str) -> None:
    """By energy conservation exactly those above the top come through, whatever the shape."""
    record = scattering(potential, until=60)
    through = record.result("classical.through.total")
    late = value(record, "classical.through.undecided")
    assert late < 1
    assert abs(value(record, "classical.through.total") - share_above(1.0)) < 1.5 * error(record, through.name) + 0.01


def test_free_packet() -> None:
    """A free packet has passed x with the share above it: erfc of the spread Gaussian (textbooks)."""
    record = scattering("", detector=10, until=20)
    width = math.hypot(2, 20 / 4)
    ahead = 0.5 * math.erfc((10 + 20 - 1.5 * 20) / width / math.sqrt(2))
    assert abs(value(record, "classical.through.total") - ahead) < 2 * error(record, "classical.through.total")
    assert value(record, "through.total") == pytest.approx(ahead, abs=1e-3)
    assert value(record, "classical.through.backward") < 0.02


def test_statistical_error_is_honest() -> None:
    """95 of 100 seeds should lie within the error: of 40, 3 or fewer outside has a probability of 86 %, 7 or
    fewer of 99.9 % (binomial)."""
    outside = 0
    for seed in range(40):
        start = wigner.gaussian(0.0, 2.0, 1.5, 512, seed)
        groups = (start.weight * (start.p > math.sqrt(2))).sum(axis=1)
        bar = max(2.13 * groups.std(ddof=1) / 4, 1 / 512)
        outside += abs(groups.mean() - share_above(1.0)) > bar
    assert outside <= 7


def test_layers_absorb_trajectories() -> None:
    """Norm and what both ends took add up to 1; what passed the detector is beyond it or absorbed there."""
    record = scattering("{step: {at: 0, height: 1.0}}", edges="{absorb: 20}", until=90)
    low, high = value(record, "classical.absorbed.x.low"), value(record, "classical.absorbed.x.high")
    assert low + high + value(record, "classical.norm.final") == pytest.approx(1, abs=1e-12)
    beyond = value(record, "classical.norm.final") - value(record, "classical.through.undecided")
    assert high + beyond == pytest.approx(value(record, "classical.through.total"), abs=1e-9)
    assert high > 0.3


def test_integral_of_a_layer() -> None:
    """Against Gauss-Legendre quadrature of the layer's own W."""
    shape = LayerShape.on_grid(7.0, 0.2, 1.3, 0.05)
    nodes, weights = np.polynomial.legendre.leggauss(200)
    for s in (0.5, 3.0, 6.9):
        assert shape.integral(np.array(s)) == pytest.approx(weights @ shape.rate((nodes + 1) * s / 2) * s / 2, rel=1e-9)


def test_pulse_of_a_field_gives_its_impulse() -> None:
    """Mean momentum changes by the integral of the force (Newton's second law)."""
    record = both(
        """
units: natural
grid: {x: {from: -40, to: 40, points: 256}}
potential:
  - linear: {at: 0, slope: -0.5}
    in_time: {pulse: {centre: 5, fwhm: 2}}
packet: {gaussian: {at: -5, sigma: 1}}
evolve: {until: 10}
observables: [momentum]
classical: {trajectories: 64}
"""
    )
    impulse = 0.5 * 2 * math.sqrt(math.pi / (4 * math.log(2)))
    assert value(record, "classical.momentum.x.final") == pytest.approx(impulse, rel=1e-5)


def test_tunnelling_opens_a_gap() -> None:
    """Nothing of a packet far below the top comes through by F = m a."""
    record = scattering("{barrier: {from: 0, to: 0.5, height: 3.0}}", until=30)
    assert value(record, "classical.through.total") == 0
    assert error(record, "classical.through.total") == pytest.approx(1 / 1024)
    assert value(record, "through.total") > 0.05
    assert value(record, "classical.largest_gap") > 0.3
    assert 5 < value(record, "classical.gap_opens") < 25
    answer = record.classical
    assert answer is not None
    assert "through.total" in answer.not_enough
    assert "norm.final" in answer.enough
    assert "is not good enough for" in answer.sentence


def test_arrival_and_dwell_of_a_free_packet() -> None:
    """The mean of (x - x_0) / v over the velocities is x / v (1 + (dv / v)^2 + 3 (dv / v)^4 ...); a region
    d long holds a packet for d times the mean of 1 / v, whatever its width (textbook)."""
    record = both(
        """
units: natural
grid: {x: {from: -60, to: 60, points: 512}}
packet: {gaussian: {at: -20, sigma: 4, wavenumber: 2}}
evolve: {until: 28, step: 0.05, record: 0.1}
observables:
  - norm
  - arrival: {name: detector, x: 10, toward: +x}
  - dwell: {name: stay, from: -5, to: 5}
classical: {trajectories: 1024}
"""
    )
    slowed = 1 + 0.0625**2 + 3 * 0.0625**4
    assert value(record, "classical.detector.mean") == pytest.approx(15 * slowed, abs=0.02)
    assert value(record, "classical.stay.time") == pytest.approx(5 * slowed, abs=0.02)
    assert value(record, "stay.time") == pytest.approx(5 * slowed, abs=0.02)


def test_force_at_sharp_edges_has_no_value() -> None:
    record = scattering("{barrier: {from: 0, to: 0.5, height: 3.0}}", until=30)
    force = record.result("classical.force.x.mean")
    assert force.value is None
    assert "sharp" in force.note


def test_superposition() -> None:
    """Signed weights: two packets that part; both answers agree on a free axis to the statistical error."""
    record = both(
        """
units: natural
grid: {x: {from: -40, to: 40, points: 256}}
packet:
  sum:
    - gaussian: {at: -3, sigma: 1, wavenumber: 1}
    - gaussian: {at: 3, sigma: 1, wavenumber: -1}
      weight: 0.5
evolve: {until: 8}
observables: [norm, position, {inside: {name: middle, from: -2, to: 2}}]
classical: {trajectories: 8192}
"""
    )
    for name in ("norm.final", "position.x.final", "middle.final"):
        away = abs(value(record, name) - value(record, f"classical.{name}"))
        assert away < 1.5 * error(record, f"classical.{name}"), name
    assert error(record, "classical.middle.final") < 0.1


def test_what_cannot_be_drawn_says_why() -> None:
    record = both(
        """
units: natural
grid: {x: {from: -400, to: 400, points: 4096}}
packet:
  sum:
    - gaussian: {at: -350, sigma: 1}
    - gaussian: {at: 350, sigma: 1}
evolve: {until: 0.1, step: 0.01}
observables: [norm, position]
"""
    )
    assert record.result("classical.norm.final").value is None
    assert "Wigner function" in record.result("classical.position.x.final").note
    assert record.result("classical.action").value is not None


def test_many_reflections_between_two_rows() -> None:
    """A box crossed 250 times in a row; the trajectories stay spread over it (ergodic, mean place 1/2)."""
    record = both(
        """
units: natural
grid: {x: {from: 0, to: 1, points: 128}}
edges: {x: wall}
packet: {gaussian: {at: 0.5, sigma: 0.05, wavenumber: 100}}
evolve: {until: 5, step: 0.00025, record: 2.5}
observables: [norm, position, energy]
classical: {trajectories: 512}
film: none
"""
    )
    assert value(record, "classical.position.x.final") == pytest.approx(0.5, abs=0.05)
    kinetic = (100**2 + 1 / (4 * 0.05**2)) / 2
    assert value(record, "classical.energy.final") == pytest.approx(kinetic, rel=0.01)
    assert value(record, "classical.action") == pytest.approx(100**2 * 5, rel=1e-6)


def test_none_skips_it() -> None:
    text = OSCILLATOR.replace("classical: {trajectories: 1024}", "classical: none")
    record = both(text)
    assert record.classical is None
    assert not any(r.name.startswith("classical.") for r in record.results)
    with pytest.raises(JobFileError, match="no result"):
        parse(text + "expect: [{result: classical.action, above: 0}]\n")


def test_fingerprint_knows_it_where_it_is_written() -> None:
    plain = parse(OSCILLATOR.replace("classical: {trajectories: 1024}", ""))
    assert parse(OSCILLATOR).fingerprint != plain.fingerprint
    assert trajectories(make_plan(parse(OSCILLATOR))) == 1024
    assert trajectories(make_plan(plain)) % (2 * wigner.GROUPS) == 0


def test_same_seed_same_numbers() -> None:
    text = OSCILLATOR.replace("1024", "96")
    first, second = (with_companion(simulate(make_plan(parse(text)))) for _ in range(2))
    assert value(first, "classical.width.x.mean") == value(second, "classical.width.x.mean")
    other = both(text.replace("96", "96, seed: 2"))
    assert value(first, "classical.width.x.mean") != value(other, "classical.width.x.mean")


def test_sentence() -> None:
    said = sentence("0.0001", ["a", "b", "c"], ["d (1 against 0)"], list("efghijk"), 500)
    assert said == (
        "F = m a is good enough at the accuracy asked (0.0001) for a, b and c; "
        "is not good enough for d (1 against 0); "
        "cannot be told from the quantum answer by 500 trajectories for e, f, g, h and 3 more."
    )


def test_written_with_a_run(tmp_path: Path) -> None:
    """Columns with their errors, figures with their parts, the sentence, and expectations on them."""
    expect = "expect: [{result: classical.position.x.final, equals: 0.06, tolerance: 5, source: test}]\n"
    (tmp_path / "job.yml").write_text(OSCILLATOR.replace("1024", "64") + "film: none\nerror_bars: none\n" + expect)
    finished = run_job(load(tmp_path / "job.yml", JobTree(tmp_path.resolve())), tmp_path / "runs", film=False)
    stored = json.loads((finished.folder / "results.json").read_text())
    assert stored["classical"]["trajectories"] == 64
    assert stored["classical"]["sentence"].startswith("F = m a is good enough")
    assert stored["results"]["classical.width.x.final"]["error_parts"].keys() == {"sampling"}
    assert stored["expectations"][0]["outcome"] == "met"
    header = (finished.folder / "series.csv").read_text().splitlines()[0].split(",")
    assert "classical.position.x" in header
    assert "classical.position.x.error" in header
    assert "position.x.error" not in header
