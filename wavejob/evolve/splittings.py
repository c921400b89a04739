"""Splittings of one time step into potential and kinetic factors, as tables of coefficients.

A step of length tau is kick, drift, kick, ..., drift, kick (hbar = 1):

    kick   exp(-i tau weight [V(t + at tau) - gradient tau^2 sum over axes (dV/dx_a)^2 / m_a])
    drift  exp(-i tau d T)

To add a splitting: one row in `SPLITTINGS`. Every row is a palindrome that begins and ends with a
kick, so that the last kick of a step and the first of the next, at the same time, are one product.
"""

from __future__ import annotations

from dataclasses import dataclass

from ..problems import RunError


class PlanError(RunError):
    """A Hamiltonian and a way to advance it do not fit together."""


@dataclass(frozen=True)
class Kick:
    """A potential factor: its share of the step, the time it takes V at, its squared gradient."""

    weight: float
    at: float
    gradient: float = 0.0


@dataclass(frozen=True)
class Splitting:
    """One scheme; `kicks` has one entry more than `drifts`."""

    name: str
    order: int
    kicks: tuple[Kick, ...]
    drifts: tuple[float, ...]
    source: str

    @property
    def stages(self) -> int:
        """Pairs of transforms a step."""
        return len(self.drifts)

    @property
    def uses_gradient(self) -> bool:
        return any(kick.gradient for kick in self.kicks)


SPLITTINGS = {
    splitting.name: splitting
    for splitting in (
        Splitting(
            "strang",
            order=2,
            kicks=(Kick(1 / 2, 0), Kick(1 / 2, 1)),
            drifts=(1.0,),
            source="G. Strang, SIAM J. Numer. Anal. 5 (1968) 506",
        ),
        Splitting(
            "chin_4a",
            order=4,
            kicks=(Kick(1 / 6, 0), Kick(2 / 3, 1 / 2, gradient=1 / 48), Kick(1 / 6, 1)),
            drifts=(1 / 2, 1 / 2),
            source="S. A. Chin, Phys. Lett. A 226 (1997) 344; with V(t): Chin & Chen, J. Chem. Phys. 117 (2002) 1409",
        ),
    )
}
