"""Figures compared with their bars. Truth: intervals that meet or do not; units from the SI (CODATA 2018)."""

from __future__ import annotations

import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavejob.evidence.comparison import Measured, compare, compare_result

VALUES = st.floats(-1e3, 1e3)
BARS = st.floats(0, 1e3)


def outcome(before: Measured, after: Measured) -> str:
    return compare_result("T", before, after).outcome


@pytest.mark.parametrize(
    ("before", "after", "wanted"),
    [
        ((0.10, 0.02), (0.13, 0.02), "same"),  # the bars meet at 0.11 to 0.12
        ((0.10, 0.02), (0.15, 0.02), "differs"),  # nothing is in both
        ((0.10, 0.0), (0.10, 0.0), "same"),
        ((0.10, 0.0), (0.10000001, 0.0), "differs"),
        ((0.10, None), (0.10, 0.02), "same"),
        ((0.10, None), (0.11, 0.02), "undecided"),  # however small the change, the missing bar may be larger
        ((0.10, None), (0.90, None), "undecided"),
        ((None, None), (0.10, 0.02), "undecided"),
        ((0.10, 0.02), (None, None), "undecided"),
        ((None, None), (None, None), "same"),
    ],
)
def test_outcomes(before: tuple[float, float], after: tuple[float, float], wanted: str) -> None:
    assert outcome(Measured(*before, ""), Measured(*after, "")) == wanted


@given(VALUES, BARS, VALUES, BARS)
def test_differs_only_where_no_value_is_within_both_bars(a: float, bar: float, b: float, other: float) -> None:
    meet = max(a - bar, b - other) <= min(a + bar, b + other)
    near = abs(abs(a - b) - (bar + other)) <= 1e-9 * max(abs(a), abs(b), bar, other)
    if not near:
        assert outcome(Measured(a, bar, ""), Measured(b, other, "")) == ("same" if meet else "differs")


@given(VALUES, BARS, VALUES, BARS)
def test_the_order_of_the_sides_does_not_matter(a: float, bar: float, b: float, other: float) -> None:
    one, two = Measured(a, bar, ""), Measured(b, other, "")
    assert outcome(one, two) == outcome(two, one)


@pytest.mark.parametrize(("scale", "wanted"), [(1.0, "same"), (1e-13, "undecided"), (None, "undecided")])
def test_rounding_is_judged_against_the_scale(scale: float | None, wanted: str) -> None:
    """A drift of the norm by 1e-14 or 2e-14 is rounding where the norm is 1."""
    assert outcome(Measured(1e-14, None, "", scale), Measured(2e-14, None, "", scale)) == wanted


@pytest.mark.parametrize(
    ("unit", "other", "value"),
    [
        ("meV", "eV", 70.4e-3),
        ("fs", "ps", 70.4e-3),
        ("nm", "bohr", 70.4 / 0.0529177210903),
        ("1/nm", "1/um", 70.4e3),
        ("hbar/nm", "hbar/um", 70.4e3),
        ("meV", "hartree", 70.4e-3 / 27.211386245988),
    ],
)
def test_units_of_one_kind_are_converted(unit: str, other: str, value: float) -> None:
    found = compare_result("E", Measured(70.4, 1e-7, unit), Measured(value, 0.0, other))
    assert found.outcome == "same"
    assert found.after is not None
    assert found.after.unit == unit
    assert found.after.value == pytest.approx(70.4, abs=1e-7)
    assert outcome(Measured(70.4, 1e-7, unit), Measured(1.001 * value, 0.0, other)) == "differs"


@pytest.mark.parametrize(("unit", "other"), [("nm", "fs"), ("nm", ""), ("", "nm"), ("nm", "furlong"), ("a b!", "nm")])
def test_without_a_common_unit_nothing_is_decided(unit: str, other: str) -> None:
    found = compare_result("x", Measured(1.0, 0.1, unit), Measured(1.0, 0.1, other))
    assert (found.outcome, found.reason) == ("undecided", "no common unit")


def test_a_natural_result_compares_with_its_like() -> None:
    assert outcome(Measured(1.0, 0.1, ""), Measured(2.0, 0.1, "")) == "differs"


def test_what_only_one_side_has() -> None:
    one, two = Measured(1.0, 0.1, ""), Measured(1.0, 0.1, "")
    found = compare({"b": one, "a": one}, {"c": two, "a": two})
    assert [(c.result, c.outcome) for c in found] == [("b", "vanished"), ("a", "same"), ("c", "appeared")]


def test_the_reason_names_the_side() -> None:
    found = compare_result("T", Measured(1.0, None, ""), Measured(2.0, 0.1, ""))
    assert (found.reason, found.difference, found.allowed) == ("no error bar before", 1.0, None)
    assert compare_result("T", Measured(1.0, 0.1, ""), Measured(None, None, "")).reason == "no value after"
