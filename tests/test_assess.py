"""Error bars of a whole run: what a fixed grid costs, and where no bar can be had."""

from __future__ import annotations

from pathlib import Path

import numpy as np
import pytest

from wavejob.api import open_run, simulate
from wavejob.classical_companion import with_companion
from wavejob.loading import parse
from wavejob.problems import RunError
from wavejob.run import run_job

FREE = """
units: natural
grid: {x: {from: -20, to: 20, points: 128}}
packet: {gaussian: {at: -5, sigma: 1, wavenumber: 2}}
evolve: {until: 2}
observables: [norm, position]
classical: none
film: none
"""

BARRIER = """
units: {length: nm, time: fs, energy: meV}
particle: {mass: 0.067 electron_mass, charge: -1 e}
grid: {x: {from: -100 nm, to: 100 nm, points: 512}}
potential: [{barrier: {from: 0 nm, to: 3 nm, height: 100 meV}}]
edges: {x: {absorb: 20 nm}}
packet: {gaussian: {at: -40 nm, sigma: 8 nm, energy: 80 meV, toward: +x}}
evolve: {until: 300 fs}
observables: [{crossing: {name: transmitted, x: 20 nm, toward: +x}}]
classical: none
"""


def test_a_fixed_grid_has_a_bar_that_tells_what_it_costs() -> None:
    """A finer step cannot lower the part of the grid: that is no lack of convergence (job-file contract, accuracy)."""
    coarse = simulate(parse(BARRIER), bars=True).result("transmitted.total")
    fine = simulate(parse(BARRIER.replace("512", "1536"))).result("transmitted.total")
    assert coarse.error_status == "estimated"
    assert coarse.error is not None
    assert coarse.value is not None
    assert fine.value is not None
    assert coarse.error_parts["grid"] > 100 * coarse.error_parts["step"]
    assert abs(coarse.value - fine.value) < coarse.error


def test_no_part_asked_for_is_no_bar(tmp_path: Path) -> None:
    """Rounding alone would pass for an error of 1e-14."""
    text = FREE + "error_bars: {step: no, grid: no}\n"
    finished = run_job(parse(text), tmp_path, film=False)
    assert {result["error_status"] for result in open_run(finished.folder).document["results"].values()} == {"off"}


def test_a_bound_that_is_passed_at_the_start_is_refused() -> None:
    with pytest.raises(RunError, match=r"`evolve\.stop_when`: norm starts below its bound"):
        simulate(parse(FREE.replace("until: 2", "until: 2, stop_when: {norm: {below: 2}}")), bars=True)


def test_the_mean_trajectory_starts_with_the_mean_momentum() -> None:
    """F = 0: the action is k^2 t / m in units of hbar."""
    record = with_companion(simulate(parse(FREE.replace("classical: none\n", ""))))
    assert record.result("classical.action").value == pytest.approx(8, rel=1e-13)


def test_a_small_probability_is_not_drowned_by_what_the_edges_send_back() -> None:
    """T of 2e-8 through a barrier, wanted to a hundredth: the layers' part is measured where the prediction is larger.

    Formula of the rectangular barrier averaged over the packet, A. Messiah, Quantum Mechanics I, ch. III (from memory).
    """
    text = """
units: natural
grid: {x: {from: -120, to: 120}}
potential: [{barrier: {from: 0, to: 4, height: 5}}]
edges: {x: {absorb: 40}}
packet: {gaussian: {at: -40, sigma: 5, wavenumber: 2}}
evolve: {until: 60, accuracy: {relative: 1e-2, down_to: 1e-12}}
observables: [{crossing: {name: through, x: 6, toward: +x}}]
expect: [{result: through.total, below: 1}]
classical: none
"""
    k = np.linspace(0.5, 3.1, 20001)
    energy, height, thickness = k**2 / 2, 5.0, 4.0
    fall = np.sqrt(2 * (height - energy))
    share = 1 / (1 + (height * np.sinh(fall * thickness)) ** 2 / (4 * energy * (height - energy)))
    weight = np.exp(-2 * (5 * (k - 2)) ** 2)
    found = simulate(parse(text), bars=True).result("through.total")
    assert found.value is not None
    assert found.error is not None
    assert found.error_status == "estimated"
    assert abs(found.value - float(share @ weight / weight.sum())) < found.error < found.value
