"""Particles by name: masses against values from elsewhere, and near misses."""

from __future__ import annotations

import re

import pytest
import scipy.constants as si

from wavejob.particles import PARTICLES, particle
from wavejob.reading.quantities import QuantityError


@pytest.mark.parametrize(
    ("name", "mass", "charge"),
    [
        ("electron", si.m_e, -1),
        ("muon", si.value("muon mass"), -1),
        ("proton", si.m_p, 1),
        ("neutron", si.m_n, 0),
    ],
)
def test_elementary_particles(name: str, mass: float, charge: float) -> None:
    """scipy.constants (CODATA 2022)."""
    assert particle(name).mass == pytest.approx(mass, rel=1e-15)
    assert particle(name).charge == charge


@pytest.mark.parametrize(
    ("name", "mass", "error"),
    [
        # AME2020 with all its digits, in u
        ("H-1", 1.00782503190, 1e-11),
        ("Cl-35", 34.968852694, 4e-8),
        # CODATA 2022 masses of nuclei, and of the electrons; their binding energies in eV are from memory
        (
            "He-4",
            si.value("alpha particle mass in u") + 2 * si.value("electron mass in u") - 79.0052 / 931.494e6,
            2e-10,
        ),
        ("H-2", si.value("deuteron mass in u") + si.value("electron mass in u") - 13.6057 / 931.494e6, 1e-10),
        ("H-1", si.value("proton mass in u") + si.value("electron mass in u") - 13.6057 / 931.494e6, 1e-10),
        # Steck, Alkali D Line Data (steck.us/alkalidata; from memory), of older evaluations
        ("Rb-87", 86.909180520, 2e-8),
        ("Rb-85", 84.911789732, 2e-8),
        ("Na-23", 22.989769280, 2e-8),
        ("Cs-133", 132.905451931, 4e-8),
        ("C-12", 12.0, 0.0),
    ],
)
def test_isotopes(name: str, mass: float, error: float) -> None:
    found = particle(name).mass / si.value("atomic mass constant")
    assert abs(found - mass) <= error + 4e-16 * mass
    assert particle(name).charge == 0.0


def test_isotopes_weigh_about_their_mass_number() -> None:
    """The mass defect of nuclei stays below a tenth of a dalton (from memory)."""
    isotopes = {name: body for name, body in PARTICLES.items() if "-" in name}
    assert len(isotopes) > 80
    for name, body in isotopes.items():
        assert re.fullmatch(r"[A-Z][a-z]?-[0-9]+", name)
        assert abs(body.mass / si.value("atomic mass constant") - int(name.split("-")[1])) < 0.1, name


@pytest.mark.parametrize("name", ["Rb87", "rb-87", "87Rb", "87-Rb", "RB_87", "rb 87"])
def test_near_isotopes(name: str) -> None:
    with pytest.raises(QuantityError) as caught:
        particle(name)
    assert caught.value.fix == "did you mean `Rb-87`?"


@pytest.mark.parametrize(("name", "fix"), [
    ("Electron", "did you mean `electron`?"),
    ("netron", "did you mean `neutron`?"),
    ("Rb-99", "write electron, proton, neutron, muon, an isotope, or a mass"),
    ("tachyon wave", "write electron, proton, neutron, muon, an isotope, or a mass"),
    ("", "write electron, proton, neutron, muon, an isotope, or a mass"),
])  # fmt: skip
def test_unknown_particles(name: str, fix: str) -> None:
    with pytest.raises(QuantityError) as caught:
        particle(name)
    assert caught.value.message == f"no particle called `{name}` is known here"
    assert caught.value.fix == fix
