"""Every unit that may be written, and its worth: a closed list, all that pint is ever told."""

from __future__ import annotations

import difflib
import functools
import math
import threading
from typing import Any

from . import constants
from .dimensions import Vector

_MICRO = ("u", "\u00b5", "\u03bc")  # the letter u, the micro sign and the Greek letter mu
_PREFIXES = {
    "z": 1e-21, "a": 1e-18, "f": 1e-15, "p": 1e-12, "n": 1e-9, **dict.fromkeys(_MICRO, 1e-6),
    "m": 1e-3, "c": 1e-2, "k": 1e3, "M": 1e6, "G": 1e9, "T": 1e12,
}  # fmt: skip

# Base units, in the order of the fields of Vector.
_BASES = {
    "m": "length",
    "kg": "mass",
    "s": "time",
    "C": "charge",
    "K": "temperature",
    "rad": "angle",
    "cycle": "cycle",
}

# Unit, its worth in units above it, and the prefixes that people write before it.
_UNITS: tuple[tuple[str, str, str], ...] = (
    ("m", "", "fpnumck"),
    ("s", "", "afpnum"),
    ("K", "", "pnum"),
    ("rad", "", "m"),
    ("C", "", ""),
    ("kg", "", ""),
    ("g", "0.001 * kg", ""),
    ("deg", f"{math.pi / 180.0!r} * rad", ""),
    ("Hz", "cycle / s", "mkMGT"),
    ("J", "kg * m ** 2 / s ** 2", "zafpnumk"),
    ("eV", f"{constants.ELEMENTARY_CHARGE!r} * J", "fpnumkMG"),
    ("hartree", f"{constants.HARTREE!r} * J", ""),
    ("E_h", "hartree", ""),
    ("rydberg", "0.5 * hartree", ""),
    ("hbar", f"{constants.HBAR!r} * J * s", ""),
    ("angstrom", "1e-10 * m", ""),
    ("\u00c5", "angstrom", ""),
    ("\u212b", "angstrom", ""),
    ("bohr", f"{constants.BOHR!r} * m", ""),
    ("a_0", "bohr", ""),
    ("electron_mass", f"{constants.ELECTRON_MASS!r} * kg", ""),
    ("m_e", "electron_mass", ""),
    ("proton_mass", f"{constants.PROTON_MASS!r} * kg", ""),
    ("m_p", "proton_mass", ""),
    ("neutron_mass", f"{constants.NEUTRON_MASS!r} * kg", ""),
    ("m_n", "neutron_mass", ""),
    ("dalton", f"{constants.DALTON!r} * kg", ""),
    ("Da", "dalton", ""),
    ("u", "dalton", ""),
    ("e", f"{constants.ELEMENTARY_CHARGE!r} * C", ""),
    ("V", "J / C", "numkM"),
    ("N", "J / m", "afpnum"),
    ("g_n", f"{constants.STANDARD_GRAVITY!r} * m / s ** 2", ""),
)

# What people write for units that have another name here.
_OTHER_NAMES = {
    "me": "m_e", "mp": "m_p", "mn": "m_n", "amu": "u", "AMU": "u", "Eh": "E_h", "Ha": "hartree",
    "Ry": "rydberg", "a0": "a_0", "g0": "g_n", "g_0": "g_n", "A": "angstrom", "Ang": "angstrom",
    "micron": "um", "sec": "s", "second": "s", "meter": "m", "metre": "m", "nanometer": "nm",
    "nanometre": "nm", "femtosecond": "fs", "electronvolt": "eV", "elementary_charge": "e",
    "degree": "deg", "degrees": "deg", "radian": "rad", "radians": "rad", "hertz": "Hz", "kelvin": "K",
    "volt": "V", "joule": "J", "newton": "N",
}  # fmt: skip

_lock = threading.Lock()


@functools.cache
def _definitions() -> dict[str, str]:
    """The definition of each unit in pint's notation; each builds on earlier ones."""
    table = {unit: f"[{base}]" for unit, base in _BASES.items()}
    for unit, worth, prefixes in _UNITS:
        if worth:
            table[unit] = worth
        for prefix in prefixes:
            for symbol in _MICRO if prefix == "u" else (prefix,):
                table[symbol + unit] = f"{_PREFIXES[symbol]!r} * {unit}"
    return table


@functools.cache
def unit_names() -> frozenset[str]:
    """All names of units that may be written; a named quantity of a job file may take none of them."""
    return frozenset(_definitions())


def similar_units(word: str) -> list[str]:
    """Units that someone who wrote `word` may have meant, the likeliest first; at most three."""
    if word in _OTHER_NAMES:
        return [_OTHER_NAMES[word]]
    folded = word.casefold()
    same = sorted(name for name in unit_names() if name.isascii() and name.casefold() == folded)
    near = difflib.get_close_matches(word, sorted(filter(str.isascii, unit_names())), 3, 0.75)
    return (same or near)[:3]


@functools.cache
def _registry() -> Any:
    import pint  # here, because it takes a third of a second and natural units never need it

    registry: Any = pint.UnitRegistry(None)
    registry.load_definitions([f"{name} = {worth}" for name, worth in _definitions().items()])
    return registry


@functools.cache
def measure(unit: str) -> tuple[float, Vector]:
    """The worth of a compound of known units in SI base units (and radians, cycles), and its base powers.

    `unit` is in pint's notation, checked by the grammar of `quantity_text.py`: pint must see nothing else.
    """
    with _lock:  # pint makes its caches without one
        amount = _registry().Quantity(1.0, _registry().parse_units(unit)).to_base_units()
    powers = {name.strip("[]"): int(power) for name, power in amount.dimensionality.items()}
    return float(amount.magnitude), Vector(**powers)
