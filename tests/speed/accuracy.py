"""Time to an error of 1e-6 in psi, against the script: `python -m tests.speed.accuracy`.

A Gaussian packet through two smooth barriers, 2048 points. Both get the longest step that reaches an L2 error
of 1e-6 in psi (within 3 %); then both are timed, taking turns.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np

from tests.speed.timing import ratios
from wavejob.evolve import SPLITTINGS, Stepper, plan
from wavejob.grid import Axis, Grid
from wavejob.hamiltonian import Hamiltonian, Part

ERROR, TIME, WANTED = 1e-6, 40.0, 50
AXIS = Axis("x", -120.0, 120.0, 2048)
X = AXIS.x
START = np.exp(-((X + 30) ** 2) / 100 + 1j * X) / np.sqrt(np.sqrt(50 * np.pi))
BARRIERS = sum(0.6 / np.cosh((X - at) / 1.5) ** 2 for at in (-4.0, 4.0))
SLOPES = sum(-0.8 * np.tanh((X - at) / 1.5) / np.cosh((X - at) / 1.5) ** 2 for at in (-4.0, 4.0))

Solver = Callable[[int], np.ndarray]


def wavejob(steps: int) -> Stepper:
    """Planned with order 4."""
    part = Part("position", lambda _: BARRIERS[None, None], lambda _: (SLOPES[None, None],))
    hamiltonian = Hamiltonian(Grid((AXIS,)), (1.0,), (part,))
    return plan(hamiltonian, SPLITTINGS["chin_4a"], TIME / steps, START[None, None])


def wavejob_end(steps: int) -> np.ndarray:
    stepper = wavejob(steps)
    stepper.advance(0, steps)
    return stepper.psi[0, 0]


def script_end(steps: int) -> np.ndarray:
    """psi after `steps` Strang steps, as one writes it by hand."""
    step = TIME / steps
    half, whole = np.exp(-0.5j * step * BARRIERS), np.exp(-1j * step * BARRIERS)
    kinetic = np.exp(-0.5j * step * AXIS.k**2)
    psi = half * START
    for _ in range(steps - 1):
        psi = whole * np.fft.ifft(kinetic * np.fft.fft(psi))
    return half * np.fft.ifft(kinetic * np.fft.fft(psi))


def steps_needed(solve: Solver, exact: np.ndarray) -> tuple[int, float]:
    """The fewest steps (near enough) for ERROR, and the error they leave."""

    def error(steps: int) -> float:
        return float(np.linalg.norm(solve(steps) - exact) * np.sqrt(AXIS.spacing))

    steps, found = 64, np.inf
    while found > ERROR:
        steps = int(1.03 * steps) + 1 if found < 30 * ERROR else 2 * steps
        found = error(steps)
    return steps, found


def main() -> None:
    exact = wavejob_end(20000)
    few, left = steps_needed(wavejob_end, exact)
    many, also = steps_needed(script_end, exact)
    stepper = wavejob(few)
    found = ratios(
        {
            "wavejob": lambda n: [stepper.advance(0, few) for _ in range(n)],
            "script": lambda n: script_end(n * many),
        },
        seconds=0.2,
        turns=7,
    )
    print(f"wavejob: {few} steps of order 4, error {left:.1e}; script: {many} Strang steps, error {also:.1e}")
    print(f"script / wavejob: {found['script']:.0f} (wanted: at least {WANTED}); planning not counted")


if __name__ == "__main__":
    main()
