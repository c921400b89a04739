"""Quantities with units to plain numbers, and back: beyond this door, nobody knows units.

Inside, hbar is 1. The inside units of length and time are those of the job file, the energy unit is hbar over
the time unit, the mass unit hbar times time over squared length, and charges count elementary charges.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import TYPE_CHECKING, Any, NamedTuple, TypeVar

from ..problems import nearest, shown
from . import constants
from .dimensions import DIMENSIONS, Powers, accepted, kind_of
from .quantity_text import QuantityError, Term, is_unit, pint_notation, terms, unit_words
from .unit_table import measure, similar_units, unit_names

if TYPE_CHECKING:
    import numpy as np
    from numpy.typing import NDArray

    Amount = TypeVar("Amount", float, NDArray[np.float64])

__all__ = ["Named", "QuantityError", "Units", "unit_names", "unknown_name"]

_PRINTED = {"length": "nm", "time": "fs", "energy": "meV"}  # in tables, where the file does not say


class Named(NamedTuple):
    """A named quantity of a job file: its value in inside units (kelvin for a temperature), and its kind."""

    value: float
    dimension: str


@dataclass(frozen=True)
class Units:
    """What bare numbers of a job file mean, and what its tables print. Made by `from_file`."""

    system: str  # "natural", "atomic" or "file"
    length: str = ""
    time: str = ""
    energy: str = ""
    stated: frozenset[str] = frozenset()  # the kinds for which the file itself gives the unit

    @classmethod
    def from_file(cls, system: str | Mapping[str, Any] | None) -> Units:
        """From the key `units` of a job file, None where it is left out. Raises QuantityError."""
        if system == "natural":
            return cls("natural")
        if system == "atomic":
            return cls("atomic", "bohr", "hbar/hartree", "hartree")
        fix = "write natural, atomic, or a map such as `{length: nm, time: fs, energy: meV}`"
        if isinstance(system, str):
            raise QuantityError(f"`{system[:40]}` is no system of units", fix)
        if system is not None and not isinstance(system, Mapping):
            raise QuantityError(f"{shown(system)} is no system of units", fix)
        given = {kind: _base_unit(kind, unit) for kind, unit in (system or {}).items()}
        return cls("file", **(_PRINTED | given), stated=frozenset(given))

    def read(self, value: str | int | float, dimension: str, names: Mapping[str, Named] | None = None) -> float:
        """The quantity `value` of a job file in inside units; it may use `names`. Raises QuantityError."""
        total = math.fsum(self._amount(term, dimension, names or {}) for term in terms(value))
        if not math.isfinite(total):
            raise QuantityError(f"`{value}` is out of range", "write a smaller quantity")
        return total

    def read_named(self, value: str | int | float, names: Mapping[str, Named] | None = None) -> Named:
        """A quantity that is given a name: its kind is found from its units. Raises QuantityError.

        A bare number stays one: it counts in the file's units of the kind for which the name is used.
        """
        found = [self._kind(term, names or {}) for term in terms(value)]
        kinds = [kind for kind in found if kind != "number"] or ["number"]
        kind = "energy" if "energy" in kinds else kinds[0]
        return Named(self.read(value, kind, names), kind)

    def to_file(self, x: Amount, dimension: str) -> Amount:
        """The number that a table prints for `x` in inside units: see `label`."""
        return x / self.scale(dimension)

    def from_si(self, x: float, dimension: str) -> float:
        """A value in SI base units, in inside units. Raises QuantityError in natural units."""
        if self.system == "natural":
            raise QuantityError("natural units have no metre, second and kilogram", "write the bare number")
        return x / self._inside(dimension)

    def scale(self, dimension: str) -> float:
        """One printed unit of `dimension` in inside units."""
        kind = DIMENSIONS[dimension]
        if self.system != "file":
            return 1.0
        if kind.printed:
            return measure(kind.printed)[0] / self._inside(dimension)
        if kind.powers.energy == 0:
            return 1.0
        worth, vector = measure(pint_notation(self.energy))
        unit = Named(worth / self._inside(str(kind_of(vector))), str(kind_of(vector)))
        return float(self._as_energy(unit).value ** kind.powers.energy)

    def label(self, dimension: str) -> str:
        """The printed unit of `dimension`; empty for numbers and in natural units."""
        kind = DIMENSIONS[dimension]
        powers = kind.powers
        if self.system == "natural":
            return ""
        if kind.printed and (self.system == "file" or dimension != "electric_field"):
            return kind.printed
        if self.system == "atomic":  # whose unit of time has no name but hbar/hartree
            powers = Powers(powers.length, 0, powers.energy - powers.time, powers.hbar + powers.time, powers.charge)
        top = "K" if kind.kelvin else "rad" if kind.angle else ""
        return _spell(powers, self, top)

    def rounded(self, x: float, dimension: str) -> str:
        """`x` in inside units as a message shows it, to four digits."""
        return f"{self.to_file(x, dimension):.4g} {self.label(dimension)}".rstrip()

    def write(self, x: float, dimension: str) -> str:
        """A text that `read` turns back into `x` in inside units, as nearly as numbers allow."""
        printed = self
        if DIMENSIONS[dimension].powers.energy and dimension != "energy" and not _is_energy(self.energy):
            printed = replace(self, energy=_PRINTED["energy"])  # cm^-1 is an energy only by itself
        label = printed.label(dimension) if self.system == "file" else ""
        number = float(printed.to_file(x, dimension))
        below, above = (math.nextafter(number, way) for way in (-math.inf, math.inf))
        near = [f"{n!r} {label}".rstrip() for n in (float(f"{number:.15g}"), number, below, above)]
        exact = [text for text in near if self.read(text, dimension) == x]
        return min(exact, key=len) if exact else near[1]

    def _inside(self, dimension: str) -> float:
        """One inside unit of `dimension` in SI base units."""
        powers = DIMENSIONS[dimension].powers
        length, time = measure(pint_notation(self.length))[0], measure(pint_notation(self.time))[0]
        return float(
            length**powers.length
            * time ** (powers.time - powers.energy)
            * constants.HBAR ** (powers.energy + powers.hbar)
            * constants.ELEMENTARY_CHARGE**powers.charge
        )

    def _amount(self, term: Term, wanted: str, names: Mapping[str, Named]) -> float:
        """One term of a quantity of the kind `wanted`, in inside units."""
        if term.unit and pint_notation(term.unit) == pint_notation(self.label(wanted)):
            return term.factor * self.scale(wanted)  # exactly as the bare number
        if term.unit:
            given = self._measured(term, names)
        elif term.name:
            named = _named(term, names)
            given = Named(term.factor * named.value, named.dimension)
        else:
            given = Named(term.factor, "number")
        if given.dimension == "number" and wanted != "number":
            return self._bare(given.value, term, wanted)
        if given.dimension != wanted and given.dimension not in accepted(wanted):
            raise _mismatch(term, given.dimension, wanted)
        return self._as_energy(given).value if wanted == "energy" else given.value

    def _measured(self, term: Term, names: Mapping[str, Named]) -> Named:
        """A number with a unit, in inside units."""
        if self.system == "natural":
            raise QuantityError(f"`{term.text}` has a unit, and natural units have none", "write the bare number")
        for word in unit_words(term.unit):
            if word not in unit_names():
                raise _unknown_unit(word, term, names)
        try:
            worth, vector = measure(pint_notation(term.unit))
        except (OverflowError, ZeroDivisionError):
            raise QuantityError(f"the unit of `{term.text}` is out of range", "use another unit") from None
        kind = kind_of(vector)
        if kind is None or kind == "number":
            said = f"`{term.unit}` measures no kind of quantity that job files know"
            raise QuantityError(said, "check the powers of the unit")
        return Named(term.factor * (worth / self._inside(kind)), kind)

    def _kind(self, term: Term, names: Mapping[str, Named]) -> str:
        """What a term is; in the unit that the file gives for energies, be it cm^-1 or K, it is an energy."""
        if not term.unit:
            return _named(term, names).dimension if term.name else "number"
        kind = self._measured(term, names).dimension
        return "energy" if pint_notation(term.unit) == pint_notation(self.energy) else kind

    def _bare(self, number: float, term: Term, wanted: str) -> float:
        """A number without a unit, in the unit that the file gives for its kind; zero needs none."""
        kind = DIMENSIONS[wanted]
        if self.system != "file" or wanted == "angle" or number == 0.0:
            return number
        if kind.printed:
            fix = f"write it with a unit, e.g. `{kind.example}`"
            raise QuantityError(f"`{term.text}` has no unit, and {kind.words} always needs one", fix)
        needed = {"length": kind.powers.length, "time": kind.powers.time, "energy": kind.powers.energy}
        missing = [base for base, power in needed.items() if power and base not in self.stated]
        if missing or kind.kelvin:
            stated = ", ".join(f"{base}: {_PRINTED[base]}" for base in missing)
            fix = f"write e.g. `{kind.example}`" + (f", or state `units: {{{stated}}}`" if missing else "")
            raise QuantityError(f"`{term.text}` has no unit, and {kind.words} needs one", fix)
        return number * self.scale(wanted)

    def _as_energy(self, given: Named) -> Named:
        """A wave number of light (through h c) or a temperature (through k_B) as an energy."""
        if given.dimension == "wavenumber":
            factor = constants.PLANCK * constants.LIGHT_SPEED * self._inside("wavenumber")
        elif given.dimension == "temperature":
            factor = constants.BOLTZMANN
        else:
            return given
        return Named(given.value * (factor / self._inside("energy")), "energy")


def _base_unit(kind: str, unit: Any) -> str:
    """The unit that the file's `units` gives for length, time or energy, checked."""
    if kind not in _PRINTED:
        near = nearest(str(kind), _PRINTED)
        fix = f"did you mean `{near}`?" if near else f"it takes {', '.join(_PRINTED)}"
        raise QuantityError(f"`units` gives no unit of `{str(kind)[:40]}`", fix)
    example = f"write one unit, e.g. `{kind}: {_PRINTED[kind]}`"
    if not isinstance(unit, str) or not is_unit(unit.strip()) or len(unit_words(unit)) != 1:
        raise QuantityError(f"`{str(unit)[:40]}` is not one unit of {kind}", example)
    word = unit_words(unit)[0]
    if word not in unit_names():
        raise _unknown_unit(word, Term(1.0, unit, unit), {})
    found = kind_of(measure(pint_notation(unit))[1])
    if found != kind and found not in accepted(kind):
        words = DIMENSIONS[found].words if found else "no quantity that job files know"
        raise QuantityError(f"`{unit}` measures {words}, not {DIMENSIONS[kind].words}", example)
    return f"{word}^-1" if unit.replace(" ", "").startswith("1/") else unit.strip()


