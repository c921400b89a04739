"""Quantities: worth of units against scipy.constants, inside units, names, printing, refusals."""

from __future__ import annotations

import contextlib
import math
import pickle
import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
import scipy.constants as si
from hypothesis import given, settings
from hypothesis import strategies as st

from wavejob.reading import constants
from wavejob.reading.dimensions import DIMENSIONS, kind_of
from wavejob.reading.quantities import Named, QuantityError, Units, unit_names
from wavejob.reading.unit_table import measure

LAB = Units.from_file(None)
STATED = Units.from_file({"length": "um", "time": "ms", "energy": "peV"})
ATOMIC = Units.from_file("atomic")
NATURAL = Units.from_file("natural")
SPECTRAL = Units.from_file({"length": "angstrom", "energy": "cm^-1"})
SYSTEMS = {"lab": LAB, "stated": STATED, "atomic": ATOMIC, "natural": NATURAL, "spectral": SPECTRAL}
NAMES = {"b2": LAB.read_named("3 nm"), "V0": LAB.read_named("300 meV"), "n": LAB.read_named(2)}

# One inside unit of each in SI, for nm and fs: from hbar = 1 by hand.
HBAR, E = si.hbar, si.e
LAB_SI = {"length": 1e-9, "time": 1e-15, "energy": HBAR / 1e-15, "mass": HBAR * 1e-15 / 1e-18, "charge": E,
          "wavenumber": 1e9, "momentum": HBAR * 1e9, "velocity": 1e6, "frequency": 1e15,
          "angular_frequency": 1e15, "acceleration": 1e21,
          "electric_field": HBAR / 1e-15 / E / 1e-9, "stiffness": HBAR / 1e-15 / 1e-18,
          "slope": HBAR / 1e-15 / 1e-9, "energy_length": HBAR / 1e-15 * 1e-9}  # fmt: skip


def _refused(value: object, dimension: str, units: Units = LAB) -> str:
    with pytest.raises(QuantityError) as caught:
        units.read(value, dimension, NAMES)  # type: ignore[arg-type]
    return str(caught.value)


def test_constants_are_those_of_codata_2022() -> None:
    """scipy 1.17 carries CODATA 2022 (scipy.constants, release notes of 1.15)."""
    for name, value in {
        "electron mass": constants.ELECTRON_MASS, "muon mass": constants.MUON_MASS,
        "proton mass": constants.PROTON_MASS, "neutron mass": constants.NEUTRON_MASS,
        "atomic mass constant": constants.DALTON,
        "Hartree energy": constants.HARTREE, "Planck constant": constants.PLANCK,
        "speed of light in vacuum": constants.LIGHT_SPEED, "elementary charge": constants.ELEMENTARY_CHARGE,
        "Boltzmann constant": constants.BOLTZMANN, "reduced Planck constant": constants.HBAR,
        "standard acceleration of gravity": constants.STANDARD_GRAVITY,
    }.items():  # fmt: skip
        assert value == pytest.approx(si.value(name), rel=1e-15), name
    # 5.29177210544(82)e-11 m: within half of the last digit, so that it is consistent with the others
    assert abs(constants.BOHR - si.value("Bohr radius")) < 0.5e-22


