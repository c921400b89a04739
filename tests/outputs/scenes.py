"""Small runs to draw, by a plain split-operator script: M. D. Feit et al., J. Comput. Phys. 47 (1982) 412."""

from __future__ import annotations

import itertools
from functools import cache

import numpy as np

from wavejob.outputs.scene import Scene

TITLE = "Two-barrier stack, nominal, second barrier of 3 nm, 300 meV and a level at 70 meV"[:80]
HBAR = 658.2119569  # meV fs
ELECTRON = 5685.630  # meV fs^2 / nm^2


def propagate(x, v, psi, mass, hbar, times, substeps, absorb=None):
    """psi at `times`, shape (frames, points), in a potential v(x, t)."""
    k = 2 * np.pi * np.fft.fftfreq(x.size, x[1] - x[0])
    frames = [psi]
    for start, stop in itertools.pairwise(times):
        step = (stop - start) / substeps
        kinetic = np.exp(-1j * hbar * k**2 * step / (2 * mass))
        for n in range(substeps):
            half = np.exp(-0.5j * v(x, start + (n + 0.5) * step) * step / hbar)
            if absorb is not None:
                half = half * np.exp(-0.5 * absorb * step / hbar)
            psi = half * np.fft.ifft(kinetic * np.fft.fft(half * psi))
        frames.append(psi)
    return np.array(frames)


def gaussian(x, at, sigma, k):
    return (2 * np.pi * sigma**2) ** -0.25 * np.exp(-((x - at) ** 2) / (4 * sigma**2) + 1j * k * x)


def double_barrier(frames=120, title=TITLE, until=1480.0):
    """Electron of 0.067 m_e, 300 meV barriers of 3 nm around 6 nm, packet of 20 nm at 70.4 meV."""
    mass = 0.067 * ELECTRON
    x = -400 + (np.arange(1024) + 0.5) * 800 / 1024
    v = np.where((np.abs(x) > 3) & (np.abs(x) < 6), 300.0, 0.0)
    depth = np.clip(np.abs(x) - 340, 0, None) / 60
    psi = gaussian(x, -150, 20, np.sqrt(2 * mass * 70.4) / HBAR)
    times = np.linspace(0, until, frames)
    field = propagate(x, lambda _x, _t: v, psi, mass, HBAR, times, max(1, round(5 * until / frames)), 60 * depth**3)
    density = np.abs(field) ** 2
    dx = x[1] - x[0]
    speed = np.sqrt(2 * 70.4 / mass)
    path = -150 + speed * times
    path = np.where(path > -6, -12 - path, path)
    path[path < -400] = np.nan
    inside = [(density[:, c].sum(axis=1) * dx) for c in (x < -6, np.abs(x) < 3, x > 60)]
    passed = np.maximum.accumulate(inside[2])
    edges = np.repeat([-6.0, -3.0, 3.0, 6.0], 2)
    order = np.fft.fftshift(np.arange(x.size))
    wavenumber = 2 * np.pi * np.fft.fftfreq(x.size, dx)[order]
    spectra = [np.abs(np.fft.fft(field[n])[order]) ** 2 * dx**2 / (2 * np.pi) for n in (0, -1)]
    return Scene(
        title=title,
        subtitle="electron, 0.067 m\u2091 \u00b7 800 nm \u00b7 1024 points \u00b7 step 0.2 fs",
        fingerprint="3f9a0c12d4",
        verdict="trusted",
        length_label="nm",
        time_label="fs",
        energy_label="meV",
        x=x,
        times=times,
        density=density.astype(np.float32),
        phase=np.angle(field).astype(np.float32),
        wavelength=18.3,
        potential_x=np.concatenate([[-400.0], edges, [400.0]]),
        potential=np.array([0, 0, 300, 300, 0, 0, 300, 300, 0, 0.0]),
        mean_energy=np.full(frames, 70.4),
        layers=((-400, -340), (340, 400)),
        detectors=(("transmitted", 60.0, "+"), ("reflected", -250.0, "-")),
        regions=(("well", -3.0, 3.0),),
        probabilities=(("transmitted", passed), ("in the well", inside[1]), ("before the stack", inside[0])),
        classical_path=path,
        wavenumber=wavenumber,
        momentum_start=spectra[0],
        momentum_end=spectra[1],
        results=(
            ("transmitted.total", "0.1589 \u00b1 0.0003"),
            ("well.peak", "0.2081 \u00b1 0.0001"),
            ("norm.drift", "3.1\u00d710\u207b\u00b9\u00b3"),
            ("energy.mean", "70.40 \u00b1 0.01 meV"),
        ),
    )


def morse(frames=90):
    """The ground state of H2's Morse well in atomic units, moved by 0.3 bohr; walls at both ends."""
    mass, depth, rate, at = 918.08, 0.1744, 1.028, 1.40
    x = 0.2 + (np.arange(512) + 0.5) * 6 / 512
    v = depth * (1 - np.exp(-rate * (x - at))) ** 2
    width = np.sqrt(1 / (2 * np.sqrt(2 * mass * depth) * rate))
    times = np.linspace(0, 900, frames)
    field = propagate(x, lambda _x, _t: np.minimum(v, 2.0), gaussian(x, 1.7, width, 0), mass, 1.0, times, 10)
    density = np.abs(field) ** 2
    dx = x[1] - x[0]
    fine = np.linspace(0.2, 6.2, 1200)
    return Scene(
        title="Vibration of H$_2$ in a Morse well",
        subtitle="mass 918.08 \u00b7 512 points",
        fingerprint="aa00bb11cc",
        length_label="bohr",
        time_label="hbar/hartree",
        energy_label="hartree",
        x=x,
        times=times,
        density=density,
        phase=np.angle(field),
        wavelength=0.5,
        potential_x=fine,
        potential=depth * (1 - np.exp(-rate * (fine - at))) ** 2,
        mean_energy=np.full(frames, 0.031),
        walls=(0.2, 6.2),
        verdict="doubtful",
        probabilities=(("bond longer than 1.4 bohr", density[:, x > 1.4].sum(axis=1) * dx),),
        classical_path=1.4 + 0.3 * np.cos(0.0198 * times),
        failed_checks=("grid: 0.3 % beyond k_max; use 1024 points",),
    )