def _is_energy(unit: str) -> bool:
    return not unit or kind_of(measure(pint_notation(unit))[1]) == "energy"


def _spell(powers: Powers, units: Units, top: str) -> str:
    """A compound unit in the notation of job files, `top` being one more unit above the line."""
    parts = {"hbar": powers.hbar, units.energy: powers.energy, units.length: powers.length,
             units.time: powers.time, "e": powers.charge}  # fmt: skip
    above = [top] * bool(top) + [f"{unit}^{n}" if n > 1 else unit for unit, n in parts.items() if n > 0]
    below = [f"/{unit}^{-n}" if n < -1 else f"/{unit}" for unit, n in parts.items() if n < 0]
    return ("*".join(above) or "1" * bool(below)) + "".join(below)


def _named(term: Term, names: Mapping[str, Named]) -> Named:
    """The quantity that a term names."""
    if term.name in names:
        return names[term.name]
    if term.name.casefold() in ("inf", "infinity", "nan"):
        raise QuantityError(f"`{term.text}` is not a finite number", "write a finite number")
    if term.name in unit_names():
        raise QuantityError(unknown_name(term.name), f"write a number before it: `5 {term.name}`")
    near = nearest(term.name, names)
    fix = f"did you mean `{near}`?" if near else "define it under `let`, or write a number and a unit"
    raise QuantityError(unknown_name(term.name), fix)


