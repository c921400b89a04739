"""The space-time carpet and the running probabilities beside it, on one time axis that runs downward."""

from __future__ import annotations

import numpy as np
from matplotlib.artist import Artist
from matplotlib.lines import Line2D

from .axes import bottom_axis, side_axis, spine, upright_grid
from .choices import CarpetScale, Choices
from .columns import Columns, rows_in_time
from .packet_panel import draw_detectors
from .palette import CASING, CURVES, INK, PATH, density_table
from .scene import Scene
from .sheet import Panel, Sheet

Array = np.ndarray


def paint_carpet(sheet: Sheet, scene: Scene, panel: Panel, scale: CarpetScale, fine: float, pixels: Array) -> None:
    """Density, detectors and classical path of all times, into `pixels` of the sheet (height, width, 4)."""
    rect = panel.rect
    columns = Columns(scene.x, panel.x_low, panel.x_high, rect.width).mean(scene.density)
    shades = scale.shade(rows_in_time(columns, scene.times, rect.height))
    pixels[rect.top : rect.bottom, rect.left : rect.right, :3] = density_table()[shades]
    sheet.paint(*draw_detectors(sheet, scene, panel, fine, edged=True))
    if scene.classical_path is not None:
        x = panel.across(_without_jumps(scene.classical_path, panel))
        y = panel.down(scene.times)
        for colour, width in ((CASING, 3.4), (PATH, 1.8)):
            sheet.paint(sheet.line(x, y, colour, width * fine, within=rect, moving=True))


def paint_curves(sheet: Sheet, times: Array, panel: Panel, chosen: Choices, fine: float) -> None:
    """The running probabilities of all times, each times its power of ten."""
    for (_, values), power, (colour, dash, _) in zip(chosen.curves, chosen.powers, CURVES, strict=False):
        x = panel.across(np.asarray(values) * 10.0**power)
        sheet.paint(sheet.line(x, panel.down(times), colour, 1.8 * fine, dash=dash, moving=True))


def draw_time_axes(sheet: Sheet, scene: Scene, carpet: Panel, chances: Panel | None, font: float, room: float) -> None:
    """x, time and probability around carpet and curves; `room` is that of the numbers on the left."""
    bottom_axis(sheet, carpet, font, "x", scene.length_label)
    side_axis(sheet, carpet, font, "time", scene.time_label, room=room)
    if chances is not None:
        most = 5 if chances.rect.width > 20 * font else 2
        upright_grid(sheet, chances, most)
        bottom_axis(sheet, chances, font, "probability", None, most=most)
        spine(sheet, chances)


class Now:
    """The line at the present time through carpet and probabilities, and a mark on each curve."""

    def __init__(self, sheet: Sheet, carpet: Panel, chances: Panel | None, chosen: Choices, fine: float) -> None:
        self.sheet, self.chances = sheet, chances
        rects = [carpet.rect] if chances is None else [carpet.rect, chances.rect]
        self.lines = [sheet.line([r.left, r.right], [r.top] * 2, INK, 1, moving=True) for r in rects]
        self.drawn = [
            np.asarray(values) * 10.0**power for (_, values), power in zip(chosen.curves, chosen.powers, strict=True)
        ]
        self.marks: list[Line2D] = [
            sheet.line([], [], colour, 7 * fine, marker=marker, moving=True)
            for _, (colour, _, marker) in zip(chosen.curves, CURVES, strict=False)
        ]

    def paint(self, frame: int, row: int) -> None:
        artists: list[Artist] = [*self.lines, *self.marks]
        for line in self.lines:
            self.sheet.move(line, line.get_xdata(), [row, row])
        if self.chances is not None:
            for mark, values in zip(self.marks, self.drawn, strict=True):
                self.sheet.move(mark, [self.chances.across(float(values[frame]))], [row])
        self.sheet.paint(*artists)


def _without_jumps(path: Array, panel: Panel) -> Array:
    """The path with a gap where it leaves on one side of the box and comes back on the other."""
    broken = np.array(path, dtype=float)
    broken[1:][np.abs(np.diff(broken)) > 0.5 * (panel.x_high - panel.x_low)] = np.nan
    return broken
