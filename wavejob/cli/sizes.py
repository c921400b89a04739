"""Sizes, times and counts as people write them."""

from __future__ import annotations

import math
import re

UNITS = {"B": 1} | {
    f"{prefix}{ending}": base**power
    for base, ending in ((1000, "B"), (1024, "iB"))
    for power, prefix in enumerate(("k" if ending == "B" else "K", "M", "G", "T"), 1)
}
WANTED = "write a number and a unit, such as `8 GB` or `500 MiB`"


class SizeError(ValueError):
    """A text that is no size."""


def read_size(text: str) -> int:
    """Bytes in a size such as `8 GB`, `512MiB` or `1.5 G`. Raises SizeError."""
    found = re.fullmatch(r"\s*([0-9]+(?:\.[0-9]+)?)\s*([A-Za-z]*)\s*", text)
    if found is None:
        raise SizeError(f"`{text}` is no size; {WANTED}")
    number, unit = found.groups()
    spelt = {name.lower(): worth for name, worth in UNITS.items()}
    spelt |= {name[0].lower(): worth for name, worth in UNITS.items() if name.endswith("B") and len(name) == 2}
    if not unit:
        raise SizeError(f"`{text}` has no unit; {WANTED}")
    if unit.lower() not in spelt:
        raise SizeError(f"`{unit}` is no unit of memory; there are: {', '.join(UNITS)}")
    size = float(number) * spelt[unit.lower()]
    if not 1 <= size < 2**63:
        raise SizeError(f"`{text}` is out of range; {WANTED}")
    return int(size)


TIMES = {"s": 1, "min": 60, "h": 3600, "d": 86400}


def read_duration(text: str) -> float:
    """Seconds in a time such as `90s`, `30 min` or `2h`. Raises SizeError."""
    found = re.fullmatch(r"\s*([0-9]+(?:\.[0-9]+)?)\s*([a-z]+)\s*", text)
    if found is None or found[2] not in TIMES or float(found[1]) <= 0:
        raise SizeError(f"`{text}` is no time; write a number and a unit, such as `90s`, `30min` or `2h`")
    return float(found[1]) * TIMES[found[2]]


def size(count: float) -> str:
    """`count` bytes in two or three digits."""
    for unit, worth in reversed([(u, w) for u, w in UNITS.items() if not u.endswith("iB")]):
        if count >= worth:
            return f"{_digits(count / worth)} {unit}"
    return "0 B"


def duration(seconds: float) -> str:
    """A rough time in words: `3 s`, `12 min`, `2.5 h`, `3 days`."""
    for unit, worth in (("days", 86400.0), ("h", 3600.0), ("min", 60.0)):
        if seconds >= 1.5 * worth:
            return f"{_digits(seconds / worth)} {unit}"
    return f"{_digits(seconds)} s" if seconds >= 1 else "less than 1 s"


def counted(number: int, one: str, many: str = "") -> str:
    return f"{number} {one if number == 1 else many or one + 's'}"


def _digits(value: float) -> str:
    """Two digits, and all before the decimal point."""
    if value == 0:
        return "0"
    rounded = round(value, 1 - math.floor(math.log10(value)))
    return f"{rounded:.0f}" if rounded >= 10 else f"{rounded:.1f}".removesuffix(".0")
