"""How much a step costs, in bare pairs of transforms: `python -m tests.speed.steps`.

The pair is an in-place FFTW transform forward and back, planned with FFTW_MEASURE, and nothing else. The
script is what one writes by hand with numpy: psi = ifft(K * fft(V * psi)).
"""

from __future__ import annotations

import numpy as np

from tests.speed.timing import ratios
from wavejob.evolve import SPLITTINGS, plan
from wavejob.grid import Axis, Grid
from wavejob.hamiltonian import Hamiltonian, Part

import pyfftw  # isort: skip  (after wavejob, which first tells OpenMP not to spin)

WANTED = {1024: (1.5, 4.0), 2048: (1.35, 4.0), 4096: (1.2, 2.5), 16384: (1.2, 2.5), 65536: (1.2, 2.5)}


def compare(points: int) -> dict[str, float]:
    """Time of a bare pair, a step and a step of the numpy script, over the bare pair."""
    axis = Axis("x", -100.0, 100.0, points)
    x, step = axis.x, 0.001
    barrier = 2.0 / np.cosh(x) ** 2
    packet = np.exp(-((x + 30) ** 2) / 36 + 1.5j * x)

    bare = pyfftw.empty_aligned(points, dtype=complex)
    forward = pyfftw.FFTW(bare, bare, direction="FFTW_FORWARD").execute
    backward = pyfftw.FFTW(bare, bare, direction="FFTW_BACKWARD").execute
    bare[:] = 0

    def pairs(count: int) -> None:
        for _ in range(count):
            forward()
            backward()

    part = Part("position", lambda _: barrier[None, None])
    hamiltonian = Hamiltonian(Grid((axis,)), (1.0,), (part,))
    stepper = plan(hamiltonian, SPLITTINGS["strang"], step, packet[None, None])

    kinetic, potential = np.exp(-0.5j * step * axis.k**2), np.exp(-1j * step * barrier)
    fft, ifft = np.fft.fft, np.fft.ifft

    def script(count: int) -> None:
        psi = packet
        for _ in range(count):
            psi = ifft(kinetic * fft(potential * psi))

    return ratios({"pair": pairs, "step": lambda count: stepper.advance(0, count), "script": script})


def main() -> None:
    print("| points | step / pair | wanted | script / step | wanted |")
    print("| ---: | ---: | ---: | ---: | ---: |")
    for points, (most, least) in WANTED.items():
        found = compare(points)
        gain = found["script"] / found["step"]
        print(f"| {points} | {found['step']:.2f} | {most} | {gain:.1f} | {least} |")


if __name__ == "__main__":
    main()
