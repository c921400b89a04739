"""A job text taken the whole way: read, checked, planned, carried out."""

from __future__ import annotations

from pathlib import Path

import numpy as np
from scipy.optimize import minimize_scalar

from wavejob.loading import parse
from wavejob.plan import make_plan
from wavejob.simulate import Record, simulate

Array = np.ndarray


def run(text: str, folder: Path | None = None) -> Record:
    """The record of the job in `text`, without film; paths in it are relative to `folder`."""
    return simulate(make_plan(parse(text + "\nfilm: none\n", folder=folder)))


def value(record: Record, name: str) -> float:
    """A result in the units of the job file."""
    result = record.result(name)
    return record.plan.job.units.to_file(result.value, result.dimension)


def column(record: Record, name: str) -> Array:
    """A column of the time series in the units of the job file."""
    dimension = next(c.dimension for c in record.columns if c.name == name)
    return record.plan.job.units.to_file(record.column(name), dimension)


def autocorrelation(record: Record) -> tuple[Array, Array]:
    """Times (scaled units) and <psi(0), psi(t)>."""
    rows = next(curve.rows for curve in record.curves if curve.name == "autocorrelation")
    return rows[:, 0], rows[:, 1] + 1j * rows[:, 2]


def level(record: Record, near: float) -> float:
    """The energy (scaled units) of the line of the autocorrelation nearest to `near`.

    The maximum of Re of the integral of C(t) cos^2(pi t / 2T) exp(i E t) over the whole run (a Hann window, as
    C(-t) is the conjugate of C(t)). Another line at a distance d displaces it by about (2 pi / T)^3 / d^2.
    """
    t, c = autocorrelation(record)
    weighted = c * np.cos(np.pi * t / (2 * t[-1])) ** 2

    def spectrum(energy: float) -> float:
        return float(np.trapezoid(weighted * np.exp(1j * energy * t), t).real)

    half = np.pi / t[-1]
    found = minimize_scalar(
        lambda energy: -spectrum(energy), bounds=(near - half, near + half), method="bounded", options={"xatol": 1e-10}
    )
    return float(found.x)


def resolution(record: Record) -> float:
    """2 pi hbar over the length of the run: what two lines must be apart to be told from each other."""
    return float(2 * np.pi / (record.times[-1] - record.times[0]))