@pytest.mark.parametrize(
    ("text", "dimension", "worth"),
    [
        ("1 nm", "length", 1e-9),
        ("2.5 um", "length", 2.5e-6),
        ("2.5 µm", "length", 2.5e-6),
        ("2.5 \u03bcm", "length", 2.5e-6),
        ("1 Å", "length", 1e-10),
        ("1 \u212b", "length", 1e-10),
        ("1 angstrom", "length", 1e-10),
        ("1 bohr", "length", si.value("Bohr radius")),
        ("1 fm + 1 pm + 1 mm + 1 cm + 1 m + 1 km", "length", 1e-15 + 1e-12 + 1011.011 - 10.0),
        ("5 as", "time", 5e-18),
        ("3 ps", "time", 3e-12),
        ("1 hbar/hartree", "time", si.value("atomic unit of time")),
        ("1 eV", "energy", si.e),
        ("70.4 meV", "energy", 0.0704 * si.e),
        ("5 peV", "energy", 5e-12 * si.e),
        ("1 hartree", "energy", si.value("Hartree energy")),
        ("1 rydberg", "energy", si.value("Rydberg constant times hc in J")),
        ("1 zJ", "energy", 1e-21),
        ("2 e*V", "energy", 2 * si.e),
        ("2143.2 cm^-1", "energy", 2143.2e2 * si.h * si.c),
        ("2143.2 1/cm", "energy", 2143.2e2 * si.h * si.c),
        ("20 uK", "energy", 20e-6 * si.k),
        ("0.067 electron_mass", "mass", 0.067 * si.m_e),
        ("0.067 m_e", "mass", 0.067 * si.m_e),
        ("1 proton_mass", "mass", si.m_p),
        ("1 m_n", "mass", si.m_n),
        ("87 u", "mass", 87 * si.u),
        ("87 Da", "mass", 87 * si.u),
        ("87 dalton", "mass", 87 * si.u),
        ("1 g", "mass", 1e-3),
        ("-1 e", "charge", -si.e),
        ("1.6e-19 C", "charge", 1.6e-19),
        ("0.5 1/nm", "wavenumber", 0.5e9),
        ("0.5 nm^-1", "wavenumber", 0.5e9),
        ("0.5 nm**-1", "wavenumber", 0.5e9),
        ("0.5 rad/nm", "wavenumber", 0.5e9),
        ("1.2 hbar/nm", "momentum", 1.2e9 * si.hbar),
        ("1 kg*m/s", "momentum", 1.0),
        ("1 kg m / s", "momentum", 1.0),
        ("9.81 m/s^2", "acceleration", 9.81),
        ("1 g_n", "acceleration", si.g),
        ("2 V/um", "electric_field", 2e6),
        ("2 kV/cm", "electric_field", 2e5),
        ("1 hartree/e/bohr", "electric_field", si.value("atomic unit of electric field")),
        ("5 THz", "frequency", 5e12),
        ("5 Hz", "frequency", 5.0),
        ("0.1 1/fs", "frequency", 1e14),
        ("0.1 rad/fs", "angular_frequency", 1e14),
        ("0.1 1/fs", "angular_frequency", 1e14),
        ("1 meV/nm", "slope", 1e-3 * si.e / 1e-9),
        ("1 pN", "slope", 1e-12),
        ("1 meV/nm^2", "stiffness", 1e-3 * si.e / 1e-18),
        ("1 N/m", "stiffness", 1.0),
        ("14.4 eV*nm", "energy_length", 14.4e-9 * si.e),
        ("3 nm/fs", "velocity", 3e6),
    ],
)
def test_units_are_worth_what_they_are_in_si(text: str, dimension: str, worth: float) -> None:
    """Against scipy.constants; 1e-11 is the relative rounding of CODATA's derived atomic units."""
    assert LAB.read(text, dimension) * LAB_SI[dimension] == pytest.approx(worth, rel=1e-11)
    assert LAB.from_si(worth, dimension) == pytest.approx(LAB.read(text, dimension), rel=1e-11)


@pytest.mark.parametrize("text", ["180 deg", "3.141592653589793 rad", "3141.592653589793 mrad", 3.141592653589793])
def test_angles(text: str | float) -> None:
    assert LAB.read(text, "angle") == pytest.approx(math.pi, rel=1e-15)


@pytest.mark.parametrize("dimension", list(DIMENSIONS))
def test_atomic_units_are_one(dimension: str) -> None:
    """hbar = m_e = e = 1: what is printed is what is inside, and reads back as it."""
    assert ATOMIC.read(1.5, dimension) == 1.5
    assert ATOMIC.scale(dimension) == 1.0
    label = ATOMIC.label(dimension)
    if label:
        worth, vector = measure(label.replace("^", "**"))
        assert DIMENSIONS[dimension].vector == vector or kind_of(vector) in DIMENSIONS[dimension].accepts
        assert ATOMIC.read(f"1.5 {label}", dimension) == 1.5
        assert worth / ATOMIC._inside(dimension) == pytest.approx(1.0, rel=1e-14)


