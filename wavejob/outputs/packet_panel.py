"""The packet over the potential: one panel of the film, painted into the pixels frame by frame."""

from __future__ import annotations

import numpy as np
from matplotlib.artist import Artist

from .choices import Choices
from .columns import Columns
from .palette import (
    DETECTOR,
    ENERGY,
    ENVELOPE,
    INK,
    LAYER,
    PAPER,
    POTENTIAL,
    POTENTIAL_FILL,
    REGION,
    SHADOW,
    rgb,
)
from .scene import Scene
from .sheet import Panel, Rect, Sheet

Array = np.ndarray

PEAK_AT = 0.94  # of the room above the baseline
FAR = 1e4  # pixels: where infinite potentials are cut
FLAT = 0.3  # pixels: a curve this low is left to the line of the mean energy


class PacketPanel:
    """Draws the unmoving parts on creation; `paint` then adds those of one frame.

    panel   pixels for x and for energies
    phases  colours from -180 to 180 degrees, shape (256, 3), or None for the envelope alone
    fine    width of a fine line in pixels
    """

    def __init__(
        self, sheet: Sheet, scene: Scene, chosen: Choices, panel: Panel, *, phases: Array | None, fine: float
    ) -> None:
        self.sheet, self.scene, self.panel, self.phases = sheet, scene, panel, phases
        self.columns = Columns(scene.x, panel.x_low, panel.x_high, panel.rect.width)
        self.base = np.round(panel.down(chosen.baseline))
        self.room = float(self.base.min()) - panel.rect.top
        self.per_pixel = per_pixel = chosen.highest / (PEAK_AT * self.room)
        heights = self.columns.highest(scene.density) / per_pixel
        self.enlarged = np.zeros(panel.rect.width, dtype=bool)
        for part in chosen.magnified:
            within = (self.columns.centres > part.low) & (self.columns.centres < part.high)
            heights[:, within] *= 10.0**part.power
            self.enlarged |= within
        self.heights = np.nan_to_num(heights, nan=0.0, posinf=FAR).astype(np.float32)
        self.x = panel.rect.left + np.arange(panel.rect.width) + 0.5
        draw_places(sheet, scene, panel, fine)
        self._draw_potential(fine)
        self.curve = sheet.line([], [], INK, 1.2 * fine, within=panel.rect, moving=True, order=5)
        self.large_curve = sheet.line([], [], DETECTOR, 1.5 * fine, within=panel.rect, moving=True, order=5)
        self.mean = sheet.line([], [], ENERGY, 1.0 * fine, dash=(0, (5, 3)), within=panel.rect, moving=True)
        self.front: list[Artist] = [self.outline, self.mean, *draw_detectors(sheet, scene, panel, fine)]

    def _draw_potential(self, fine: float) -> None:
        moves, within = self.scene.potential_moves, self.panel.rect
        x, y = self._potential(0)
        self.ground = self.sheet.area(*self._closed(x, y), POTENTIAL_FILL, within=within, moving=moves)
        self.outline = self.sheet.line(x, y, POTENTIAL, 1.3 * fine, within=within, moving=True, order=4)

    def _potential(self, frame: int) -> tuple[Array, Array]:
        x, v = self.scene.potential_at(frame)
        y = np.clip(np.nan_to_num(self.panel.down(v), nan=FAR, posinf=FAR, neginf=-FAR), -FAR, FAR)
        return self.panel.across(x), y

    def _closed(self, x: Array, y: Array) -> tuple[Array, Array]:
        bottom = self.panel.rect.bottom
        return np.concatenate([x, x[[-1, 0]]]), np.concatenate([y, [bottom, bottom]])

    def tops(self, frame: int) -> Array:
        """Pixel row of the curve in each column, shape (width,)."""
        return np.asarray(self.base[frame] - self.heights[frame])

    def paint(self, frame: int, pixels: Array, *, shadow: int | None = None) -> None:
        """Paints one frame onto the pixels of the sheet, shape (height, width, 4), before a frame in grey."""
        if self.scene.potential_moves:
            x, y = self._potential(frame)
            self.ground.set_xy(self.sheet.corners(*self._closed(x, y)))
            self.sheet.move(self.outline, x, y)
            self.sheet.paint(self.ground)
        if shadow is not None:
            fill_columns(pixels, self.panel.rect, self.tops(shadow), float(self.base[shadow]), rgb(SHADOW))
        base, tops = float(self.base[frame]), self.tops(frame)
        fill_columns(pixels, self.panel.rect, tops, base, self._colours(frame))
        drawn = np.where(self.heights[frame] > FLAT, tops, np.nan)
        self.sheet.move(self.curve, self.x, np.where(self.enlarged, np.nan, drawn))
        self.sheet.move(self.large_curve, self.x, np.where(self.enlarged, drawn, np.nan))
        self.sheet.move(self.mean, [self.panel.rect.left, self.panel.rect.right], [base, base])
        self.sheet.paint(*self.front, self.curve, self.large_curve)

    def _colours(self, frame: int) -> Array:
        """Colours of the columns, shape (width, 3) or (3,)."""
        if self.phases is None or self.scene.phase is None:
            return rgb(ENVELOPE)
        turns = self.columns.phase(self.scene.phase[frame]) / (2 * np.pi) + 0.5
        return np.asarray(self.phases[np.minimum((turns * 256).astype(int), 255)])


def fill_columns(pixels: Array, rect: Rect, tops: Array, base: float, colours: Array) -> None:
    """Fills each pixel column of `rect` from its row in `tops` (width,) down to the row `base`."""
    first = max(int(np.floor(tops.min())), rect.top)
    last = min(int(base), rect.bottom)
    if last <= first:
        return
    block = pixels[first:last, rect.left : rect.right, :3]
    rows = np.arange(first, last)[:, None] + 0.5
    np.copyto(block, colours, where=(rows >= tops)[..., None])


def draw_places(sheet: Sheet, scene: Scene, panel: Panel, fine: float) -> None:
    """Absorbing layers, regions and walls of a panel."""
    rect = panel.rect
    for low, high in scene.layers:
        left, right = _columns_of(panel, low, high)
        if right > left:
            sheet.rectangle(Rect(left, rect.top, right - left, rect.height), LAYER, hatch="////", order=0.6)
    for _, low, high in scene.regions:
        left, right = _columns_of(panel, low, high)
        if right > left:
            sheet.line([left + 1, right - 1], [rect.top, rect.top], REGION, 4 * fine, order=3)
    for x in scene.walls:
        if panel.shows(x):
            place = panel.across(x)
            sheet.line([place, place], [rect.top, rect.bottom], POTENTIAL, 4 * fine, order=3)


def _columns_of(panel: Panel, low: float, high: float) -> tuple[int, int]:
    left, right = np.clip(panel.across(np.array([low, high])), panel.rect.left, panel.rect.right).round()
    return int(left), max(int(right), int(left) + 1) if panel.x_low <= high and low <= panel.x_high else int(left)


def draw_detectors(sheet: Sheet, scene: Scene, panel: Panel, fine: float, *, edged: bool = False) -> list[Artist]:
    """Detector planes of a panel, to be painted; `edged` ones stand out from a dark carpet."""
    rect = panel.rect
    lines: list[Artist] = []
    for place in (panel.across(x) for _, x, _ in scene.detectors if panel.shows(x)):
        styles = [(PAPER, 3.6), (DETECTOR, 1.8)] if edged else [(DETECTOR, 1.3)]
        for colour, width in styles:
            lines.append(
                sheet.line([place, place], [rect.top, rect.bottom], colour, width * fine, within=rect, moving=True)
            )
    return lines
