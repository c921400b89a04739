"""Ticks and labels along the sides of a panel."""

from __future__ import annotations

import numpy as np
from matplotlib.artist import Artist

from .palette import GRID, INK, QUIET
from .sheet import Panel, Sheet
from .wording import Ticks, axis_label, ticks

TICK = 4  # pixels
SMALLEST_LABEL = 6.0  # pixels, for labels longer than their axis


def bottom_axis(
    sheet: Sheet, panel: Panel, font: float, name: str, unit: str | None, *, named: bool = True, most: int = 0
) -> None:
    """The x axis below a panel; `unit` None for a plain number. Unnamed: ticks and their numbers alone."""
    rect = panel.rect
    shown = ticks(panel.x_low, panel.x_high, most or max(int(rect.width / (4 * font)), 1))
    sheet.line([rect.left, rect.right], [rect.bottom, rect.bottom], QUIET, 1)
    free_from = -np.inf
    for value, label in zip(shown.values, shown.labels, strict=True):
        x = panel.across(value)
        sheet.line([x, x], [rect.bottom, rect.bottom + TICK], QUIET, 1)
        half = sheet.measure(label, font) / 2
        if x - half > free_from:
            sheet.text(x, rect.bottom + _gap(font), label, font, align="center", upright="top", colour=QUIET)
            free_from = x + half + 0.4 * font
    if named:
        said = name if unit is None else axis_label(name, unit, shown.power)
        y = rect.bottom + _gap(font) + 1.3 * font
        pixels = sheet.shrink(said, font, rect.width, SMALLEST_LABEL)
        sheet.text((rect.left + rect.right) / 2, y, said, pixels, align="center", upright="top")


def side_ticks(panel: Panel, font: float) -> Ticks:
    return ticks(panel.y_low, panel.y_high, max(int(panel.rect.height / (3 * font)), 2))


def numbers_room(sheet: Sheet, shown: Ticks, font: float) -> float:
    """Pixels that ticks and their numbers take beside a panel."""
    return TICK + 3 + max((sheet.measure(label, font) for label in shown.labels), default=0.0)


def side_axis(
    sheet: Sheet, panel: Panel, font: float, name: str, unit: str, *, room: float, right: bool = False
) -> None:
    """The y axis on the left or right of a panel, its name beyond `room` pixels."""
    shown = side_ticks(panel, font)
    spine(sheet, panel, right=right)
    for value, label in zip(shown.values, shown.labels, strict=True):
        side_tick(sheet, panel, panel.down(value), label, font, right=right)
    side_name(sheet, panel, axis_label(name, unit, shown.power), font, room=room, right=right)


def spine(sheet: Sheet, panel: Panel, *, right: bool = False) -> None:
    x = panel.rect.right if right else panel.rect.left
    sheet.line([x, x], [panel.rect.top, panel.rect.bottom], QUIET, 1)


def side_tick(
    sheet: Sheet,
    panel: Panel,
    y: float,
    label: str,
    font: float,
    *,
    right: bool = False,
    moving: bool = False,
) -> list[Artist]:
    """One tick with its number at pixel row `y`."""
    x, outward = (panel.rect.right, TICK) if right else (panel.rect.left, -TICK)
    mark = sheet.line([x, x + outward], [y, y], QUIET, 1, moving=moving)
    align = "left" if right else "right"
    place = x + outward + (3 if right else -3)
    words = sheet.text(place, y, label, font, align=align, upright="center_baseline", colour=QUIET, moving=moving)
    return [mark, words]


def side_name(sheet: Sheet, panel: Panel, said: str, font: float, *, room: float, right: bool = False) -> None:
    rect = panel.rect
    pixels = sheet.shrink(said, font, rect.height, SMALLEST_LABEL)
    x = rect.right + room + 1.4 * font if right else rect.left - room - 0.7 * font
    sheet.text(x, (rect.top + rect.bottom) / 2, said, pixels, align="center", rotation=90, colour=INK)


def upright_grid(sheet: Sheet, panel: Panel, most: int) -> None:
    """Faint lines over the ticks of the bottom axis."""
    for value in ticks(panel.x_low, panel.x_high, most).values:
        x = panel.across(value)
        sheet.line([x, x], [panel.rect.top, panel.rect.bottom], GRID, 1, order=0.5)


def _gap(font: float) -> float:
    """Pixels from a bottom axis to its numbers, which stay clear of the number at the side axis's end."""
    return 3 + 0.65 * font


def beneath(top: int, font: float, named: bool) -> int:
    """The first free pixel row below a bottom axis at `top`."""
    return round(top + _gap(font) + (2.6 if named else 1.3) * font)