def unknown_name(name: str) -> str:
    """The message about a name that stands for no quantity."""
    if name in unit_names():
        return f"`{name}` is a unit and stands alone"
    return f"no quantity is called `{name}`"


def _unknown_unit(word: str, term: Term, names: Mapping[str, Named]) -> QuantityError:
    if word in names:
        return QuantityError(f"`{word}` is a name, not a unit", f"write a product as in `2*{word}`")
    near = " or ".join(f"`{unit}`" for unit in similar_units(word))
    fix = f"did you mean {near}?" if near else "`wavejob explain units` lists the units"
    shown = f"`{word}`" if word == term.text else f"`{word}` in `{term.text}`"
    return QuantityError(f"{shown} is no unit known here", fix)


def _mismatch(term: Term, found: str, wanted: str) -> QuantityError:
    """A quantity of one kind where another is wanted."""
    said = f"`{term.text}` is {DIMENSIONS[found].words}; {DIMENSIONS[wanted].words} is wanted here"
    if (found, wanted) == ("frequency", "angular_frequency"):
        return QuantityError(said, "give it under `frequency`, or 2 pi times as much in rad/fs")
    if (found, wanted) == ("angular_frequency", "frequency"):
        return QuantityError(said, "give it under `omega`, or divided by 2 pi in THz")
    return QuantityError(said, f"write e.g. `{DIMENSIONS[wanted].example}`")
