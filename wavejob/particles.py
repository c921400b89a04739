"""Particles that a job may call by name: their masses and charges.

Masses of isotopes are those of neutral atoms in dalton, from the atomic mass evaluation AME2020, rounded as
in its table of rounded masses (M. Wang et al., Chinese Physics C 45 (2021) 030003). Two copies of that table,
in the packages periodictable 2.1.0 and mendeleev 1.3.0, agree with each number here within its uncertainty.
Other masses: CODATA 2022.
"""

from __future__ import annotations

import re
from dataclasses import dataclass

from .problems import nearest
from .reading import constants
from .reading.quantity_text import QuantityError

_ISOTOPES = {
    "H-1": 1.0078250319, "H-2": 2.01410177784, "H-3": 3.01604928132, "He-3": 3.01602932197,
    "He-4": 4.00260325413, "Li-6": 6.0151228874, "Li-7": 7.016003434, "Be-9": 9.01218306,
    "B-10": 10.012936862, "B-11": 11.009305167, "C-12": 12.0, "C-13": 13.00335483534,
    "N-14": 14.00307400425, "N-15": 15.0001088983, "O-16": 15.9949146193, "O-17": 16.999131756,
    "O-18": 17.9991596121, "F-19": 18.9984031621, "Ne-20": 19.9924401753, "Ne-22": 21.991385114,
    "Na-23": 22.989769282, "Mg-24": 23.985041689, "Mg-25": 24.98583697, "Mg-26": 25.98259297,
    "Al-27": 26.98153841, "Si-28": 27.9769265344, "Si-29": 28.9764946643, "P-31": 30.9737619977,
    "S-32": 31.9720711735, "S-34": 33.96786701, "Cl-35": 34.96885269, "Cl-37": 36.96590257,
    "Ar-36": 35.967545106, "Ar-40": 39.962383122, "K-39": 38.963706485, "K-40": 39.96399817,
    "K-41": 40.961825256, "Ca-40": 39.962590851, "Ca-43": 42.95876638, "Ti-48": 47.94794068,
    "Cr-52": 51.94050471, "Cr-53": 52.9406463, "Mn-55": 54.93804304, "Fe-56": 55.93493554,
    "Co-59": 58.9331935, "Ni-58": 57.9353417, "Cu-63": 62.9295971, "Cu-65": 64.9277895,
    "Zn-64": 63.9291418, "Ga-69": 68.9255735, "Ga-71": 70.9247026, "As-75": 74.9215946,
    "Br-79": 78.9183376, "Br-81": 80.9162882, "Kr-84": 83.911497727, "Rb-85": 84.911789736,
    "Rb-87": 86.909180529, "Sr-84": 83.9134191, "Sr-86": 85.909260725, "Sr-87": 86.908877495,
    "Sr-88": 87.905612254, "Ag-107": 106.9050915, "Ag-109": 108.9047558, "Cd-111": 110.9041838,
    "Cd-114": 113.903365, "In-115": 114.903878773, "I-127": 126.904473, "Xe-129": 128.904780857,
    "Xe-131": 130.905084128, "Xe-132": 131.904155083, "Cs-133": 132.905451959, "Ba-138": 137.90524706,
    "Eu-151": 150.9198566, "Dy-161": 160.9269394, "Dy-162": 161.9268045, "Dy-163": 162.9287372,
    "Dy-164": 163.9291808, "Ho-165": 164.9303291, "Er-166": 165.9303011, "Er-167": 166.9320562,
    "Er-168": 167.93237828, "Tm-169": 168.934219, "Yb-168": 167.9338913, "Yb-170": 169.934767243,
    "Yb-171": 170.936331515, "Yb-172": 171.936386654, "Yb-173": 172.938216212, "Yb-174": 173.938867546,
    "Yb-176": 175.942574706, "Au-197": 196.9665701, "Hg-198": 197.9667692, "Hg-199": 198.968281,
    "Hg-200": 199.9683269, "Hg-201": 200.9703031, "Hg-202": 201.9706436, "Tl-205": 204.9744273,
    "Pb-208": 207.976652, "Ra-226": 226.0254082,
}  # fmt: skip


@dataclass(frozen=True)
class Particle:
    """A particle known by name: its mass in kg, its charge in elementary charges."""

    mass: float
    charge: float


PARTICLES: dict[str, Particle] = {
    "electron": Particle(constants.ELECTRON_MASS, -1.0),
    "muon": Particle(constants.MUON_MASS, -1.0),
    "proton": Particle(constants.PROTON_MASS, 1.0),
    "neutron": Particle(constants.NEUTRON_MASS, 0.0),
} | {name: Particle(mass * constants.DALTON, 0.0) for name, mass in _ISOTOPES.items()}


def particle(name: str) -> Particle:
    """The particle called `name`, such as `electron` or `Rb-87`. Raises QuantityError."""
    if name in PARTICLES:
        return PARTICLES[name]
    near = _near(name)
    fix = f"did you mean `{near}`?" if near else "write electron, proton, neutron, muon, an isotope, or a mass"
    raise QuantityError(f"no particle called `{name[:40]}` is known here", fix)


def _near(name: str) -> str:
    """The particle that was probably meant: rb87 and 87Rb are Rb-87."""
    isotope = re.fullmatch(r"([a-z]{1,2})[-_ ]?([0-9]{1,3})|([0-9]{1,3})[-_ ]?([a-z]{1,2})", name, re.IGNORECASE)
    if isotope:
        symbol, mass_number = isotope[1] or isotope[4], isotope[2] or isotope[3]
        name = f"{symbol.capitalize()}-{mass_number}"
        return name if name in PARTICLES else ""
    return nearest(name, PARTICLES) or ""
