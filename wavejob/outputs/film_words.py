"""What a film says in words: the caption, the names above the stage, the key and the running values."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from .choices import CarpetScale, Choices, Magnified, largest_of
from .key import Hatch, Item, Ramp, Stroke, Wordings, Words
from .names import Name, PlacedName
from .palette import CURVES, DETECTOR, ENERGY, LAYER, PATH, POTENTIAL, REGION, VERDICT_MARKS, density_table
from .scene import Scene
from .sheet import Panel, Sheet
from .wording import Numbers, numbers_for, per, power_of_ten, scientific, with_unit

Array = np.ndarray

ARROWS = {"+": "\u2192", "-": "\u2190"}
MINUS = "\u2212"


def time_numbers(times: Array) -> Numbers:
    """Decimals that tell neighbouring times apart."""
    if times.size < 2:
        return numbers_for(float(np.abs(times).max()), 0.0)
    step = float(np.diff(times).min())
    numbers = numbers_for(float(np.abs(times).max()), step)
    if numbers.decimals is None or np.allclose(times, np.round(times, numbers.decimals), rtol=0, atol=1e-6 * step):
        return numbers
    return numbers_for(float(np.abs(times).max()), step / 10)


def value_numbers(values: Array) -> Numbers:
    """Decimals of a running probability: four, or powers of ten where it stays small."""
    largest = largest_of(values)
    return numbers_for(largest, 1e-4) if largest >= 0.01 else Numbers(None)


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


Stretch = tuple[float, float] | None


def place_names(scene: Scene, panel: Panel, *, within: Stretch = None, beyond: Stretch = None) -> list[Name]:
    """Names of walls and regions in view: those `within` a stretch, or not wholly in one left out."""
    names = [Name("wall", panel.across(x), POTENTIAL) for x in scene.walls if panel.shows(x) and within is None]
    for name, low, high in scene.regions:
        wanted = _inside(low, high, within) if within else not (beyond and _inside(low, high, beyond))
        low, high = max(low, panel.x_low), min(high, panel.x_high)
        if low < high and wanted:
            names.append(Name(name, panel.across((low + high) / 2), REGION, beside=False))
    return names


def _inside(low: float, high: float, stretch: tuple[float, float]) -> bool:
    return stretch[0] <= low and high <= stretch[1]


def write_names(sheet: Sheet, placed: Sequence[PlacedName], stage_top: int, font: float, line: float) -> None:
    for p in placed:
        y = stage_top - 4 - (p.row + 0.28) * line
        sheet.text(p.left, y, p.name.words, font, colour=p.name.colour)
        if p.name.beside:
            sheet.line([p.name.x, p.name.x], [y - 0.8 * font, stage_top], p.name.colour, 1)


def key_items(
    scene: Scene,
    chosen: Choices,
    *,
    phases: Array | None,
    where: str,
    homeless: Sequence[Name],
    last: bool = False,
) -> list[Wordings]:
    """The key, most needed first. The mean energy changes from frame to frame, or is that of the `last`."""
    items: list[Wordings] = []
    if phases is not None:
        start, end = Words(f"{MINUS}180\u00b0"), Words("180\u00b0")
        items.append(((Words(f"phase{where}"), start, Ramp(phases), end), (Words("phase"), start, Ramp(phases), end)))
    items.append(carpet_item(scene, chosen.carpet))
    items += [((Stroke(DETECTOR), Words(name.words, soft=True)),) for name in homeless if name.colour == DETECTOR]
    if scene.classical_path is not None:
        stroke = Stroke(PATH)
        items.append(((stroke, Words("F = m a from the same mean start")), (stroke, Words("F = m a, same start"))))
    said = [energy_text(scene, chosen, frame) for frame in range(scene.frames)]
    now = Words(said[-1]) if last else Words(said[0], widest=max(said, key=len))
    items.append(((Stroke(ENERGY, (0, (4, 2))), Words("mean energy", soft=True), now),))
    if scene.layers:
        items.append(((Hatch(LAYER, "//////"), Words("absorbing layer")),))
    if phases is None and scene.phase is not None and not last:
        items.append(((Words("envelope: waves too short for phase colours", soft=True),),))
    return items


def carpet_item(scene: Scene, scale: CarpetScale) -> Wordings:
    """The carpet's colours with both ends of their scale."""
    low = scientific(scale.low, 1).removeprefix("1\u00d7") if scale.logarithmic else "0"
    high = numbers_for(scale.high, scale.high / 100)(scale.high)
    unit = with_unit(high, per(scene.length_label))
    kind = "logarithmic" if scale.logarithmic else "linear"
    start, table = Words(f"density {low}"), density_table()
    return (
        (start, Ramp(table), Words(f"{unit}, {kind}")),
        (start, Ramp(table, long=False), Words(f"{unit}, {kind[:3]}")),
        (start, Ramp(table, long=False), Words(f"{high}, {kind[:3]}")),
    )


def energy_text(scene: Scene, chosen: Choices, frame: int) -> str:
    """The mean energy in one frame, to about three digits of the largest."""
    largest = float(np.abs(chosen.baseline).max())
    number = numbers_for(largest, largest / 200)(float(chosen.baseline[frame]))
    return with_unit(number, scene.energy_label)


def readout_items(chosen: Choices, frame: int | None = None) -> list[Wordings]:
    """One line for each running probability: its mark, its name, its value, its magnification.

    The value is that of `frame`; without one it changes from frame to frame.
    """
    items: list[Wordings] = []
    for (label, values), power, (colour, dash, marker) in zip(chosen.curves, chosen.powers, CURVES, strict=False):
        number = value_numbers(values)
        said = [number(float(v)) for v in values]
        now = Words(said[0], widest=max(said, key=len)) if frame is None else Words(said[frame])
        item: Item = (Stroke(colour, dash, marker), Words(label, soft=True), now)
        times = f"\u00d7{power_of_ten(power)}"
        items.append(((*item, Words(f"(curve {times})")), (*item, Words(f"({times})"))) if power else (item,))
    return items