def test_an_electron_is_the_same_in_all_systems() -> None:
    """The de Broglie wave number of 100 meV at 0.067 m_e, in 1/nm: sqrt(2 m E)/hbar."""
    expected = math.sqrt(2 * 0.067 * si.m_e * 0.1 * si.e) / si.hbar * 1e-9
    for units in (LAB, STATED, ATOMIC, SPECTRAL):
        mass, energy = units.read("0.067 electron_mass", "mass"), units.read("100 meV", "energy")
        nanometre = units.read("1 nm", "length")
        assert math.sqrt(2 * mass * energy) * nanometre == pytest.approx(expected, rel=1e-12)


def test_bare_numbers_in_file_units() -> None:
    assert STATED.read(5, "length") == 5.0
    assert STATED.read("5", "time") == 5.0
    assert STATED.read(2.5, "energy") == STATED.read("2.5 peV", "energy") == STATED.read("2.5e-12 eV", "energy")
    assert STATED.read(2, "stiffness") == STATED.read("2 peV/um^2", "stiffness")
    assert STATED.read("3e-3", "momentum") == STATED.read("0.003 hbar/um", "momentum")
    assert STATED.read("1", "frequency") == pytest.approx(STATED.read("1 kHz", "frequency"), rel=1e-15)
    assert SPECTRAL.read(2143.2, "energy") == SPECTRAL.read("2143.2 cm^-1", "energy")
    assert SPECTRAL.read(2, "slope") == pytest.approx(2 * SPECTRAL.read("1 1/cm", "energy"), rel=1e-15)
    assert LAB.read(0, "length") == LAB.read("0", "charge") == LAB.read(0.0, "energy") == 0.0


