"""The text of a quantity to its terms, by a closed grammar: no other parser ever sees the rest.

quantity := [sign] term (("+" | "-") term)...
term     := number unit | number | [number "*"] name ["/" number]
unit     := ["1/"] power (("*" | "/" | " ") power)...         at most 6 powers
power    := word [("^" | "**") ["-"] digit]
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import dataclass

MAX_LENGTH = 80
MAX_POWERS = 6

_NUMBER = r"(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?"
_LETTER = r"A-Za-z_\u00b5\u03bc\u00c5\u212b"  # with both signs for micro and for angstrom
_WORD = rf"[{_LETTER}][{_LETTER}0-9]*"
_POWER = rf"{_WORD}(?:(?:\^|\*\*)-?[0-9]+)?"
_UNIT = rf"(?:1\s*/\s*)?{_POWER}(?:(?:\s*[*/\u00b7]\s*|\s+){_POWER})*"
_SIGN = re.compile(r"\s*([+-])\s*", re.ASCII)
_TERM = re.compile(
    rf"(?P<number>{_NUMBER})"
    rf"(?:\s*\*\s*(?P<times>{_WORD})(?:\s*/\s*(?P<times_by>{_NUMBER}))?|\s*(?P<unit>{_UNIT}))?"
    rf"|(?P<name>{_WORD})(?:\s*/\s*(?P<by>{_NUMBER}))?",
    re.ASCII,
)
_UNIT_ALONE = re.compile(_UNIT, re.ASCII)
_MAYBE_POWER = re.compile(r"-[0-9](?![0-9.]*\s*[*A-Za-z])")  # as in cm-1


class QuantityError(ValueError):
    """A quantity that can't be read: what is wrong, and what to write instead."""

    def __init__(self, message: str, fix: str = "") -> None:
        self.message, self.fix = message, fix
        super().__init__(message, fix)

    def __str__(self) -> str:
        return f"{self.message}; {self.fix}" if self.fix else self.message


@dataclass(frozen=True)
class Term:
    """`factor` times a unit, or times a named quantity, or alone; `text` is what the user wrote."""

    factor: float
    text: str
    unit: str = ""
    name: str = ""


def terms(value: str | int | float) -> list[Term]:
    """The terms of which a quantity is the sum, all of them finite. Raises QuantityError."""
    if isinstance(value, bool):
        raise QuantityError(f"`{'yes' if value else 'no'}` is no quantity", "write a number and a unit, as in `5 nm`")
    if not isinstance(value, str):
        number = _finite(value, "the number" if isinstance(value, int) else str(value))
        return [Term(number, f"{number:.12g}")]
    if len(value) > MAX_LENGTH:
        raise QuantityError(f"the quantity is longer than {MAX_LENGTH} characters", "write a number and a unit")
    if re.search("[0-9]_[0-9]", value):
        raise QuantityError(f"`{value}` has a `_` between digits", "write the digits without it")
    return list(_read(value.strip()))


def unit_words(unit: str) -> list[str]:
    """The words of a unit text, in order."""
    return re.findall(_WORD, unit)


def pint_notation(unit: str) -> str:
    """A unit text as pint reads it."""
    spaced = re.sub(r"\s*([*/\u00b7^]|\*\*)\s*", r"\1", unit.strip())
    return re.sub(r"\s+|\u00b7", "*", spaced.replace("^", "**"))


def is_unit(text: str) -> bool:
    """Whether a text has the form of a unit."""
    return bool(_UNIT_ALONE.fullmatch(text)) and len(text) <= MAX_LENGTH


def _read(text: str) -> Iterator[Term]:
    at, sign = 0, 1.0
    opening = _SIGN.match(text)
    if opening:
        at, sign = opening.end(), -1.0 if opening.group(1) == "-" else 1.0
    while True:
        found = _TERM.match(text, at)
        if not found:
            raise _unreadable(text, at)
        following = _SIGN.match(text, found.end())
        if not following and found.end() < len(text):
            raise _unreadable(text, found.end())
        yield _term(found, sign)
        if not following:
            return
        if found["unit"] and _MAYBE_POWER.match(text, found.end()):
            word = unit_words(found["unit"])[-1]
            fix = f"write `{word}^-1` for a power, spaces around the sign for a difference"
            raise QuantityError(f"`{text}` can be read in two ways", fix)
        at, sign = following.end(), -1.0 if following.group(1) == "-" else 1.0


def _term(found: re.Match[str], sign: float) -> Term:
    text = found.group()
    divisor = _finite(float(found["by"] or found["times_by"] or 1.0), text)
    if divisor == 0.0:
        raise QuantityError(f"`{text}` divides by zero", "divide by another number")
    unit = found["unit"] or ""
    if re.search(r"[\^*]-?[0-9]{2}", unit) or re.search(r"[\^*]-?0", unit):
        raise QuantityError(f"`{unit}` has a power that no unit has", "write a power from 1 to 9, or -1 to -9")
    if len(unit_words(unit)) > MAX_POWERS:
        raise QuantityError(f"`{unit}` is made of more than {MAX_POWERS} units", "simplify the unit")
    number = _finite(float(found["number"] or 1.0), found["number"] or "")
    factor = _finite(sign * number / divisor, text)
    return Term(factor, ("-" if sign < 0 else "") + text, unit, found["name"] or found["times"] or "")


def _finite(number: int | float, text: str) -> float:
    try:
        value = float(number)
    except OverflowError:
        value = math.inf
    if not math.isfinite(value):
        raise QuantityError(f"`{text}` is not a finite number", "write a finite number")
    return value


def _unreadable(text: str, at: int) -> QuantityError:
    """Why a text is not a quantity, where reading came to an end at `at`."""
    shown = f"`{text}`"
    strange = next((c for c in text if not (c.isascii() or c in "\u00b5\u03bc\u00c5\u212b\u00b7")), "")
    if not text:
        return QuantityError("the quantity is empty", "write a number and a unit, as in `5 nm`")
    if strange == "\u2212":
        return QuantityError(f"{shown} holds a typographic minus sign", "write `-`")
    if strange and strange in "\u207b\u00b9\u00b2\u00b3":
        return QuantityError(f"{shown} holds a raised digit or sign", "write powers as in `cm^-1`")
    if strange:
        said = f"{shown} holds the character `{strange}` (U+{ord(strange):04X})"
        return QuantityError(said, "write plain letters, the digits 0-9 and plain spaces")
    if re.search(r"[0-9],[0-9]", text):
        return QuantityError(f"{shown} has a comma", f"write a decimal point, as in `{text.replace(',', '.', 1)}`")
    if re.match(r"[+-]?\s*(inf|nan)", text, re.IGNORECASE):
        return QuantityError(f"{shown} is not a finite number", "write a finite number")
    if "a.u." in text:
        fix = "name the unit: bohr, hbar/hartree, hartree, electron_mass, e"
        return QuantityError(f"{shown} does not say which atomic unit it means", fix)
    if re.match(r"\s*/\s*[A-Za-z]", text[at:]):
        return QuantityError(f"{shown} is a number divided by a unit or name", "write it as in `5 1/fs`")
    if at and re.match(r"\s*\*", text[at:]):
        return QuantityError(f"{shown} has a factor in the wrong place", "write the number first, as in `0.5*b2`")
    rest = text[at:].strip()[:20]
    where = f"from `{rest}` on" if rest and at else "to its end" if at else ""
    said = f"{shown} can't be read {where}".rstrip()
    return QuantityError(said, "write a number and a unit, as in `5 nm`, or a sum such as `3 nm + b2`")
