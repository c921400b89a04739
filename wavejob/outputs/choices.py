"""What a picture shows, decided from the data: ranges, magnifications, the carpet's scale, the close-up."""

from __future__ import annotations

import math
from dataclasses import dataclass

import numpy as np

from .scene import Probability, Scene

Array = np.ndarray

SHORTEST_WAVE = 8.0  # pixels a wavelength below which phase colours are noise: the envelope is drawn
BASELINE_AT_MOST = 0.35  # of the stage's height, so that the packet keeps the larger part
TALLEST_POTENTIAL = 10.0  # times the mean energy above the floor; a higher one runs out of the picture
VISITED = 1e-6  # of the highest density: where the potential decides the energy axis
EMPTY = 1e-3  # of the first norm: below it the mean energy says nothing and the baseline rests
UNSEEN = 0.1  # of the highest density: below it the curve beyond a detector is magnified
MOST_MAGNIFIED = 9  # powers of ten; further down lie rounding and the absorbing layers' echo
CARPET_DECADES = (3, 8)
HAIRLINE = 0.08  # of the view: a structure narrower than this gets a close-up
MOST_CURVES = 3
CLOSE_UP_MARGIN = 1.0  # structure widths to each side


@dataclass(frozen=True)
class Magnified:
    """The density from `low` to `high` is drawn `10**power` times higher, beyond detector `detector`."""

    detector: int
    low: float
    high: float
    power: int


@dataclass(frozen=True)
class CarpetScale:
    """Densities from `low` to `high`; decades where `logarithmic`."""

    logarithmic: bool
    low: float
    high: float

    def shade(self, density: Array) -> Array:
        """Places in a table of 256 colours, uint8."""
        if self.logarithmic:
            floor = math.log10(self.low)
            share = (np.log10(np.maximum(density, self.low)) - floor) / (math.log10(self.high) - floor)
        else:
            share = density / self.high
        return np.asarray((np.clip(share, 0, 1) * 255).round(), dtype=np.uint8)


@dataclass(frozen=True)
class Choices:
    """All that is decided before anything is drawn."""

    view: tuple[float, float]
    baseline: Array  # (F,), the energy on which the packet stands
    energies: tuple[float, float]  # the ends of the energy axis
    highest: float  # density
    magnified: tuple[Magnified, ...]
    carpet: CarpetScale
    close: tuple[float, float] | None
    span: tuple[float, float]  # the ends of the time axis
    curves: tuple[Probability, ...]
    powers: tuple[int, ...]  # each curve is drawn this power of ten larger


def choose(scene: Scene) -> Choices:
    """What to show of a scene."""
    view = view_of(scene)
    baseline = baseline_energies(scene)
    energies = energy_range(scene, view, baseline)
    highest = highest_density(scene, view)
    curves = scene.probabilities[:MOST_CURVES]
    first, last = float(scene.times[0]), float(scene.times[-1])
    return Choices(
        view=view,
        baseline=baseline,
        energies=energies,
        highest=highest,
        magnified=tuple(magnifications(scene, view, highest)),
        carpet=carpet_scale(scene, view, highest),
        close=close_up(scene, view, energies),
        span=(first, last if last > first else first + 1.0),
        curves=curves,
        powers=tuple(curve_power(values) for _, values in curves),
    )


def view_of(scene: Scene) -> tuple[float, float]:
    """The part of x that is shown: `view`, or the whole box."""
    if scene.view is not None:
        return scene.view
    half = float(scene.x[1] - scene.x[0]) / 2
    return float(scene.x[0]) - half, float(scene.x[-1]) + half


def seen(scene: Scene, view: tuple[float, float]) -> Array:
    """Which points of x lie in view, shape (M,), never none."""
    inside = (scene.x >= view[0]) & (scene.x <= view[1])
    return inside if inside.any() else np.ones_like(inside)


def highest_density(scene: Scene, view: tuple[float, float]) -> float:
    """The largest finite density in view at any time; 1 where there is none."""
    highest = float(np.max(scene.density[:, seen(scene, view)]))
    return highest if highest > 0 and math.isfinite(highest) else 1.0


