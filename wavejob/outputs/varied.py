"""A result against what was varied: points with error bars over one key, a map over two."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from .axes import TICK, bottom_axis, numbers_room, side_axis, side_name, side_tick, side_ticks, spine, upright_grid
from .encode import write_png
from .palette import CURVES, GRID, INK, QUIET, density_table, rgb
from .sheet import Panel, Rect, Sheet, plain_matplotlib
from .titles import broken_into_lines
from .wording import power_of_ten, scientific

Array = np.ndarray

WIDTH, HEIGHT = 1200, 760
FONT = 17.0
FINE = 1.4
PLOT = Rect(150, 120, 980, 530)
MAP = Rect(150, 120, 820, 530)
SCALE = Rect(1010, 120, 26, 530)
MARGIN = 0.06  # of the range of values, above and below
MOST_WORDS = 12  # written below an axis of words
FEW_POINTS = 60  # markers up to so many; beyond, the line alone
WHISKER = 5  # pixels to each side


@dataclass(frozen=True)
class Axis:
    """What was varied: numbers in the file's `unit` (None: a plain number), or words, which stand side by side."""

    name: str
    unit: str | None
    values: Array  # (n,); of words, their places 0, 1, ...
    words: tuple[str, ...] = ()


@dataclass(frozen=True)
class Outcome:
    """One result of all variants in the file's `unit` (None: a plain number), nan where it could not be had.

    values, errors  of shape (n,), or (n, m) where two keys were varied; an error of nan is none.
    """

    name: str
    meaning: str
    unit: str | None
    values: Array
    errors: Array


def draw_varied(path: Path, title: str, axes: Sequence[Axis], outcome: Outcome) -> None:
    """Writes one picture of a result over one or two axes as a PNG. Raises RunError where it can't be written."""
    with plain_matplotlib():
        sheet = Sheet((WIDTH, HEIGHT))
        lines, size = broken_into_lines(sheet, title, (24, 15), WIDTH - 2 * FONT - 40)
        for number, words in enumerate(lines):
            sheet.text(30, (42 if len(lines) == 1 else 30) + number * 1.2 * size, words, size, bold=True)
        said = f"{outcome.name}: {outcome.meaning}" if outcome.meaning else outcome.name
        sheet.text(30, 42 + 2 * FONT, sheet.fit(said, FONT, WIDTH - 60), FONT, colour=QUIET)
        pixels = _points(sheet, axes[0], outcome) if len(axes) == 1 else _map(sheet, axes[0], axes[1], outcome)
        write_png(path, pixels)


def _points(sheet: Sheet, axis: Axis, outcome: Outcome) -> Array:
    order = np.argsort(axis.values, kind="stable")
    x, y, error = axis.values[order], outcome.values[order], outcome.errors[order]
    bars = np.nan_to_num(error)
    panel = Panel(PLOT, *_reach(x, bool(axis.words)), *_around(np.concatenate([y - bars, y + bars])))
    upright_grid(sheet, panel, 8) if not axis.words else None
    for value in side_ticks(panel, FONT).values:
        sheet.line([PLOT.left, PLOT.right], [panel.down(value)] * 2, GRID, 1, order=0.5)
    _below(sheet, panel, axis)
    _beside(sheet, panel, outcome.name, outcome.unit)
    colour = CURVES[0][0]
    across, down = panel.across(x), panel.down(y)
    if not axis.words:
        sheet.line(across, down, colour, 1.2 * FINE, within=PLOT)
    for place, top, bottom in zip(across, panel.down(y + error), panel.down(y - error), strict=True):
        if np.isfinite(top):
            sheet.line([place, place], [top, bottom], INK, FINE)
            for end in (top, bottom):
                sheet.line([place - WHISKER, place + WHISKER], [end, end], INK, FINE)
    if len(x) <= FEW_POINTS or axis.words:
        sheet.line(across, down, colour, 8, marker="o", order=3)
    return sheet.draw()


