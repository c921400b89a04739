"""The forecast: right sizes, and times that grow as the work does."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest

from wavejob.forecast import Forecast, forecast
from wavejob.loading import parse
from wavejob.plan import Plan, make_plan
from wavejob.simulate import simulate

JOB = """\
units: natural
grid: {x: {from: -60, to: 60, points: 512}}
packet: {gaussian: {at: -10, sigma: 3, wavenumber: 2}}
evolve: {until: 20, step: 0.002}
edges: {x: wrap}
film: none
"""


@pytest.fixture(scope="module")
def plan() -> Plan:
    return make_plan(parse(JOB))


def test_the_time_is_right_within_a_factor_of_ten(plan: Plan) -> None:
    """Rough on a busy machine; wrong by more, it would be of no use."""
    more = replace(plan, steps=4 * plan.steps)
    loop = (forecast(more, bars=False).seconds - forecast(plan, bars=False).seconds) / 3
    assert 0.1 < loop / simulate(plan).seconds < 10


def test_what_is_left_out_costs_nothing() -> None:
    filmed = make_plan(parse(JOB.replace("film: none\n", "")))
    whole = forecast(filmed)
    assert forecast(filmed, film=False).seconds < whole.seconds
    assert forecast(filmed, bars=False).seconds < whole.seconds
    assert forecast(filmed, film=False).disk < whole.disk


def test_stored_fields_are_counted() -> None:
    """Each of 101 fields holds 512 complex numbers of 16 bytes, in memory and on disk."""
    plain = forecast(make_plan(parse(JOB)))
    stored = forecast(make_plan(parse(JOB + "snapshots: {every: 0.2}\n")))
    fields = 101 * 512 * np.dtype(complex).itemsize
    assert stored.memory - plain.memory == fields
    assert stored.disk - plain.disk == fields
    assert isinstance(plain, Forecast)
