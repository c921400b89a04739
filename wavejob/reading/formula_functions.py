"""What formulas may compute: each operation with its value and its exact partial derivatives."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass
from typing import Any

import numpy as np

Number = Any  # a float or an array of floats; arrays broadcast against each other


@dataclass(frozen=True)
class Operation:
    """A function of `len(partials)` arguments.

    Each partial derivative is called with the arguments and then the value itself. An operation that
    `selects` takes no notice of the arguments that it does not choose, whatever they are.
    """

    value: Callable[..., Number]
    partials: tuple[Callable[..., Number], ...]
    selects: bool = False


def _zero(*_: Number) -> Number:
    return 0.0


def _one(*_: Number) -> Number:
    return 1.0


def _minus_one(*_: Number) -> Number:
    return -1.0


def _comparison(compare: Callable[..., Any]) -> Operation:
    """1 where it holds and 0 elsewhere: as floats, so that sums of comparisons count."""
    return Operation(lambda a, b: np.where(compare(a, b), 1.0, 0.0), (_zero, _zero))


def _first_chosen(a: Number, b: Number, value: Number) -> Number:
    """The slope of a minimum or maximum by its first argument; where they meet, the mean of both sides."""
    return np.where(a == b, 0.5, np.where(value == a, 1.0, 0.0))


def _second_chosen(a: Number, b: Number, value: Number) -> Number:
    return _first_chosen(b, a, value)


def _where(condition: Number, a: Number, b: Number) -> Number:
    return np.where(condition != 0.0, a, b)


def _where_true(condition: Number, *_: Number) -> Number:
    return np.where(condition != 0.0, 1.0, 0.0)


def _where_false(condition: Number, *_: Number) -> Number:
    return np.where(condition != 0.0, 0.0, 1.0)


def _over_value(numerator: Number, value: Number) -> Number:
    """numerator / value, and 0 where both vanish: the slope of hypot at the tip of its cone."""
    return np.where(value == 0.0, 0.0, np.divide(numerator, value))


def _angle_by_first(a: Number, b: Number, _: Number) -> Number:
    return np.divide(b, np.multiply(a, a) + np.multiply(b, b))


def _angle_by_second(a: Number, b: Number, _: Number) -> Number:
    return -np.divide(a, np.multiply(a, a) + np.multiply(b, b))


def _power_by_base(a: Number, b: Number, _: Number) -> Number:
    return np.where(b == 0.0, 0.0, b * np.power(a, np.subtract(b, 1.0)))


def _power_by_exponent(a: Number, b: Number, value: Number) -> Number:
    return np.where((a == 0.0) & (b > 0.0), 0.0, value * np.log(a))


OPERATORS = {
    "+": Operation(np.add, (_one, _one)),
    "-": Operation(np.subtract, (_one, _minus_one)),
    "*": Operation(np.multiply, (lambda _a, b, _v: b, lambda a, _b, _v: a)),
    "/": Operation(np.true_divide, (lambda _a, b, _v: np.divide(1.0, b), lambda _a, b, v: -np.divide(v, b))),
    "**": Operation(np.power, (_power_by_base, _power_by_exponent)),
    "negative": Operation(np.negative, (_minus_one,)),
    "<": _comparison(np.less),
    "<=": _comparison(np.less_equal),
    ">": _comparison(np.greater),
    ">=": _comparison(np.greater_equal),
    "==": _comparison(np.equal),
    "!=": _comparison(np.not_equal),
}

FUNCTIONS = {
    "sin": Operation(np.sin, (lambda a, _: np.cos(a),)),
    "cos": Operation(np.cos, (lambda a, _: -np.sin(a),)),
    "tan": Operation(np.tan, (lambda _, v: 1.0 + v * v,)),
    "arcsin": Operation(np.arcsin, (lambda a, _: np.divide(1.0, np.sqrt((1.0 - a) * (1.0 + a))),)),
    "arccos": Operation(np.arccos, (lambda a, _: np.divide(-1.0, np.sqrt((1.0 - a) * (1.0 + a))),)),
    "arctan": Operation(np.arctan, (lambda a, _: np.divide(1.0, 1.0 + np.multiply(a, a)),)),
    "arctan2": Operation(np.arctan2, (_angle_by_first, _angle_by_second)),
    "sinh": Operation(np.sinh, (lambda a, _: np.cosh(a),)),
    "cosh": Operation(np.cosh, (lambda a, _: np.sinh(a),)),
    "tanh": Operation(np.tanh, (lambda a, _: np.power(np.cosh(a), -2.0),)),
    "exp": Operation(np.exp, (lambda _, v: v,)),
    "log": Operation(np.log, (lambda a, _: np.divide(1.0, a),)),
    "sqrt": Operation(np.sqrt, (lambda _, v: np.divide(0.5, v),)),
    "abs": Operation(np.abs, (lambda a, _: np.sign(a),)),
    "sign": Operation(np.sign, (_zero,)),
    "minimum": Operation(np.minimum, (_first_chosen, _second_chosen), selects=True),
    "maximum": Operation(np.maximum, (_first_chosen, _second_chosen), selects=True),
    "hypot": Operation(np.hypot, (lambda a, _, v: _over_value(a, v), lambda _, b, v: _over_value(b, v))),
    "where": Operation(_where, (_zero, _where_true, _where_false), selects=True),
}

CONSTANTS = {"pi": math.pi}
