"""The measured order of both schemes, through job files, on a smooth potential and at sharp edges."""

from __future__ import annotations

import numpy as np
import pytest

from tests.truth.running import run

POTENTIALS = {
    "smooth": "sech2: {at: 0, width: 1.5, height: 1}",
    "square barrier": "barrier: {from: -1, to: 1, height: 1}",
    "changing": "gaussian: {at: 0, sigma: 1, height: 1.5}\n    in_time: {sine: {amplitude: 1, frequency: 0.3, offset: 1}}",
    "moving edge": "barrier: {from: -1, to: 1, height: 1}\n    path: {x: {sine: {amplitude: 2, frequency: 0.05}}}",
}
RUN = 16


def end(potential: str, order: int, steps: int) -> np.ndarray:
    """The final state after `steps` steps on a grid with a wave number of 9.8, three times the highest."""
    return run(f"""
units: natural
grid: {{x: {{from: -32, to: 32, points: 200}}}}
potential:
  - {potential}
edges: {{x: wrap}}
packet: {{gaussian: {{at: -10, sigma: 2, wavenumber: 1.5}}}}
evolve: {{until: {RUN}, step: {RUN / steps!r}, order: {order}}}
observables: [norm]
""").psi


@pytest.mark.parametrize("potential", POTENTIALS)
@pytest.mark.parametrize(("order", "source"), [(2, "Strang 1968"), (4, "Chin 1997, Chin & Chen 2002")])
def test_measured_order(potential, order, source):
    """Sources: G. Strang, SIAM J. Numer. Anal. 5 (1968) 506; S. A. Chin, Phys. Lett. A 226 (1997) 344; S. A. Chin & C. R.
    Chen, J. Chem. Phys. 117 (2002) 1409. The slope of the error of psi over halved steps; the kinetic phase of the largest
    wave number is pi / 1.3 and less. Reference: order 4 with a quarter of the smallest step."""
    counts = [320, 640, 1280]
    limit = end(POTENTIALS[potential], 4, 5120)
    errors = [np.linalg.norm(end(POTENTIALS[potential], order, n) - limit) for n in counts]
    slope = -np.polyfit(np.log(counts), np.log(errors), 1)[0]
    assert slope == pytest.approx(order, abs=0.2), source