@pytest.mark.parametrize(
    ("value", "dimension", "said"),
    [
        (5, "length",
        "`5` has no unit, and a length needs one; write e.g. `5 nm`, or state `units: {length: nm}`"),
        ("5", "velocity",
        "`5` has no unit, and a velocity needs one; write e.g. `0.1 nm/fs`, or state `units: "
         "{length: nm, time: fs}`"),
        ("n", "energy",
        "`n` has no unit, and an energy needs one; write e.g. `5 meV`, or state `units: {energy: meV}`"),
        (-1, "charge", "`-1` has no unit, and a charge always needs one; write it with a unit, e.g. `-1 e`"),
        (0.067, "mass", "`0.067` has no unit, and a mass always needs one; write it with a unit, e.g. "
         "`0.067 electron_mass`"),
        (3, "electric_field",
        "`3` has no unit, and an electric field always needs one; write it with a unit, e.g. "
         "`2 V/um`"),
        ("5 fs", "length", "`5 fs` is a time; a length is wanted here; write e.g. `5 nm`"),
        ("b2", "energy", "`b2` is a length; an energy is wanted here; write e.g. `5 meV`"),
        ("3 nm + 0.5*V0", "length", "`0.5*V0` is an energy; a length is wanted here; write e.g. `5 nm`"),
        ("5 nm", "number", "`5 nm` is a length; a plain number is wanted here; write e.g. `0.5`"),
        ("5 THz", "angular_frequency",
        "`5 THz` is a frequency; an angular frequency is wanted here; give it under "
         "`frequency`, or 2 pi times as much in rad/fs"),
        ("5 rad/fs", "frequency",
        "`5 rad/fs` is an angular frequency; a frequency is wanted here; give it under "
         "`omega`, or divided by 2 pi in THz"),
        ("1 rad/cm", "energy", "`1 rad/cm` is a wave number; an energy is wanted here; write e.g. `5 meV`"),
        ("5 m^5", "length",
        "`m^5` measures no kind of quantity that job files know; check the powers of the unit"),
        ("5 nm/nm", "number",
        "`nm/nm` measures no kind of quantity that job files know; check the powers of the unit"),
        ("1,5 nm", "length", "`1,5 nm` has a comma; write a decimal point, as in `1.5 nm`"),
        ("inf", "length", "`inf` is not a finite number; write a finite number"),
        ("-inf nm", "length", "`-inf nm` is not a finite number; write a finite number"),
        ("nan nm", "length", "`nan nm` is not a finite number; write a finite number"),
        (math.inf, "length", "`inf` is not a finite number; write a finite number"),
        (math.nan, "number", "`nan` is not a finite number; write a finite number"),
        ("1e999 nm", "length", "`1e999` is not a finite number; write a finite number"),
        (10**400, "number", "`the number` is not a finite number; write a finite number"),
        ("1e300 km", "length", "`1e300 km` is out of range; write a smaller quantity"),
        (True, "number", "`yes` is no quantity; write a number and a unit, as in `5 nm`"),
        ("1 mev", "energy", "`mev` in `1 mev` is no unit known here; did you mean `MeV` or `meV`?"),
        ("0.067 me", "mass", "`me` in `0.067 me` is no unit known here; did you mean `m_e`?"),
        ("1 Eh", "energy", "`Eh` in `1 Eh` is no unit known here; did you mean `E_h`?"),
        ("1 Pm", "length", "`Pm` in `1 Pm` is no unit known here; did you mean `pm`?"),
        ("1 furlong", "length",
        "`furlong` in `1 furlong` is no unit known here; `wavejob explain units` lists the "
         "units"),
        ("1 a.u.", "energy",
        "`1 a.u.` does not say which atomic unit it means; name the unit: bohr, hbar/hartree, "
         "hartree, electron_mass, e"),
        ("2143 cm-1", "energy",
        "`2143 cm-1` can be read in two ways; write `cm^-1` for a power, spaces around the "
         "sign for a difference"),
        ("2143 cm\u207b\u00b9", "energy",
        "`2143 cm\u207b\u00b9` holds a raised digit or sign; write powers as in "
         "`cm^-1`"),
        ("\u2212 5 nm", "length", "`\u2212 5 nm` holds a typographic minus sign; write `-`"),
        ("\uff11 nm", "length",
        "`\uff11 nm` holds the character `\uff11` (U+FF11); write plain letters, the digits "
         "0-9 and plain spaces"),
        ("1 nm^12", "length", "`nm^12` has a power that no unit has; write a power from 1 to 9, or -1 to -9"),
        ("1 nm^0", "length", "`nm^0` has a power that no unit has; write a power from 1 to 9, or -1 to -9"),
        ("1 m m m m m m m", "length", "`m m m m m m m` is made of more than 6 units; simplify the unit"),
        ("", "length", "the quantity is empty; write a number and a unit, as in `5 nm`"),
        ("5/fs", "frequency", "`5/fs` is a number divided by a unit or name; write it as in `5 1/fs`"),
        ("nm", "length", "`nm` is a unit and stands alone; write a number before it: `5 nm`"),
        ("2 b2", "length", "`b2` is a name, not a unit; write a product as in `2*b2`"),
        ("b2*2", "length", "`b2*2` has a factor in the wrong place; write the number first, as in `0.5*b2`"),
        ("b2/0", "length", "`b2/0` divides by zero; divide by another number"),
        ("B2", "length", "no quantity is called `B2`; did you mean `b2`?"),
        ("length", "length",
        "no quantity is called `length`; define it under `let`, or write a number and a unit"),
        ("x" * 81, "length", "the quantity is longer than 80 characters; write a number and a unit"),
        ("3 nm +", "length",
        "`3 nm +` can't be read to its end; write a number and a unit, as in `5 nm`, or a sum such "
         "as `3 nm + b2`"),
        ("1e 3 nm", "length",
        "`1e 3 nm` can't be read from `3 nm` on; write a number and a unit, as in `5 nm`, or a "
         "sum such as `3 nm + b2`"),
    ],
)  # fmt: skip
def test_refused_in_words(value: object, dimension: str, said: str) -> None:
    assert _refused(value, dimension) == said


