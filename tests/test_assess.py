"""Error bars of a whole run: what a fixed grid costs, and where no bar can be had."""

from __future__ import annotations

from wavejob.api import simulate
from wavejob.loading import parse

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
