"""Axes and names around the packet's panel, and the mark of its close-up."""

from __future__ import annotations

import numpy as np
from matplotlib.artist import Artist

from .axes import numbers_room, side_axis, side_name, side_tick, side_ticks, spine
from .choices import SHORTEST_WAVE
from .packet_panel import PacketPanel
from .palette import CLOSE_UP, QUIET, phase_table
from .scene import Scene
from .sheet import Panel, Rect, Sheet
from .wording import Ticks, axis_label, per, ticks

Array = np.ndarray


def phases_for(scene: Scene, stretch: tuple[float, float], width: int) -> Array | None:
    """Phase colours where a wavelength spans enough pixels of a panel, else None."""
    if scene.phase is None or scene.wavelength is None:
        return None
    pixels = scene.wavelength / (stretch[1] - stretch[0]) * width
    return phase_table(pixels, SHORTEST_WAVE) if pixels >= SHORTEST_WAVE else None


def draw_stage_axes(
    sheet: Sheet, scene: Scene, packet: PacketPanel, font: float, below: Panel | None
) -> tuple[DensityAxis, float]:
    """Density on the left, potential on the right; and the room of the left numbers, shared with `below`."""
    panel, rect = packet.panel, packet.panel.rect
    density = ticks(0.0, packet.room * packet.per_pixel, max(int(packet.room / (3 * font)), 1))
    axis = DensityAxis(sheet, packet, density, font)
    spine(sheet, panel)
    beside = [density] if below is None else [density, side_ticks(below, font)]
    left_room = max(numbers_room(sheet, shown, font) for shown in beside)
    side_name(sheet, panel, axis_label("density", per(scene.length_label), density.power), font, room=left_room)
    right_room = numbers_room(sheet, side_ticks(panel, font), font)
    side_axis(sheet, panel, font, "potential", scene.energy_label, room=right_room, right=True)
    sheet.line([rect.left, rect.right], [rect.bottom, rect.bottom], QUIET, 1)
    return axis, left_room


def mark_close_up(sheet: Sheet, stage: Panel, close: Panel) -> None:
    """The same tint behind the close-up and behind the stretch of the stage that it shows."""
    left, right = round(stage.across(close.x_low)), round(stage.across(close.x_high))
    spot = Rect(left, stage.rect.top, max(right - left, 2), stage.rect.height)
    for rect in (spot, close.rect):
        sheet.rectangle(rect, CLOSE_UP, order=0.1)


def close_up_title(scene: Scene, stage: Panel, close: Panel) -> str:
    """`close-up ×10, x [nm]`"""
    widened = close.rect.width / (close.x_high - close.x_low)
    times = widened * (stage.x_high - stage.x_low) / stage.rect.width
    unit = f" [{scene.length_label}]" if scene.length_label else ""
    return f"close-up \u00d7{times:.0f}, x{unit}"


class DensityAxis:
    """Numbers of the density left of the stage, whose zero stands on the baseline and moves with it."""

    def __init__(self, sheet: Sheet, packet: PacketPanel, shown: Ticks, font: float) -> None:
        self.sheet, self.packet = sheet, packet
        self.steps = shown.values / packet.per_pixel
        self.moves = bool(np.ptp(packet.base) > 0)
        base = packet.base[0]
        rows = zip(self.steps, shown.labels, strict=True)
        self.marks = [side_tick(sheet, packet.panel, base - s, label, font, moving=self.moves) for s, label in rows]
        if not self.moves:
            self._show(0)

    def _show(self, frame: int) -> list[Artist]:
        """Puts the ticks where they belong in one frame; those that are in the picture."""
        height, rect = self.sheet.height, self.packet.panel.rect
        visible: list[Artist] = []
        for step, (mark, words) in zip(self.steps, self.marks, strict=True):
            y = self.packet.base[frame] - step
            inside = rect.top <= y <= rect.bottom
            mark.set(ydata=[height - y, height - y], visible=inside)
            words.set(y=height - y, visible=inside)
            visible += [mark, words] if inside else []
        return visible

    def paint(self, frame: int) -> None:
        if self.moves:
            self.sheet.paint(*self._show(frame))
