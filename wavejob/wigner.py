"""Trajectories to start with: places and momenta drawn from the Wigner function of a packet, hbar = 1.

The Wigner function (E. Wigner, Phys. Rev. 40, 749 (1932)) gives the right distributions of place and of
momentum, and F = m a carries it exactly in potentials up to the second power. Of a Gaussian packet it is
positive; where it is negative, its size is drawn from and its sign becomes the sign of the weight.

Points are those of an additive recurrence (M. Roberts, the R2 sequence), which fills the square evenly, moved
as a whole by a random shift in every group: the spread of the groups' means is then an honest error
(R. Cranley and T. N. L. Patterson, SIAM J. Numer. Anal. 13, 904 (1976)).
"""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

Array = np.ndarray

GROUPS = 16  # their spread gives the error to about a sixth of itself
PLASTIC = 1.32471795724474602596  # the real root of x^3 = x + 1
TAIL = 1e-10  # of the probability, left out on every side
FINEST = 8.0  # places per smallest feature of the Wigner function, which a field of given extent can have
MOST = 1000  # places along x and along p
MOST_NEGATIVE = 4.0  # total of its size: every figure has so many times the error of a positive function


class WignerError(ValueError):
    """Why no trajectories can be drawn."""


@dataclass(frozen=True)
class Start:
    """Places, momenta and weights, each shape (GROUPS, n); the weights of each group add up to about 1."""

    x: Array
    p: Array
    weight: Array


def gaussian(at: float, sigma: float, k: float, number: int, seed: int) -> Start:
    """`number` trajectories for a Gaussian packet, in mirrored pairs: their mean motion has no error."""
    from scipy.special import ndtri

    first, second = points(number // (2 * GROUPS), seed)
    x, p = ndtri(first) * sigma, ndtri(second) / (2 * sigma)
    x, p = np.concatenate([x, -x], axis=1), np.concatenate([p, -p], axis=1)
    return Start(at + x, k + p, np.full(x.shape, 1 / x.shape[1]))


def sampled(x: Array, psi: Array, number: int, seed: int) -> Start:
    """`number` trajectories for a field at evenly spaced places. WignerError where that is too hard."""
    places, momenta, wigner = function(x, psi)
    cell = (places[1] - places[0]) * (momenta[1] - momenta[0])
    total = float(np.abs(wigner).sum()) * cell
    if total > MOST_NEGATIVE:
        raise WignerError(f"the Wigner function is negative too often: its size adds up to {total:.3g}")
    first, second = points(number // GROUPS, seed)
    row, inside = _inverted(np.abs(wigner).sum(axis=1), first)
    column, within = _inverted(np.abs(wigner)[row.ravel()], second.ravel())
    column, within = column.reshape(first.shape), within.reshape(first.shape)
    weight = np.sign(wigner[row, column]) * total / first.shape[1]
    return Start(
        places[row] + (inside - 0.5) * (places[1] - places[0]),
        momenta[column] + (within - 0.5) * (momenta[1] - momenta[0]),
        weight,
    )


def points(number: int, seed: int) -> tuple[Array, Array]:
    """Points of the unit square, two arrays (GROUPS, number), evenly spread in each group."""
    shifts = np.random.default_rng(seed).random((2, GROUPS, 1))
    steps = np.arange(1, number + 1)
    first, second = ((steps / PLASTIC**power + shift) % 1.0 for power, shift in zip((1, 2), shifts, strict=True))
    tiny = 0.5 / number / GROUPS  # keeps away from the infinite ends of a normal distribution
    return np.clip(first, tiny, 1 - tiny), np.clip(second, tiny, 1 - tiny)


def function(x: Array, psi: Array) -> tuple[Array, Array, Array]:
    """Places (n,), momenta (m,) and the Wigner function (n, m) of a field at evenly spaced places."""
    from scipy.interpolate import make_interp_spline

    spacing = float(x[1] - x[0])
    low, high = _support(np.abs(psi) ** 2)
    k = 2 * np.pi * np.fft.fftfreq(x.size, spacing)
    spectrum = np.abs(np.fft.fft(psi)) ** 2
    order = np.argsort(k)
    slowest, fastest = (float(k[order][index]) for index in _support(spectrum[order]))
    middle, reach = (fastest + slowest) / 2, max((fastest - slowest) / 2, math.pi / (x[-1] - x[0]))
    extent = max(float(x[high] - x[low]), 4 * spacing)
    number = math.ceil(FINEST * 2 * reach * extent / (2 * math.pi)) | 1
    if number > MOST:
        raise WignerError(f"the Wigner function would need {number} x {number} places, more than {MOST} x {MOST}")
    number = max(number, 65)
    places = np.linspace(x[low], x[high], number)
    step = float(places[1] - places[0])
    momenta = middle + np.linspace(-reach, reach, number)
    slow = psi * np.exp(-1j * middle * x)
    field = np.zeros(3 * number, complex)
    field[number : 2 * number] = make_interp_spline(x, slow, k=5)(places)
    here, apart = np.arange(number) + number, np.arange(1, number // 2 + 1)
    pairs = field[here[:, None] + apart].conj() * field[here[:, None] - apart]
    turns = 2 * step * np.outer(apart, momenta - middle)
    wigner = np.abs(field[here, None]) ** 2 + 2 * (pairs.real @ np.cos(turns) - pairs.imag @ np.sin(turns))
    wigner *= step / math.pi
    return places, momenta, wigner / (wigner.sum() * step * (momenta[1] - momenta[0]))


def _support(weight: Array) -> tuple[int, int]:
    """First and last index of what is left without TAIL on either side."""
    running = np.cumsum(weight) / weight.sum()
    return int(np.searchsorted(running, TAIL)), min(int(np.searchsorted(running, 1 - TAIL)), weight.size - 1)


def _inverted(weight: Array, share: Array) -> tuple[Array, Array]:
    """Cell and place in it (0 to 1) at which the running sum of `weight` reaches `share` of its total.

    `weight` is one row for all of `share`, or a row for each.
    """
    running = np.cumsum(np.atleast_2d(weight), axis=1)
    wanted = share.reshape(-1, 1) * running[:, -1:]
    cell = np.minimum((running < wanted).sum(axis=1), running.shape[1] - 1)
    rows = np.arange(cell.size) if len(running) > 1 else np.zeros(cell.size, int)
    here = running[rows, cell]
    before = np.where(cell > 0, running[rows, np.maximum(cell - 1, 0)], 0.0)
    inside = (wanted[:, 0] - before) / np.where(here > before, here - before, 1.0)
    return cell.reshape(share.shape), inside.reshape(share.shape)