def baseline_energies(scene: Scene) -> Array:
    """Where the packet's baseline stands, shape (F,): the mean energy, at rest where there is none."""
    norm = scene.density.sum(axis=1)
    known = np.isfinite(scene.mean_energy) & (norm > EMPTY * norm[0])
    if not known.any():
        return np.zeros(scene.frames)
    last = np.maximum.accumulate(np.where(known, np.arange(scene.frames), -1))
    last[last < 0] = int(np.argmax(known))
    return scene.mean_energy[last]


def energy_range(scene: Scene, view: tuple[float, float], baseline: Array) -> tuple[float, float]:
    """The energy axis: the potential where the packet comes, the mean energy, room for the packet."""
    v_low, v_high = _visited_potential(scene, view)
    low, high = float(baseline.min()), float(baseline.max())
    floor = min(v_low, low)
    scale = max(high - floor, 0.02 * (v_high - floor))
    if scale <= 0:
        scale = abs(high) or 1.0
    top = max(min(v_high, floor + TALLEST_POTENTIAL * scale), floor + scale / BASELINE_AT_MOST)
    margin = 0.05 * (top - floor)
    return floor - margin, top + margin


def _visited_potential(scene: Scene, view: tuple[float, float]) -> tuple[float, float]:
    """Lowest and highest potential in view where the density is ever above `VISITED` of its highest."""
    ever = scene.density.max(axis=0)
    visited = scene.x[seen(scene, view) & (ever > VISITED * ever.max())]
    if visited.size == 0:
        visited = scene.x
    found: list[Array] = []
    for frame in _some_frames(scene):
        x, v = scene.potential_at(frame)
        finite = np.isfinite(v)
        if finite.any():
            corners = v[finite & (x >= visited[0]) & (x <= visited[-1])]
            found += [corners, np.interp(visited[[0, -1]], x[finite], v[finite])]
    values = np.concatenate(found) if found else np.zeros(1)
    return float(values.min()), float(values.max())


def _some_frames(scene: Scene, most: int = 60) -> list[int]:
    if not scene.potential_moves:
        return [0]
    return sorted({int(f) for f in np.linspace(0, scene.frames - 1, min(most, scene.frames))})


def magnifications(scene: Scene, view: tuple[float, float], highest: float) -> list[Magnified]:
    """Where the curve beyond a detector would not be seen, and the power of ten that shows it.

    Each stretch of x belongs to the nearest detector that counts towards it. The power holds for the whole
    film, so that growth can be read.
    """
    found = []
    for index, (low, high) in enumerate(_beyond(scene, view)):
        beyond = (scene.x > low) & (scene.x < high)
        if not beyond.any():
            continue
        ratio = float(np.max(scene.density[:, beyond])) / highest
        if 0 < ratio < UNSEEN:
            power = math.floor(-math.log10(ratio))
            if power <= MOST_MAGNIFIED:
                found.append(Magnified(index, low, high, power))
    return found


def _beyond(scene: Scene, view: tuple[float, float]) -> list[tuple[float, float]]:
    """Of each detector, the stretch of x beyond it up to the next one or the end of the view."""
    places = sorted(x for _, x, _ in scene.detectors)
    stretches = []
    for _, x, toward in scene.detectors:
        if toward == "+":
            stretches.append((x, min((p for p in places if p > x), default=view[1])))
        else:
            stretches.append((max((p for p in places if p < x), default=view[0]), x))
    return stretches


def carpet_scale(scene: Scene, view: tuple[float, float], highest: float) -> CarpetScale:
    """Logarithmic where something that must be seen stays below a tenth of the highest density."""
    weakest = float(np.max(scene.density[-1, seen(scene, view)])) / highest
    for low, high in _beyond(scene, view):
        beyond = (scene.x > low) & (scene.x < high)
        if beyond.any():
            ratio = float(np.max(scene.density[:, beyond])) / highest
            weakest = min(weakest, ratio) if ratio > 10.0**-MOST_MAGNIFIED else weakest
    if weakest >= UNSEEN:
        return CarpetScale(False, 0.0, highest)
    top = math.ceil(math.log10(highest) - 1e-9)
    decades = math.ceil(-math.log10(max(weakest, 1e-12))) + 2
    return CarpetScale(True, 10.0 ** (top - int(np.clip(decades, *CARPET_DECADES))), highest)


