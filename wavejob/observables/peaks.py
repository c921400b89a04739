"""Peaks of a curve that can be evaluated anywhere: top and full width at half of it."""

from __future__ import annotations

from collections.abc import Callable
from dataclasses import dataclass

import numpy as np

Array = np.ndarray
Curve = Callable[[Array], Array]  # energies (n,) -> values (n,), nan where there is none

STANDING_OUT = 0.1  # of its height, by which a peak must rise above the valleys beside it
ZOOMS, PLACES = 3, 9  # each look closer at a stretch takes 9 places and leaves a quarter or an eighth of it
FLATTEST = 1e-9  # of the height: a summit that bends by less is not seen above rounding


@dataclass(frozen=True)
class Peak:
    """`sides` are the places at half the height; None where the curve does not fall to it on both sides."""

    energy: float
    height: float
    sides: tuple[float, float] | None

    @property
    def width(self) -> float | None:
        return None if self.sides is None else self.sides[1] - self.sides[0]


def find_peaks(curve: Curve, energies: Array, count: int) -> list[Peak]:
    """The `count` lowest peaks of the curve; `energies` must be close enough to see them."""
    values = curve(energies)
    stretch = _longest(np.isfinite(values))
    energies, values = energies[stretch], values[stretch]
    if len(values) < 3:
        return []
    tops = np.flatnonzero((values[1:-1] > values[:-2]) & (values[1:-1] >= values[2:])) + 1
    tops = tops[[_prominence(values, int(top)) >= STANDING_OUT * values[top] for top in tops]]
    return [peak_near(curve, energies, values, int(top)) for top in tops[:count]]


def peak_near(curve: Curve, energies: Array, values: Array, top: int) -> Peak:
    """The peak whose highest sample is `values[top]`."""
    energy, height = _summit(curve, energies[max(top - 1, 0)], energies[min(top + 1, len(energies) - 1)])
    half = height / 2
    below, above = np.flatnonzero(values[:top] < half), np.flatnonzero(values[top + 1 :] < half)
    if not below.size or not above.size:
        return Peak(energy, height, None)
    left = _crossing(curve, half, energies[below[-1]], energies[below[-1] + 1])
    right = _crossing(curve, half, energies[top + 1 + above[0]], energies[top + above[0]])
    return Peak(energy, height, (left, right))


def _prominence(values: Array, top: int) -> float:
    """How far one must go down from a local maximum before it goes up higher than it."""
    valleys = []
    for side in (values[top::-1], values[top:]):
        higher = np.flatnonzero(side > values[top])
        valleys.append(side[: higher[0]].min() if higher.size else side.min())
    return float(values[top] - max(valleys))


def _longest(valid: Array) -> slice:
    """The longest run of True."""
    changes = np.flatnonzero(np.diff(np.concatenate([[0], valid.astype(int), [0]])))
    starts, stops = changes[::2], changes[1::2]
    if not starts.size:
        return slice(0, 0)
    best = int(np.argmax(stops - starts))
    return slice(int(starts[best]), int(stops[best]))


def _summit(curve: Curve, low: float, high: float) -> tuple[float, float]:
    """Place and value of the maximum between two places."""
    found = low, -np.inf
    for _ in range(ZOOMS):
        places = np.linspace(low, high, PLACES)
        values = curve(places)
        top = int(np.clip(np.nanargmax(values), 1, PLACES - 2))
        before, here, after = values[top - 1 : top + 2]
        bend = before - 2 * here + after
        if bend >= -FLATTEST * abs(here):
            break  # the values cannot tell any more
        shift = (before - after) / (2 * bend)
        found = (
            float(places[top] + shift * (places[1] - places[0])),
            float(here - (before - after) * shift / 4),
        )
        low, high = places[top - 1], places[top + 1]
    return found if np.isfinite(found[1]) else (float(places[top]), float(here))


def _crossing(curve: Curve, level: float, under: float, over: float) -> float:
    """Where the curve passes `level` between a place under it and one over it."""
    for _ in range(ZOOMS):
        places = np.linspace(under, over, PLACES)
        first = int(np.argmax(curve(places) >= level))
        under, over = places[max(first - 1, 0)], places[max(first, 1)]
    low, high = curve(np.array([under, over]))
    return float(under + (over - under) * (level - low) / (high - low)) if high != low else float(under)
