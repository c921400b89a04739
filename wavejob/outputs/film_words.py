"""What a film says in words: the caption, the names above the stage, the key and the running values."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from .choices import CarpetScale, Magnified
from .key import Hatch, Item, Ramp, Stroke, Words
from .names import Name, PlacedName
from .palette import CURVES, DETECTOR, ENERGY, LAYER, PATH, POTENTIAL, REGION, VERDICT_MARKS, density_table
from .scene import Scene
from .sheet import Panel, Sheet
from .wording import Numbers, numbers_for, per, power_of_ten, scientific, with_unit

Array = np.ndarray

ARROWS = {"+": "\u2192", "-": "\u2190"}
MINUS = "\u2212"
MOST_CURVES = 3


def time_numbers(times: Array) -> Numbers:
    """Decimals that tell neighbouring times apart."""
    if times.size < 2:
        return numbers_for(float(np.abs(times).max()), 0.0)
    step = float(np.diff(times).min())
    numbers = numbers_for(float(np.abs(times).max()), step)
    if numbers.decimals is None or np.allclose(times, np.round(times, numbers.decimals), rtol=0, atol=1e-6 * step):
        return numbers
    return numbers_for(float(np.abs(times).max()), step / 10)


def run_line(scene: Scene) -> str:
    """`run 3f9a0c12d4 · ✓ trusted`"""
    mark = VERDICT_MARKS.get(scene.verdict, "")
    verdict = f" \u00b7 {mark} {scene.verdict}" if scene.verdict else ""
    return f"run {scene.fingerprint}{verdict}"


def detector_names(scene: Scene, panel: Panel, magnified: Sequence[Magnified]) -> list[Name]:
    """Names of the detectors in view with the magnification of the curve beyond, magnified ones first."""
    powers = {m.detector: m.power for m in magnified}
    names = []
    for index, (name, x, toward) in enumerate(scene.detectors):
        if panel.shows(x):
            beyond = f" {ARROWS[toward]} curve \u00d7{power_of_ten(powers[index])}" if index in powers else ""
            names.append((index not in powers, Name(f"{name}{beyond}", panel.across(x), DETECTOR)))
    return [name for _, name in sorted(names, key=lambda pair: pair[0])]


def place_names(scene: Scene, panel: Panel, not_within: tuple[float, float] | None) -> list[Name]:
    """Names of walls and regions in view, save those that are named above the close-up."""
    names = [Name("wall", panel.across(x), POTENTIAL) for x in scene.walls if panel.shows(x)]
    for name, low, high in scene.regions:
        elsewhere = not_within is not None and not_within[0] <= low and high <= not_within[1]
        low, high = max(low, panel.x_low), min(high, panel.x_high)
        if low < high and not elsewhere:
            names.append(Name(name, panel.across((low + high) / 2), REGION, beside=False))
    return names


def write_names(sheet: Sheet, placed: Sequence[PlacedName], stage_top: int, font: float, line: float) -> None:
    for p in placed:
        y = stage_top - 4 - (p.row + 0.28) * line
        sheet.text(p.left, y, p.name.words, font, colour=p.name.colour)
        if p.name.beside:
            sheet.line([p.name.x, p.name.x], [y - 0.8 * font, stage_top], p.name.colour, 1)


def key_items(
    scene: Scene, scale: CarpetScale, energies: Numbers, baseline: Array, *, phases: Array | None, where: str,
    homeless: Sequence[Name],
) -> list[Item]:  # fmt: skip
    """The key, most needed first; the item with the mean energy changes from frame to frame."""
    items: list[Item] = []
    if phases is not None:
        items.append((Words(f"phase{where} {MINUS}180\u00b0"), Ramp(phases), Words("180\u00b0")))
    low = scientific_floor(scale)
    ends = numbers_for(scale.high, scale.high / 100)(scale.high)
    unit = with_unit(ends, per(scene.length_label))
    kind = "logarithmic" if scale.logarithmic else "linear"
    items.append((Words(f"density {low}"), Ramp(density_table()), Words(f"{unit}, {kind}")))
    items += [(Words(name.words),) for name in homeless if name.colour == DETECTOR]
    if scene.classical_path is not None:
        items.append((Stroke(PATH), Words("F = m a from the same mean start")))
    items.append((Stroke(ENERGY, (0, (4, 2))), mean_energy_words(scene, energies, baseline)))
    if scene.layers:
        items.append((Hatch(LAYER, "//////"), Words("absorbing layer")))
    if phases is None and scene.phase is not None:
        items.append((Words("envelope: waves too short for phase colours"),))
    return items


def mean_energy_words(scene: Scene, energies: Numbers, baseline: Array) -> Words:
    said = [mean_energy_text(scene, energies, float(e)) for e in baseline]
    return Words(said[0], widest=max(said, key=len))


def mean_energy_text(scene: Scene, energies: Numbers, energy: float) -> str:
    return f"mean energy {with_unit(energies(energy), scene.energy_label)}"


def scientific_floor(scale: CarpetScale) -> str:
    """The lower end of the carpet's scale."""
    return scientific(scale.low, 1).removeprefix("1\u00d7") if scale.logarithmic else "0"


def curve_powers(scene: Scene) -> list[int]:
    """Powers of ten by which the running probabilities are drawn larger, so that small ones are seen."""
    powers = []
    for _, values in scene.probabilities[:MOST_CURVES]:
        largest = float(np.nanmax(np.abs(values), initial=0.0))
        powers.append(int(np.clip(np.floor(-np.log10(largest)), 0, 12)) if 0 < largest < 0.1 else 0)
    return powers


def readout_items(scene: Scene, numbers: Sequence[Numbers], powers: Sequence[int]) -> list[Item]:
    """One line for each running probability: its mark, its name and its value now."""
    items: list[Item] = []
    curves = zip(scene.probabilities[:MOST_CURVES], numbers, powers, CURVES, strict=False)
    for (label, values), number, power, (colour, dash, marker) in curves:
        said = [readout(label, number, power, float(v)) for v in values]
        items.append((Stroke(colour, dash, marker), Words(said[0], widest=max(said, key=len))))
    return items


def readout(label: str, number: Numbers, power: int, value: float) -> str:
    drawn = f" (curve \u00d7{power_of_ten(power)})" if power else ""
    return f"{label} {number(value)}{drawn}"

