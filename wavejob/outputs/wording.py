"""Words and numbers as they are printed on pictures."""

from __future__ import annotations

import math
import unicodedata
from dataclasses import dataclass

import numpy as np

Array = np.ndarray

SUPERSCRIPTS = str.maketrans("-0123456789", "\u207b\u2070\u00b9\u00b2\u00b3\u2074\u2075\u2076\u2077\u2078\u2079")
MINUS = "\u2212"
MOST_DECIMALS = 12  # of a tick: told apart on the finest axis there is


def clean(text: str) -> str:
    """`text` on one line, without control, direction and half characters, blanks joined."""
    kept = (c for c in text if unicodedata.category(c) not in {"Cf", "Cs", "Co", "Cn"})
    return " ".join("".join(" " if unicodedata.category(c) == "Cc" else c for c in kept).split())


def power_of_ten(exponent: int) -> str:
    """`10` with the exponent raised; plain `10` for 1."""
    return "10" if exponent == 1 else "10" + str(exponent).translate(SUPERSCRIPTS)


def axis_label(name: str, unit: str, power: int = 0) -> str:
    """`name [unit]`, the power of ten that multiplies the printed ticks before the unit."""
    shown = unit or "natural units"
    return f"{name} [{power_of_ten(power)} {shown}]" if power else f"{name} [{shown}]"


def per(unit: str) -> str:
    """The unit of a density; "" stays natural."""
    return f"1/{unit}" if unit else ""


def with_unit(number: str, unit: str) -> str:
    return f"{number} {unit}" if unit else number


def fixed(value: float, decimals: int) -> str:
    """`value` with that many decimals and a true minus sign, never a negative zero."""
    text = f"{value:.{decimals}f}"
    if float(text) == 0:
        text = text.lstrip("-")
    return text.replace("-", MINUS)


def scientific(value: float, digits: int = 2) -> str:
    """`3.2×10⁻⁶`; plain 0 for zero."""
    if value == 0:
        return "0"
    mantissa, exponent = f"{value:.{digits - 1}e}".split("e")
    return f"{mantissa.replace('-', MINUS)}\u00d7{power_of_ten_always(int(exponent))}"


def power_of_ten_always(exponent: int) -> str:
    return "10" + str(exponent).translate(SUPERSCRIPTS)


@dataclass(frozen=True)
class Numbers:
    """One way to print a whole column of numbers, so that they do not jump from frame to frame."""

    decimals: int | None  # None: scientific

    def __call__(self, value: float) -> str:
        if not math.isfinite(value):
            return "\u2013"
        return scientific(value, 3) if self.decimals is None else fixed(value, self.decimals)


def numbers_for(largest: float, resolution: float) -> Numbers:
    """Enough decimals for `resolution`; scientific where the largest is very large or very small."""
    if largest == 0 or not math.isfinite(largest):
        return Numbers(0)
    if largest >= 1e6 or largest < 1e-3:
        return Numbers(None)
    fine = min(abs(resolution) or largest, largest)
    return Numbers(int(np.clip(math.ceil(-math.log10(fine) - 1e-9), 0, 6)))


@dataclass(frozen=True)
class Ticks:
    """Places on an axis and what is printed there; the label carries `10^power`."""

    values: Array
    labels: tuple[str, ...]
    power: int


def ticks(low: float, high: float, most: int) -> Ticks:
    """At most about `most` round numbers from `low` to `high`."""
    rough = (high - low) / max(most, 1)
    decade = 10.0 ** math.floor(math.log10(rough))
    step = next(s * decade for s in (1, 2, 2.5, 5, 10) if s * decade >= rough * (1 - 1e-9))
    first = math.ceil(low / step - 1e-6)
    last = math.floor(high / step + 1e-6)
    values = np.arange(first, last + 1) * step
    largest = float(np.max(np.abs(values), initial=step))
    exponent = math.floor(math.log10(largest) + 1e-9)
    power = exponent if exponent >= 5 or exponent < -1 else 0
    scaled_step = step / 10.0**power
    decimals = next(
        d
        for d in range(MOST_DECIMALS + 1)
        if abs(round(scaled_step, d) - scaled_step) < 1e-6 * scaled_step or d == MOST_DECIMALS
    )
    labels = tuple(fixed(v / 10.0**power, decimals) for v in values)
    return Ticks(values, labels, power)
