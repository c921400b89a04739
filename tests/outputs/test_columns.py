"""Pixels and printed numbers keep what the data say."""

from __future__ import annotations

import numpy as np
import pytest
from hypothesis import example, given
from hypothesis import strategies as st

from wavejob.outputs.choices import CarpetScale
from wavejob.outputs.columns import Columns, rows_in_time
from wavejob.outputs.wording import Numbers, axis_label, numbers_for, scientific, ticks

X = -10 + (np.arange(1000) + 0.5) * 0.02


def test_a_crowded_column_shows_its_highest_and_its_mean():
    values = np.sin(40 * X)[None] ** 2
    columns = Columns(X, -10.0, 10.0, 50)
    blocks = values.reshape(50, 20)
    np.testing.assert_array_equal(columns.highest(values)[0], blocks.max(axis=1))
    np.testing.assert_allclose(columns.mean(values)[0], blocks.mean(axis=1))


@pytest.mark.parametrize("width", [37, 300, 999])
def test_no_peak_of_a_single_point_is_lost(width):
    """Every point lies in one column, wherever the pixels' edges fall."""
    columns = Columns(X, -10.0, 10.0, width)
    peaks = np.eye(1000)[::9]
    np.testing.assert_array_equal(columns.highest(peaks).max(axis=1), 1.0)


def test_between_points_a_curve_is_straight_and_beyond_them_nothing():
    columns = Columns(X, 9.0, 11.0, 400)
    drawn = columns.highest(X[None])[0]
    inside = columns.centres < X[-1]
    np.testing.assert_allclose(drawn[inside], columns.centres[inside], rtol=1e-6)
    assert not drawn[columns.centres > 10.01].any()


def test_phases_between_points_turn_the_short_way():
    """A plane wave of 2.5 points a radian at 8 columns a point; between +179 and -179 degrees lies 180."""
    wrapped = np.angle(np.exp(20j * X))
    columns = Columns(X, -1.0, 1.0, 800)
    difference = np.exp(1j * columns.phase(wrapped)) - np.exp(20j * columns.centres)
    # the chord between two points 0.4 rad apart bends the phase by 0.4^3 / (36 sqrt 3) = 1.03e-3 at most
    assert np.abs(difference).max() < 1.1e-3


def test_rows_run_evenly_through_uneven_times():
    times = np.array([0.0, 1.0, 3.0, 10.0])
    rows = rows_in_time(times[:, None] * np.ones((4, 2)), times, 100)
    np.testing.assert_allclose(rows[:, 0], (np.arange(100) + 0.5) / 10, rtol=1e-6)


def test_shades_run_through_the_table():
    linear = CarpetScale(False, 0.0, 2.0).shade(np.array([-1e-9, 0.0, 1.0, 2.0, 3.0]))
    assert linear.tolist() == [0, 0, 128, 255, 255]
    decades = CarpetScale(True, 1e-4, 1.0).shade(np.array([0.0, 1e-4, 1e-2, 1.0]))
    assert decades.tolist() == [0, 0, 128, 255]


@pytest.mark.parametrize(
    ("low", "high", "most", "values", "labels", "power"),
    [
        (
            -400,
            400,
            8,
            [-400, -300, -200, -100, 0, 100, 200, 300, 400],
            "−400 −300 −200 −100 0 100 200 300 400",
            0,
        ),
        (0, 1, 5, [0, 0.2, 0.4, 0.6, 0.8, 1], "0.0 0.2 0.4 0.6 0.8 1.0", 0),
        (0, 0.013, 3, [0, 5e-3, 10e-3], "0.0 0.5 1.0", -2),
        (0, 3e7, 3, [0, 1e7, 2e7, 3e7], "0 1 2 3", 7),
        (5, 5.1, 2, [5.0, 5.05, 5.1], "5.00 5.05 5.10", 0),
    ],
)
def test_ticks_are_round_and_their_labels_short(low, high, most, values, labels, power):
    shown = ticks(low, high, most)
    np.testing.assert_allclose(shown.values, values, atol=1e-12)
    assert " ".join(shown.labels) == labels
    assert shown.power == power


@example(1.0, 2.0**-24, 2)
@given(st.floats(-1e12, 1e12), st.floats(1e-9, 1e12), st.integers(1, 12))
def test_ticks_lie_on_the_axis_and_are_told_apart(low, length, most):
    high = low + length
    if high - low < 1e-9 * abs(low):
        return  # finer than any axis of a box
    shown = ticks(low, high, most)
    assert len(shown.values) <= most + 1
    assert len(set(shown.labels)) == len(shown.labels)


@pytest.mark.parametrize(
    ("largest", "resolution", "value", "said"),
    [
        (1480.0, 5.0, 540.0, "540"),
        (10.0, 0.25, 2.5, "2.5"),
        (1.0, 1e-4, 0.08514, "0.0851"),
        (3e-6, 1e-8, 3.2e-7, "3.20×10⁻⁷"),
        (1.0, 1e-4, -1e-9, "0.0000"),
        (1.0, 1e-4, -0.5, "−0.5000"),
        (1.0, 1e-4, float("nan"), "–"),
    ],
)
def test_numbers_are_printed_alike_in_every_frame(largest, resolution, value, said):
    assert numbers_for(largest, resolution)(value) == said


def test_labels_name_unit_and_power():
    assert axis_label("density", "1/nm", -3) == "density [10⁻³ 1/nm]"
    assert axis_label("x", "") == "x [natural units]"
    assert scientific(1.5e-10) == "1.5×10⁻¹⁰"
    assert Numbers(0)(0.4) == "0"
