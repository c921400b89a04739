"""Two sets of figures compared: which differ by more than both bars together, which cannot be told apart."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Literal

from ..reading.quantity_text import is_unit, pint_notation, unit_words
from ..reading.unit_table import measure, unit_names

# Of the value or its scale, whichever is more: what two machines make of the same job differs by less (a few
# rounding errors for each of some 10^5 steps), so figures this close are the same, bar or no bar.
ROUNDING = 1e-10

Outcome = Literal["same", "differs", "undecided", "appeared", "vanished"]


@dataclass(frozen=True)
class Measured:
    """A figure as a run stored it; `value` is None where it could not be had, `error` without a bar."""

    value: float | None
    error: float | None
    unit: str
    scale: float | None = None

    @property
    def size(self) -> float:
        """What rounding errors are in proportion to."""
        return max(abs(self.value or 0.0), abs(self.scale or 0.0))


@dataclass(frozen=True)
class Comparison:
    """What became of one result; `difference` is after minus before, `allowed` both bars together.

    `after`, `difference` and `allowed` are in the unit of `before`, where there are both.
    """

    result: str
    outcome: Outcome
    before: Measured | None
    after: Measured | None
    difference: float | None = None
    allowed: float | None = None
    reason: str = ""  # why it is undecided


def compare(before: Mapping[str, Measured], after: Mapping[str, Measured]) -> list[Comparison]:
    """Every result of either side, in the order of `before`; then what appeared, in the order of `after`."""
    found = [
        compare_result(name, figure, after[name]) if name in after else Comparison(name, "vanished", figure, None)
        for name, figure in before.items()
    ]
    return found + [Comparison(name, "appeared", None, figure) for name, figure in after.items() if name not in before]


def compare_result(name: str, before: Measured, after: Measured) -> Comparison:
    """One result that both sides have.

    It differs if the values are further apart than both bars together: a bar says how far the exact value may
    be, so bars that do not meet leave no value that both sides allow. Without both bars only equal values tell.
    """
    factor = _factor(after.unit, before.unit)
    if factor is None:
        return Comparison(name, "undecided", before, after, reason="no common unit")
    after = _in_unit(after, factor, before.unit)
    if before.value is None or after.value is None:
        if before.value is after.value:
            return Comparison(name, "same", before, after)
        side = "before" if before.value is None else "after"
        return Comparison(name, "undecided", before, after, reason=f"no value {side}")
    difference = after.value - before.value
    rounding = ROUNDING * max(before.size, after.size)
    if before.error is None or after.error is None:
        if abs(difference) <= rounding:
            return Comparison(name, "same", before, after, difference)
        sides = [side for side, figure in (("before", before), ("after", after)) if figure.error is None]
        reason = f"no error bar {' and '.join(sides)}"
        return Comparison(name, "undecided", before, after, difference, reason=reason)
    allowed = before.error + after.error
    outcome: Outcome = "differs" if abs(difference) > max(allowed, rounding) else "same"
    return Comparison(name, outcome, before, after, difference, allowed)


def _factor(unit: str, wanted: str) -> float | None:
    """What a value in `unit` is multiplied with to be in `wanted`; None where they measure different things."""
    if unit == wanted:
        return 1.0
    if not _has_size(unit) or not _has_size(wanted):
        return None
    worth, kind = measure(pint_notation(unit))
    wanted_worth, wanted_kind = measure(pint_notation(wanted))
    return worth / wanted_worth if kind == wanted_kind else None


def _has_size(unit: str) -> bool:
    """Whether `unit` is one that is known here; natural units, which print none, have no size elsewhere."""
    return is_unit(unit) and all(word in unit_names() for word in unit_words(unit))


def _in_unit(figure: Measured, factor: float, unit: str) -> Measured:
    def times(x: float | None) -> float | None:
        return None if x is None else x * factor

    return replace(figure, value=times(figure.value), error=times(figure.error), scale=times(figure.scale), unit=unit)
