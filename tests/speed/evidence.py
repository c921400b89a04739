"""Cost of error bars, and of a transmitted probability from nothing but physics and an accuracy.

`python -m tests.speed.evidence`. The barrier is that of Landau and Lifshitz, Quantum Mechanics, section 25, problem 2
(from memory), met by a Gaussian packet; the exact answer is the formula averaged over the packet's momenta.
"""

from __future__ import annotations

import time

import numpy as np

from wavejob.evidence.assess import assess
from wavejob.loading import parse
from wavejob.plan import make_plan
from wavejob.simulate import simulate

WANTED_BARS, WANTED_SCRIPT = 1.6, 5.0
JOB = """
units: natural
grid: {x: {from: -150, to: 150}}
potential: [{barrier: {from: 0, to: 2, height: 1}}]
packet: {gaussian: {at: -60, sigma: 8, wavenumber: 1.2}}
evolve: {until: 100, accuracy: 1e-4}
observables:
  - inside: {name: beyond, from: 2, to: 150}
expect: [{result: beyond.final, above: 0}]
film: none
"""
SMOOTH = JOB.replace("barrier: {from: 0, to: 2, height: 1}", "sech2: {at: 0, width: 1, height: 1}")
ABSORBING = (
    JOB.replace("film: none", "edges: {x: {absorb: 40}}\nfilm: none")
    .replace("inside", "crossing")
    .replace("from: 2, to: 150", "x: 20, toward: +x")
    .replace("beyond.final", "beyond.total")
)


def exact() -> float:
    """The transmitted probability of the packet in JOB."""
    k = np.linspace(1e-3, 2.4, 200_001)
    weight = np.sqrt(2 * 64 / np.pi) * np.exp(-2 * 64 * (k - 1.2) ** 2)
    energy = k**2 / 2
    inside = np.sqrt(2 * (energy - 1) + 0j) * 2
    t = 1 / (1 + np.abs(np.sin(inside)) ** 2 / (4 * energy * np.abs(energy - 1)))
    return float(np.trapezoid(weight * t, k))


def script(points: int, steps: int, done: int | None = None) -> tuple[float, float]:
    """Transmitted probability and seconds a step of the Strang script as one writes it by hand.

    `done` steps of `steps` are made. The points put both edges half-way between two, where its error is smallest.
    """
    low, length, duration = -150.0, 300.0, 100.0
    x = low + (np.arange(points) + 0.5) * length / points
    k = 2 * np.pi * np.fft.fftfreq(points, length / points)
    psi = np.exp(-(((x + 60) / 16) ** 2) + 1.2j * x) / (2 * np.pi * 64) ** 0.25
    potential = np.where((x > 0) & (x < 2), 1.0, 0.0)
    step, done = duration / steps, done or steps
    half, whole, kinetic = np.exp(-0.5j * step * potential), np.exp(-1j * step * potential), np.exp(-0.5j * step * k**2)
    begun = time.perf_counter()
    psi = half * psi
    for _ in range(done - 1):
        psi = whole * np.fft.ifft(kinetic * np.fft.fft(psi))
    psi = half * np.fft.ifft(kinetic * np.fft.fft(psi))
    seconds = time.perf_counter() - begun
    return float(np.sum(np.abs(psi[x > 2]) ** 2) * length / points), seconds / done


def longest_steps(points: int) -> int:
    """Steps of a kinetic phase of pi: with a sharp edge longer ones leave errors that do not shrink."""
    return int(np.ceil(100 * (np.pi * points / 300) ** 2 / (2 * np.pi)))


def tuned_script(error: float) -> tuple[int, int, float, float]:
    """Points and steps at which the script errs by `error`, the power law that says so, and its seconds.

    Its error falls with a power of the spacing, measured on two grids; the run itself would take minutes, so a few
    hundred of its steps are timed.
    """
    coarse, fine = (abs(script(points, longest_steps(points))[0] - exact()) for points in (900, 1800))
    power = float(np.log2(coarse / fine))
    points = 150 * int(np.ceil(1800 * (fine / error) ** (1 / power) / 150))
    steps = longest_steps(points)
    return points, steps, power, steps * script(points, steps, 300)[1]


def timed(run: object, times: int = 3) -> float:
    """Median of the seconds that `run` takes."""
    found = []
    for _ in range(times):
        begun = time.perf_counter()
        run()  # type: ignore[operator]
        found.append(time.perf_counter() - begun)
    return float(np.median(found))


def main() -> None:
    print("run with error bars over run without (wanted: at most 1.6)")
    for name, text in (("sharp edges", JOB), ("smooth", SMOOTH), ("absorbing edges", ABSORBING)):
        plan = make_plan(parse(text))
        without, bars = timed(lambda plan=plan: simulate(plan)), timed(lambda plan=plan: assess(plan))
        notes = len(assess(plan).notes)
        print(f"  {name:16} {bars / without:5.2f}   ({without:.2f} s without, {notes} notes)")

    begun = time.perf_counter()
    record = assess(make_plan(parse(JOB))).record
    seconds = time.perf_counter() - begun
    result = record.result("beyond.final")
    error = abs((result.value or 0.0) - exact())
    points, steps, power, by_hand = tuned_script(error)
    print("transmitted probability from physics and `accuracy: 1e-4` (wanted: at most a fifth of the script's time)")
    print(f"  wavejob  {seconds:8.2f} s   error {error:.1e}, bar {result.error:.1e}, {record.plan.axis.points} points")
    print(
        f"  script   {by_hand:8.2f} s   for that error: {points} points, {steps} steps (order {power:.2f} in spacing)"
    )
    print(f"  script / wavejob {by_hand / seconds:.1f}")


if __name__ == "__main__":
    main()
