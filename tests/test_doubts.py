"""What is doubtful before a run: each doubt at its key, with a cure that removes it."""

from __future__ import annotations

import math

import pytest

from wavejob.doubts import doubts
from wavejob.loading import parse
from wavejob.plan import make_plan
from wavejob.problems import Problem

JOB = {
    "units": "units: natural",
    "grid": "grid: {x: {from: -60, to: 60, points: 512}}",
    "packet": "packet: {gaussian: {at: -10, sigma: 3, wavenumber: 2}}",
    "evolve": "evolve: {until: 10}",
    "edges": "edges: {x: {absorb: 20}}",
}


def found(**changes: str) -> list[Problem]:
    lines = {**JOB, **{key: f"{key}: {value}" for key, value in changes.items()}}
    return doubts(make_plan(parse("\n".join(lines.values()))))


def test_an_ordinary_job_raises_none() -> None:
    assert found() == []


def test_a_shallow_layer_is_told_with_the_depth_that_would_do() -> None:
    (doubt,) = found(edges="{x: {absorb: 3}}")
    assert (doubt.key, doubt.severity) == ("edges.x.absorb", "warning")
    assert doubt.message.startswith("a layer of 2.812 is predicted to send back")
    deeper = doubt.fix.split()[0]
    assert float(deeper) > 3
    assert found(edges=f"{{x: {{absorb: {deeper}}}}}") == []


def test_one_end_is_told_at_its_own_key() -> None:
    (doubt,) = found(edges="{x: {low: {absorb: 20}, high: {absorb: 3}}}")
    assert doubt.key == "edges.x.high.absorb"


@pytest.mark.parametrize(
    ("observable", "key"),
    [
        ("crossing: {name: through, x: 50, toward: +x}", "observables[0].crossing.x"),
        ("inside: {name: well, from: 30, to: 45}", "observables[0].inside"),
    ],
)
def test_detectors_and_regions_inside_a_layer(observable: str, key: str) -> None:
    (doubt,) = found(observables=f"[{{{observable}}}]")
    assert doubt.key == key
    assert "the absorbing layer at x.high" in doubt.message
    assert "40.08 to 60" in doubt.fix


def test_a_packet_that_starts_inside_a_layer() -> None:
    """What a normal distribution holds farther from its mean than the layer, which is 85 whole cells deep."""
    (doubt,) = found(packet="{gaussian: {at: -31, sigma: 3, wavenumber: 2}}")
    distance = -31 - (-60 + 85 * 120 / 512)
    assert doubt.key == "packet"
    assert doubt.message.startswith(f"{math.erfc(distance / 3 / math.sqrt(2)) / 2:.1e} of the packet starts inside")


def test_a_kinetic_phase_beyond_pi() -> None:
    """k_max = pi 512 / 120 = 13.404, so that k_max^2 step / 2 = 8.98 for a step of 0.1."""
    (doubt,) = found(evolve="{until: 10, step: 0.1}")
    assert doubt.key == "evolve.step"
    assert "8.98 rad" in doubt.message
    assert "0.03497" in doubt.fix  # 2 pi / k_max^2


def test_a_fall_that_makes_waves_too_fast_for_the_grid() -> None:
    """A fall by 100 makes k = 2 + 6 / (2 sigma) = 3 into sqrt(9 + 200) = 14.5, above k_max."""
    (doubt,) = found(potential="[{gaussian: {at: 20, sigma: 2, height: -100}}]")
    assert doubt.key == "grid.x.points"
    assert "14.46" in doubt.message
    assert "13.4" in doubt.message