def _map(sheet: Sheet, first: Axis, second: Axis, outcome: Outcome) -> Array:
    columns, rows = np.argsort(first.values, kind="stable"), np.argsort(second.values, kind="stable")
    values = outcome.values[np.ix_(columns, rows)]
    sides = [_cells(axis.values[order]) for axis, order in ((first, columns), (second, rows))]
    panel = Panel(MAP, sides[0][0], sides[0][-1], sides[1][0], sides[1][-1])
    low, high = _range(values)
    scale = Panel(SCALE, 0.0, 1.0, low, high)
    _below(sheet, panel, first)
    if second.words:
        spine(sheet, panel)
        for place, words in _thinned(second):
            side_tick(sheet, panel, panel.down(place), sheet.fit(words, FONT, 90), FONT)
        sheet.text(30, MAP.top - FONT, second.name, FONT)
    else:
        _beside(sheet, panel, second.name, second.unit)
    _beside(sheet, scale, outcome.name, outcome.unit, right=True)
    if np.isfinite(outcome.errors).any():
        said = f"largest error bar {scientific(float(np.nanmax(outcome.errors)))} {outcome.unit or ''}".rstrip()
        sheet.text(MAP.right, HEIGHT - 25, said, FONT, colour=QUIET, align="right")
    pixels = sheet.draw()
    x = panel.x_low + (np.arange(MAP.width) + 0.5) / MAP.width * (panel.x_high - panel.x_low)
    y = panel.y_high - (np.arange(MAP.height) + 0.5) / MAP.height * (panel.y_high - panel.y_low)
    column = np.clip(np.searchsorted(sides[0], x) - 1, 0, len(columns) - 1)
    row = np.clip(np.searchsorted(sides[1], y) - 1, 0, len(rows) - 1)
    share = (values[np.ix_(column, row)].T - low) / (high - low)
    shades = density_table()[np.nan_to_num(255 * share).round().astype(int)]
    shades[np.isnan(share)] = rgb(GRID)  # a variant without this result
    pixels[MAP.top : MAP.bottom, MAP.left : MAP.right, :3] = shades
    ramp = np.linspace(255, 0, SCALE.height).round().astype(int)
    pixels[SCALE.top : SCALE.bottom, SCALE.left : SCALE.right - TICK, :3] = density_table()[ramp][:, None]
    return pixels


def _below(sheet: Sheet, panel: Panel, axis: Axis) -> None:
    """The bottom axis: numbers, or the words in their places."""
    rect = panel.rect
    if not axis.words:
        bottom_axis(sheet, panel, FONT, axis.name, axis.unit)
        return
    sheet.line([rect.left, rect.right], [rect.bottom, rect.bottom], QUIET, 1)
    shown = _thinned(axis)
    room = rect.width / max(len(shown), 1) - 6
    for place, words in shown:
        x = panel.across(place)
        sheet.line([x, x], [rect.bottom, rect.bottom + TICK], QUIET, 1)
        said = sheet.fit(words, FONT, room)
        sheet.text(x, rect.bottom + FONT, said, FONT, align="center", upright="top", colour=QUIET)
    sheet.text((rect.left + rect.right) / 2, rect.bottom + 2.5 * FONT, axis.name, FONT, align="center", upright="top")


def _thinned(axis: Axis) -> list[tuple[float, str]]:
    every = -(-len(axis.words) // MOST_WORDS)
    return list(zip(axis.values.tolist(), axis.words, strict=True))[::every]


def _beside(sheet: Sheet, panel: Panel, name: str, unit: str | None, *, right: bool = False) -> None:
    """The axis at a side; a plain number has no unit behind its name."""
    shown = side_ticks(panel, FONT)
    room = numbers_room(sheet, shown, FONT)
    if unit is not None:
        side_axis(sheet, panel, FONT, name, unit, room=room, right=right)
        return
    spine(sheet, panel, right=right)
    for value, label in zip(shown.values, shown.labels, strict=True):
        side_tick(sheet, panel, panel.down(value), label, FONT, right=right)
    said = f"{name} [{power_of_ten(shown.power)}]" if shown.power else name
    side_name(sheet, panel, said, FONT, room=room, right=right)


def _range(values: Array) -> tuple[float, float]:
    """Lowest and highest finite value, apart even where all are the same."""
    finite = values[np.isfinite(values)]
    if not finite.size:
        return 0.0, 1.0
    low, high = float(finite.min()), float(finite.max())
    least = 1e-9 * max(abs(low), abs(high)) or 1.0
    return (low, high) if high - low > least else (low - least, high + least)


def _around(values: Array) -> tuple[float, float]:
    low, high = _range(values)
    return low - MARGIN * (high - low), high + MARGIN * (high - low)


def _reach(values: Array, words: bool) -> tuple[float, float]:
    if words:
        return -0.5, len(values) - 0.5
    low, high = _range(values)
    return low - 0.02 * (high - low), high + 0.02 * (high - low)


def _cells(values: Array) -> Array:
    """The sides of cells around rising `values` (n,), shape (n + 1,)."""
    if len(values) == 1:
        return np.array([values[0] - 0.5, values[0] + 0.5])
    middle = (values[1:] + values[:-1]) / 2
    return np.concatenate([[2 * values[0] - middle[0]], middle, [2 * values[-1] - middle[-1]]])
