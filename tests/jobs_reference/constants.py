"""Physical constants in the units these references compute in (CODATA 2022 through scipy, or as given there)."""

from __future__ import annotations

from scipy import constants as si

HBAR = si.hbar  # J s
EV = si.e  # J
U = si.atomic_mass  # kg
M_E = si.m_e  # kg
M_P = si.m_p  # kg
M_N = si.m_n  # kg
HC = si.h * si.c * 100  # J cm: energy of 1 cm^-1
G_N = si.g  # m / s^2
RB87 = 86.909180529 * U  # AME2020
CA40 = 39.962590851 * U - M_E  # AME2020, singly charged
H2 = 2.01410177784 * U  # AME2020
