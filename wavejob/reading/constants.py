"""Constants of physics in SI units: CODATA 2022 (physics.nist.gov/constants), exact where so defined."""

from __future__ import annotations

import math

SOURCE = "CODATA 2022"

LIGHT_SPEED = 299792458.0  # m/s, exact
PLANCK = 6.62607015e-34  # J s, exact
HBAR = PLANCK / (2.0 * math.pi)  # J s
ELEMENTARY_CHARGE = 1.602176634e-19  # C, exact
BOLTZMANN = 1.380649e-23  # J/K, exact
STANDARD_GRAVITY = 9.80665  # m/s^2, exact by convention

ELECTRON_MASS = 9.1093837139e-31  # kg
MUON_MASS = 1.883531627e-28  # kg
PROTON_MASS = 1.67262192595e-27  # kg
NEUTRON_MASS = 1.67492750056e-27  # kg
DALTON = 1.66053906892e-27  # kg
HARTREE = 4.3597447222060e-18  # J
# In place of the published 5.29177210544e-11 m: equal to its last digit, and consistent with the two above to
# rounding, so that a quantity reads alike in atomic and in other units.
BOHR = HBAR / math.sqrt(ELECTRON_MASS * HARTREE)  # m