def neutron(frames=100):
    """A neutron dropped from 20 um above a mirror (peV, ms, um)."""
    hbar, mass, slope = 0.6582119569, 0.010454, 0.10253  # peV ms; peV ms^2/um^2; peV/um
    x = -6 + (np.arange(384) + 0.5) * 60 / 384
    v = np.where(x < 0, 30.0, slope * x)
    field = propagate(x, lambda _x, _t: v, gaussian(x, 22, 3, 0), mass, hbar, np.linspace(0, 8, frames), 100)
    times = np.linspace(0, 8, frames)
    g = slope / mass
    fall = np.sqrt(2 * 22 / g)
    phase = (times + fall) % (2 * fall) - fall
    return Scene(
        title="Neutron above a mirror",
        subtitle="neutron \u00b7 60 um \u00b7 384 points",
        fingerprint="0123456789",
        length_label="um",
        time_label="ms",
        energy_label="peV",
        x=x,
        times=times,
        density=np.abs(field) ** 2,
        phase=np.angle(field),
        wavelength=1.9,
        potential_x=np.array([-6.0, 0, 0, 54]),
        potential=np.array([30.0, 30, 0, 54 * slope]),
        mean_energy=np.full(frames, 2.3),
        walls=(0.0,),
        view=(-2.0, 40.0),
        classical_path=22 - 0.5 * g * phase**2,
        verdict="trusted",
        probabilities=(("below 10 um", (np.abs(field[:, x < 10]) ** 2).sum(axis=1) * (x[1] - x[0])),),
    )


def free_packet(frames=60):
    """A free packet in natural units, without anything else."""
    x = -40 + (np.arange(1024) + 0.5) * 80 / 1024
    times = np.linspace(0, 10, frames)
    field = propagate(x, lambda _x, _t: 0 * x, gaussian(x, -15, 2, 3), 1.0, 1.0, times, 1)
    return Scene(
        title="Free packet",
        subtitle="mass 1 \u00b7 1024 points",
        fingerprint="ffffffffff",
        length_label="",
        time_label="",
        energy_label="",
        x=x,
        times=times,
        density=np.abs(field) ** 2,
        phase=np.angle(field),
        wavelength=2.0,
        potential_x=x[[0, -1]],
        potential=np.zeros(2),
        mean_energy=np.full(frames, 4.53),
    )


def driven(frames=60):
    """A barrier whose height swings and whose place moves, many detectors, tiny transmission."""
    x = -60 + (np.arange(1024) + 0.5) * 120 / 1024
    times = np.linspace(0, 20, frames)

    def v(x, t):
        return (5 + 2 * np.sin(t)) * (np.abs(x - 0.3 * t) < 2)

    field = propagate(x, v, gaussian(x, -20, 3, 2), 1.0, 1.0, times, 40)
    edges = np.array([[-60, -2, -2, 2, 2, 60]] * frames) + np.array([0, 1, 1, 1, 1, 0]) * 0.3 * times[:, None]
    heights = np.array([[0, 0, 1, 1, 0, 0]] * frames) * (5 + 2 * np.sin(times))[:, None]
    density = np.abs(field) ** 2
    dx = x[1] - x[0]
    return Scene(
        title="\u91cf\u5b50 packet at a swinging barrier, \u03a9 = 1, $V_0 = 5$ and no formula\x07 read here",
        subtitle="mass 1",
        fingerprint="1234abcd00",
        length_label="",
        time_label="",
        energy_label="",
        x=x,
        times=times,
        density=density,
        phase=np.angle(field),
        wavelength=3.0,
        potential_x=edges,
        potential=heights,
        mean_energy=2.0 + 0.6 * np.sin(times / 3),
        verdict="failed",
        layers=((50, 60),),
        detectors=(
            ("first behind the barrier", 12.0, "+"),
            ("second", 14.0, "+"),
            ("third of them", 16.5, "+"),
            ("back", -40.0, "-"),
        ),
        regions=(("under the barrier", -2, 8), ("before", -60, -2), ("after", 8, 60)),
        probabilities=(
            ("behind the barrier", density[:, x > 12].sum(axis=1) * dx),
            ("a fourth of what is before", density[:, x < 0].sum(axis=1) * dx / 4),
            ("under the barrier, tiny", density[:, x > 30].sum(axis=1) * dx * 1e-4),
            ("never drawn", density[:, 0]),
        ),
    )


MAKERS = {
    "double barrier": double_barrier,
    "morse": morse,
    "neutron": neutron,
    "free": free_packet,
    "driven": driven,
}


@cache
def scene(name):
    """One of the scenes, made once."""
    return MAKERS[name]()
