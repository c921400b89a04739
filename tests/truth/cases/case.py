"""What a case is: a job without points and step, and outside values for some of its results."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass
from typing import Literal

Harsh = Literal["", "short layer", "tight box", "early stop"]


@dataclass(frozen=True)
class Outside:
    """A value for one result, or for a column of a curve at one place (`T T 0.5`), known to `known`; natural units."""

    result: str
    value: float
    known: float = 1e-10


@dataclass(frozen=True)
class Case:
    """`error` says how it falls with step and spacing; `source` is where the outside values come from.

    `finest` is the smallest accuracy at which it is run: beyond, it takes minutes or needs a longer axis.
    """

    name: str
    text: str
    source: str
    outside: Callable[[], list[Outside]]
    error: Literal["algebraic", "spectral"] = "algebraic"
    harsh: Harsh = ""
    finest: float = 1e-5

    def job(self, accuracy: float) -> str:
        """The job file, for one accuracy."""
        return self.text.replace("ACCURACY", f"{accuracy:g}")

    def fixed(self, points: int, steps: int) -> str:
        """The job file with so many points and steps."""
        until = float(self.text.partition("until: ")[2].partition(",")[0])
        text = self.text.replace("accuracy: ACCURACY", f"step: {until / steps!r}")
        return text.replace("}}  # x", f", points: {points}}}}}")


def job(
    span: tuple[float, float],
    packet: str,
    until: float,
    observables: Sequence[str],
    potential: str | Sequence[str] = (),
    edges: str = "x: wrap",
    mass: float = 1.0,
) -> str:
    """A job file with ACCURACY in it; `potential` is one term or several, without their braces."""
    terms = [potential] if isinstance(potential, str) else potential
    return f"""\
units: natural
particle: {{mass: {mass}}}
grid: {{x: {{from: {span[0]}, to: {span[1]}}}}}  # x
potential: [{", ".join(f"{{{term}}}" for term in terms)}]
packet: {{{packet}}}
{f"edges: {{{edges}}}" if edges else "# edges left out"}
evolve: {{until: {until!r}, accuracy: ACCURACY}}
film: none
classical: none
observables:
{chr(10).join(f"  - {observable}" for observable in observables)}
"""


def gaussian(at: float, sigma: float, k: float = 0.0) -> str:
    """A packet, as it is written."""
    return f"gaussian: {{at: {at}, sigma: {sigma}, wavenumber: {k}}}"


def inside(name: str, low: float, high: float) -> str:
    """A region, as it is written."""
    return f"inside: {{name: {name}, from: {low}, to: {high}}}"