# What general unit parsers read as something else, or never finish: measured with one of them.
@pytest.mark.parametrize("text", [
    "9**9**9**9", "9**9**9**9 nm", "1 m**9**9**9", "1 m**9**9", "5 nm # x", "±5 nm", "5±1 nm", "1//2 nm",
    "1/0 nm",
    "(" * 70, "5 (nm)", "5 nm; 3", "__import__('os')", "5 nm.real", "1_000 nm", "0x10 nm", "5 %",
    "5 nm nm^-1 nm!",
    "1e-999999999999999999999999 m^9*m^9*m^9*m^9*m^9", "5\u00a0nm", "5 nm\0", "1 m_e^-9*m_e^-9*m_e^-9",
    "5 delta_m", "5 nms",
    "5 meter", "5 count", "5 degC", "5 m**-0", "+ + 5 nm", "5 nm * 2", "2*nm", "5 1/1/nm", "1/nm", "b2/b2",
    "0.5*b2*2",
    "5 kelectron_mass", "5 mbohr", "5 nm+-2 nm", "5 nm,", "1 e e e", "infinity", "-nan",
])  # fmt: skip
def test_hostile_texts(text: str) -> None:
    _refused(text, "length")


def test_names() -> None:
    assert LAB.read("3 nm + b2", "length", NAMES) == 6.0
    assert LAB.read("3 nm - 2*b2", "length", NAMES) == -3.0
    assert LAB.read("-b2/2 + 1 nm", "length", NAMES) == -0.5
    assert LAB.read("0.5*V0", "energy", NAMES) == pytest.approx(LAB.read("150 meV", "energy"), rel=1e-15)
    assert LAB.read("2 * V0 / 4", "energy", NAMES) == pytest.approx(LAB.read("150 meV", "energy"), rel=1e-15)
    assert LAB.read("n", "number", NAMES) == 2.0
    assert STATED.read("2*n", "length", NAMES) == 4.0  # in the file's units of where it is used
    assert NATURAL.read("n - 0.5", "energy", NAMES) == 1.5


def test_named_quantities_find_their_kind() -> None:
    assert LAB.read_named("3 nm") == Named(3.0, "length")
    assert LAB.read_named("3 nm + b2", NAMES) == Named(6.0, "length")
    assert LAB.read_named("1.5") == Named(1.5, "number")
    assert NATURAL.read_named(1.5) == Named(1.5, "number")
    assert LAB.read_named("0.1 1/fs").dimension == "rate"
    assert LAB.read_named("V0 - 1 meV", NAMES).dimension == "energy"
    assert STATED.read_named("2 + 3 um") == Named(5.0, "length")
    with pytest.raises(QuantityError):
        LAB.read_named("3 nm + V0", NAMES)


def test_named_energies_may_be_wave_numbers_of_light_or_temperatures() -> None:
    names = {"line": LAB.read_named("2143.2 cm^-1"), "bath": LAB.read_named("20 uK")}
    assert names["line"].dimension == "wavenumber"
    assert LAB.read("0.5*line", "energy", names) == pytest.approx(LAB.read("1071.6 cm^-1", "energy"), rel=1e-15)
    assert LAB.read("bath/2", "energy", names) == pytest.approx(LAB.read("10 uK", "energy"), rel=1e-15)
    assert LAB.read_named("2143.2 cm^-1 + 1 meV").dimension == "energy"
    assert SPECTRAL.read_named("2143.2 cm^-1") == Named(SPECTRAL.read("2143.2 cm^-1", "energy"), "energy")


def test_natural_units_have_no_units() -> None:
    assert NATURAL.read(0.5, "mass") == NATURAL.read("0.5", "electric_field") == 0.5
    assert all(NATURAL.label(d) == "" and NATURAL.scale(d) == 1.0 for d in DIMENSIONS)
    assert (
        _refused("5 nm", "length", NATURAL) == "`5 nm` has a unit, and natural units have none; write the bare number"
    )
    with pytest.raises(QuantityError):
        NATURAL.from_si(1.0, "length")