def curve_power(values: Array) -> int:
    """The power of ten by which a running probability is drawn larger, so that a small one is seen."""
    largest = largest_of(values)
    return int(np.clip(math.floor(-math.log10(largest)), 0, 12)) if 0 < largest < UNSEEN else 0


def largest_of(values: Array) -> float:
    """The largest finite size of `values`, 0 where there is none."""
    return float(np.max(np.abs(values[np.isfinite(values)]), initial=0.0))


def close_up(scene: Scene, view: tuple[float, float], energies: tuple[float, float]) -> tuple[float, float] | None:
    """The neighbourhood of a structure that is a hairline in the view; None where there is no such structure.

    It is the narrowest stretch that holds nearly all changes of the potential beyond an even slope.
    A single step, or the wall of a well, is none: there the potential does not come back.
    """
    edges = np.linspace(*view, 1601)
    change = np.max([_changes(*scene.potential_at(f), edges, energies) for f in _some_frames(scene, 12)], axis=0)
    excess = np.maximum(change - 3 * np.median(change), 0)
    if excess.sum() < 0.1 * (energies[1] - energies[0]):
        return None
    first, last = _narrowest(excess, 0.96)
    width = float(edges[last + 1] - edges[first])
    whole = view[1] - view[0]
    if last == first or width > HAIRLINE * whole or not _comes_back(scene, energies, edges[first], edges[last + 1]):
        return None
    middle = float(edges[first] + edges[last + 1]) / 2
    reach = max((0.5 + CLOSE_UP_MARGIN) * width, 8 * float(scene.x[1] - scene.x[0]))
    reach = min(reach, 0.15 * whole)
    middle = float(np.clip(middle, view[0] + reach, view[1] - reach))
    return middle - reach, middle + reach


def _comes_back(scene: Scene, energies: tuple[float, float], low: float, high: float) -> bool:
    """Whether the potential on both sides of a stretch differs less than within it."""
    x, v = scene.potential_at(0)
    cut = np.clip(np.nan_to_num(v, posinf=energies[1], neginf=energies[0]), *energies)
    start, end = np.interp([low, high], x, cut)
    within = np.concatenate([[start], cut[(x >= low) & (x <= high)], [end]])
    return bool(abs(end - start) < 0.6 * float(np.ptp(within)))


def _changes(x: Array, v: Array, edges: Array, energies: tuple[float, float]) -> Array:
    """How far the potential, cut to the energy axis, moves up and down within each cell of `edges`."""
    cut = np.clip(np.nan_to_num(v, posinf=energies[1], neginf=energies[0]), *energies)
    travelled = np.concatenate([[0.0], np.cumsum(np.abs(np.diff(cut)))])
    at = np.searchsorted(x, edges, side="right") - 1
    at = np.clip(at, 0, x.size - 2)
    gap = x[at + 1] - x[at]
    share = np.divide(edges - x[at], gap, out=np.zeros_like(edges), where=gap > 0)
    return np.diff(travelled[at] + np.clip(share, 0, 1) * (travelled[at + 1] - travelled[at]))


def _narrowest(weights: Array, share: float) -> tuple[int, int]:
    """First and last cell of the narrowest stretch that holds `share` of all weight."""
    below = np.concatenate([[0.0], np.cumsum(weights)])
    needed = share * below[-1]
    lasts = np.searchsorted(below, below[:-1] + needed * (1 - 1e-12))
    widths = np.where(lasts < below.size, lasts - np.arange(weights.size), weights.size + 1)
    first = int(np.argmin(widths))
    return first, int(lasts[first]) - 1
