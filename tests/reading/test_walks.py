"""Ranges and lists of values, and the order of their combinations."""

from __future__ import annotations

from typing import Any

import pytest

from wavejob.problems import Place
from wavejob.reading.quantities import Named, QuantityError, Units
from wavejob.reading.walks import Walk, Walked, Walks, between

UNITS = Units.from_file({"length": "nm", "time": "fs", "energy": "meV"})
NAMES = {"b2": Named(3.0, "length")}


@pytest.mark.parametrize(
    ("low", "high", "count", "values"),
    [
        ("2.8 nm", "3.2 nm", 5, ["2.8 nm", "2.9 nm", "3 nm", "3.1 nm", "3.2 nm"]),
        (0, "3 nm", 3, ["0 nm", "1.5 nm", "3 nm"]),
        ("-1 eV", 0, 2, ["-1 eV", "0 eV"]),
        (256, 1024, 4, [256, 512, 768, 1024]),
        (1, 2, 3, [1, 1.5, 2]),
        ("b2", "b2 + 2 nm", 3, ["3 nm", "4 nm", "5 nm"]),
        ("5 angstrom", "1 nm", 2, ["0.5 nm", "1 nm"]),
    ],
)
def test_a_range_is_written_as_a_user_would(low: Any, high: Any, count: int, values: list[Any]) -> None:
    assert between(low, high, count, UNITS, NAMES) == values


@pytest.mark.parametrize(("low", "high"), [("3 nm", "2 nm"), ("3 nm", "3 nm"), ("1 nm", "2 fs"), ("1 parsnip", "2 nm")])
def test_what_is_no_range_is_refused(low: str, high: str) -> None:
    with pytest.raises(QuantityError):
        between(low, high, 3, UNITS, NAMES)


def _walked(key: str, *values: Any) -> Walked:
    return Walked(key, (key,), values, (Place("job.yml"),) * len(values))


def test_the_last_walk_runs_fastest_and_those_together_in_step() -> None:
    walks = Walks((Walk((_walked("a", 1, 2),)), Walk((_walked("b", "x", "y", "z"), _walked("c", 7, 8, 9)))))
    assert walks.count == 6
    assert [walks.label(index) for index in range(6)] == [
        f"a = {a}, b = {b}, c = {c}" for a in (1, 2) for b, c in (("x", 7), ("y", 8), ("z", 9))
    ]