@pytest.mark.parametrize(
    ("system", "said"),
    [
        ("SI",
        "`SI` is no system of units; write natural, atomic, or a map such as `{length: nm, time: fs, energy: "
         "meV}`"),
        ({"length": "fs"}, "`fs` measures a time, not a length; write one unit, e.g. `length: nm`"),
        ({"energy": "nm"}, "`nm` measures a length, not an energy; write one unit, e.g. `energy: meV`"),
        ({"length": "nm^2"}, "`nm^2` measures no quantity that job files know, not a length; write one unit, "
         "e.g. `length: nm`"),
        ({"length": "5 nm"}, "`5 nm` is not one unit of length; write one unit, e.g. `length: nm`"),
        ({"length": "1"}, "`1` is not one unit of length; write one unit, e.g. `length: nm`"),
        ({"time": "hbar/hartree"}, "`hbar/hartree` is not one unit of time; write one unit, e.g. `time: fs`"),
        ({"length": 3}, "`3` is not one unit of length; write one unit, e.g. `length: nm`"),
        ({"energy": "mev"}, "`mev` is no unit known here; did you mean `MeV` or `meV`?"),
        ({"mass": "u"}, "`units` gives no unit of `mass`; it takes length, time, energy"),
    ],
)  # fmt: skip
def test_the_key_units_is_checked(system: object, said: str) -> None:
    with pytest.raises(QuantityError) as caught:
        Units.from_file(system)  # type: ignore[arg-type]
    assert str(caught.value) == said
    assert str(pickle.loads(pickle.dumps(caught.value))) == said


@pytest.mark.parametrize(
    ("units", "labels"),
    [
        (LAB, "nm fs meV electron_mass e 1/nm hbar/nm nm/fs 1/fs rad/fs nm/fs^2 V/m meV/nm "
              "meV/nm^2 meV*nm 1/nm nm"),
        (STATED, "um ms peV electron_mass e 1/um hbar/um um/ms 1/ms rad/ms um/ms^2 V/m peV/um "
                 "peV/um^2 peV*um 1/um um"),
        (ATOMIC, "bohr hbar/hartree hartree electron_mass e 1/bohr hbar/bohr hartree*bohr/hbar hartree/hbar "
                 "rad*hartree/hbar hartree^2*bohr/hbar^2 hartree/bohr/e hartree/bohr hartree/bohr^2 "
                 "hartree*bohr 1/bohr bohr"),
    ],
    ids=["lab", "stated", "atomic"],
)  # fmt: skip
def test_labels(units: Units, labels: str) -> None:
    kinds = ("length time energy mass charge wavenumber momentum velocity flux angular_frequency "
             "acceleration electric_field force stiffness energy_length density "
             "momentum_density")  # fmt: skip
    assert [units.label(kind) for kind in kinds.split()] == labels.split()
    assert units.label("number") == ""


@pytest.mark.parametrize("dimension", list(DIMENSIONS))
@pytest.mark.parametrize("units", [LAB, STATED], ids=["lab", "stated"])
def test_labels_are_units_of_their_kind(units: Units, dimension: str) -> None:
    """What a table prints may be written in a job file."""
    if units.label(dimension):
        value = units.read(f"1.5 {units.label(dimension)}", dimension)
        assert value == pytest.approx(1.5 * units.scale(dimension), rel=1e-15)
        assert units.to_file(value, dimension) == pytest.approx(1.5, rel=1e-15)


def test_numbers_of_numpy_are_written_like_others() -> None:
    assert LAB.write(np.float64(3), "length") == "3.0 nm"
    assert SPECTRAL.write(np.float64(0.5), "number") == NATURAL.write(np.float64(0.5), "mass") == "0.5"


def test_whole_arrays_are_printed() -> None:
    values = np.array([0.0, 1.0, 2.0])
    np.testing.assert_allclose(LAB.to_file(values, "energy") * si.e / 1000, values * si.hbar / 1e-15, rtol=1e-12)


