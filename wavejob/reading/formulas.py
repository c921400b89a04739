"""Formulas of a job file: read by a closed grammar, evaluated over numpy arrays, with exact derivatives.

Nothing of Python is reachable from a formula: its text becomes a list of steps over the operations of
`formula_functions.py`, and numbers become floats at once, so that no formula takes long.
"""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

import numpy as np

from .formula_functions import FUNCTIONS, OPERATORS, Number
from .formula_text import FormulaError, Step, read

__all__ = ["Formula", "FormulaError", "first_bad", "parse"]

_OPERATIONS = OPERATORS | FUNCTIONS


@dataclass(frozen=True)
class Formula:
    """A formula read from `text`; `used` are the names that occur in it. Can be pickled."""

    text: str
    used: frozenset[str]
    steps: tuple[Step, ...]

    def __call__(self, values: Mapping[str, Number]) -> Number:
        """The value, in the shape to which the used `values` broadcast; a float where all are plain numbers.

        Infinities and NaNs come out as they arise: see `first_bad`.
        """
        stack: list[Number] = []
        with np.errstate(all="ignore"):
            for kind, what in self.steps:
                if kind == "number":
                    stack.append(what)
                elif kind == "name":
                    stack.append(_floats(values[str(what)]))
                else:
                    operation = _OPERATIONS[str(what)]
                    count = len(operation.partials)
                    stack[-count:] = [operation.value(*stack[-count:])]
        return _own(stack[0], np.shape(stack[0]))

    def with_slope(self, values: Mapping[str, Number], of: str) -> tuple[Number, Number]:
        """The value and its derivative by the name `of`, by forward differentiation (dual numbers).

        Jumps have slope 0 and kinks the mean of the slopes on both sides.
        """
        stack: list[Number] = []
        slopes: list[Number | None] = []  # None where the value does not depend on `of`
        with np.errstate(all="ignore"):
            for kind, what in self.steps:
                if kind == "number":
                    stack.append(what)
                    slopes.append(None)
                elif kind == "name":
                    stack.append(_floats(values[str(what)]))
                    slopes.append(1.0 if what == of else None)
                else:
                    operation = _OPERATIONS[str(what)]
                    count = len(operation.partials)
                    arguments = stack[-count:]
                    value = operation.value(*arguments)
                    slope: Number | None = None
                    for partial, inner in zip(operation.partials, slopes[-count:], strict=True):
                        if inner is not None:
                            part = _chain(partial(*arguments, value), inner, operation.selects)
                            slope = part if slope is None else slope + part
                    stack[-count:], slopes[-count:] = [value], [slope]
        shape = np.shape(stack[0])
        return _own(stack[0], shape), _own(0.0 if slopes[0] is None else slopes[0], shape)


def parse(text: str, names: frozenset[str]) -> Formula:
    """The formula `text`, which may use `names` and no others. Raises FormulaError."""
    steps = read(text, names)
    return Formula(text, frozenset(str(step.what) for step in steps if step.kind == "name"), steps)


def first_bad(values: Number) -> tuple[int, ...] | None:
    """The index of the first value that is not finite, or None; () for a plain number."""
    finite = np.isfinite(values)
    if np.all(finite):
        return None
    return tuple(int(i) for i in np.argwhere(~finite)[0])


def _chain(outer: Number, inner: Number, selects: bool) -> Number:
    """The product of two slopes, and 0 where the inner one is 0: sqrt(x**2) is then flat at 0, as abs(x) is.

    Where an operation selects, its slope 0 stands for "not chosen", even if the inner one is no number.
    """
    nothing = (inner == 0.0) | (outer == 0.0) if selects else inner == 0.0
    return np.where(nothing, 0.0, np.multiply(outer, inner))


def _floats(value: Number) -> Number:
    """Arrays of floats as they are, everything else as a float or an array of floats."""
    if isinstance(value, np.ndarray) and value.dtype.kind == "f":
        return value
    return np.asarray(value, dtype=float) if np.ndim(value) else float(value)


def _own(value: Number, shape: tuple[int, ...]) -> Number:
    """A float, or an array of the given shape that is nobody else's, so that it may be changed in place."""
    return np.array(np.broadcast_to(value, shape)) if shape else float(value)
