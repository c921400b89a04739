"""Companions record at the same times as the run they are for."""

from __future__ import annotations

import numpy as np
import pytest

from wavejob.evidence.companions import coarser, finer
from wavejob.loading import parse
from wavejob.plan import make_plan
from wavejob.simulate import simulate

JOB = """
units: natural
grid: {{x: {{from: -20, to: 20, points: 96}}}}
potential: [{{harmonic: {{at: 0, omega: 1}}}}]
packet: {{gaussian: {{at: 1, sigma: 0.8}}}}
evolve: {{until: {until}, step: 0.01, record: {record}}}
"""


@pytest.mark.parametrize(("until", "record"), [(8.25, 0.02), (8.24, 0.02), (8.25, 0.07), (1.01, 0.03), (0.5, 0.01)])
@pytest.mark.parametrize("other", [coarser, finer])
def test_rows_stand_at_the_same_times(until: float, record: float, other: type) -> None:
    """By definition: rows are compared one with one, the last at the end of the run."""
    plan = make_plan(parse(JOB.format(until=until, record=record)))
    mine, theirs = simulate(plan), simulate(other(plan).plan, alone=False)
    np.testing.assert_allclose(mine.times, theirs.times, rtol=1e-12, atol=1e-12)