@settings(max_examples=200, deadline=None)
@given(
    name=st.sampled_from(sorted(SYSTEMS)),
    dimension=st.sampled_from(sorted(DIMENSIONS)),
    x=st.floats(1e-200, 1e200) | st.floats(-1e6, 1e6) | st.just(0.0),
)
def test_what_is_written_reads_back(name: str, dimension: str, x: float) -> None:
    """To a few roundings of 1.1e-16; exactly what was read in printed units, in the next test."""
    units = SYSTEMS[name]
    assert units.read(units.write(x, dimension), dimension) == pytest.approx(x, rel=1e-15, abs=1e-307)


@settings(max_examples=200, deadline=None)
@given(
    number=st.decimals(-1000, 1000, places=4).map(str),
    case=st.sampled_from(
        [
            ("meV", "energy"),
            ("nm", "length"),
            ("fs", "time"),
            ("electron_mass", "mass"),
            ("V/m", "electric_field"),
        ]
    ),
)
def test_what_was_read_in_printed_units_is_written_as_it_was(number: str, case: tuple[str, str]) -> None:
    unit, dimension = case
    x = LAB.read(f"{number} {unit}", dimension)
    assert LAB.read(LAB.write(x, dimension), dimension) == x
    assert LAB.write(x, dimension) == f"{float(number) + 0.0!r} {unit}"


_PIECES = st.sampled_from(
    ["5", "1e3", ".", "e", "nm", "fs", "eV", "b2", "V0", "n", " ", "+", "-", "*", "/", "^", "**", "-1", "1/",
     "2", "u", "µm", "Å", "\u212b", "·", ",", "(", "a.u.", "inf", "K", "Hz", "rad", "hbar", "m_e"]
)  # fmt: skip


@settings(max_examples=500, deadline=None)
@given(
    text=st.one_of(st.lists(_PIECES, max_size=10).map("".join), st.text(max_size=30)),
    name=st.sampled_from(sorted(SYSTEMS)),
    dimension=st.sampled_from(sorted(DIMENSIONS)),
)
def test_any_text_is_read_or_refused(text: str, name: str, dimension: str) -> None:
    with contextlib.suppress(QuantityError):
        assert math.isfinite(SYSTEMS[name].read(text, dimension, NAMES))
    with contextlib.suppress(QuantityError):
        assert SYSTEMS[name].read_named(text, NAMES).dimension in DIMENSIONS


def test_every_unit_name_is_a_word_that_reads() -> None:
    alone = {name for name in unit_names() if kind_of(measure(name)[1]) is None}
    assert alone == {
        "cycle",
        "hbar",
        "V",
        "nV",
        "uV",
        "\u00b5V",
        "\u03bcV",
        "mV",
        "kV",
        "MV",
    }  # units only in compounds
    for name in unit_names() - alone:
        assert LAB.read_named(f"2 {name}").dimension == kind_of(measure(name)[1])
    assert {"nm", "eV", "e", "u", "K", "hbar", "µm"} <= unit_names()
    assert not {"b2", "V0", "x", "t", "pi"} & unit_names()


def test_pint_is_imported_only_for_unit_texts() -> None:
    code = """
import sys
from wavejob.reading.quantities import Units
natural, lab = Units.from_file("natural"), Units.from_file(None)
natural.read("0.5", "energy"), natural.write(0.5, "energy"), lab.label("energy"), lab.scale("length")
assert "pint" not in sys.modules
lab.read("5 meV", "energy")
assert "pint" in sys.modules
"""
    subprocess.run([sys.executable, "-c", code], check=True, cwd=Path.cwd())


def test_many_threads_read_alike() -> None:
    code = """
import threading
from wavejob.reading.quantities import Units
found = []
read = lambda: found.append(Units.from_file({"energy": "ueV"}).read("3 eV + 2 hbar/ps", "energy"))
threads = [threading.Thread(target=read) for _ in range(16)]
[thread.start() for thread in threads], [thread.join() for thread in threads]
assert len(found) == 16 and len(set(found)) == 1
"""
    subprocess.run([sys.executable, "-c", code], check=True, cwd=Path.cwd())
