"""The key: short items of words, colour ramps and line samples, flowed into rows."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np
from matplotlib.text import Text

from .palette import QUIET
from .sheet import Rect, Sheet

Array = np.ndarray

BETWEEN_ITEMS = 1.6  # all in font sizes
BETWEEN_PARTS = 0.4
SAMPLE = 2.0
RAMP = 6.0
SMALL_RAMP = 3.5


@dataclass(frozen=True)
class Words:
    """A text. One that changes from frame to frame gives the `widest` it will be; a `soft` one may be cut."""

    text: str
    widest: str = ""
    soft: bool = False


@dataclass(frozen=True)
class Ramp:
    """A colour table, shape (n, 3), drawn as a bar."""

    table: Array
    long: bool = True


@dataclass(frozen=True)
class Stroke:
    """A sample of a line, with its marker if it has one."""

    colour: str
    dash: Any = "-"
    marker: str = ""


@dataclass(frozen=True)
class Hatch:
    """A sample of a hatched area."""

    colour: str
    hatch: str


Piece = Words | Ramp | Stroke | Hatch
Item = tuple[Piece, ...]
Wordings = tuple[Item, ...]  # one item said in full, then shorter: the first that fits is drawn


@dataclass(frozen=True)
class Placed:
    """What was drawn: the texts that change (one for each item that has one), and the items left out."""

    moving: dict[int, Text]
    left_out: tuple[int, ...]


def rows_needed(sheet: Sheet, items: Sequence[Wordings], font: float, width: int) -> int:
    """How many rows the items take in that width."""
    places = _flow([item_width(sheet, _fitting(sheet, item, font, width), font) for item in items], font, width)
    return max((row for row, _ in places), default=-1) + 1


def draw_key(sheet: Sheet, items: Sequence[Wordings], font: float, line: float, rect: Rect) -> Placed:
    """Draws the items into `rect`, in rows of height `line`; those that come after its end are left out.

    Give the items most needed first. One whose shortest wording is too wide has its soft words shortened.
    """
    chosen = [_fitting(sheet, item, font, rect.width) for item in items]
    widths = [item_width(sheet, item, font) for item in chosen]
    places = _flow(widths, font, rect.width)
    moving: dict[int, Text] = {}
    left_out = []
    for index, (item, width, (row, x)) in enumerate(zip(chosen, widths, places, strict=True)):
        if (row + 1) * line > rect.height + 0.5:
            left_out.append(index)
            continue
        too_wide = max(0.0, width - rect.width)
        text = _draw_item(sheet, item, font, rect.left + x, rect.top + (row + 0.5) * line, too_wide)
        if text is not None:
            moving[index] = text
    return Placed(moving, tuple(left_out))


def item_width(sheet: Sheet, item: Item, font: float) -> float:
    return sum(_width(sheet, piece, font) for piece in item) + BETWEEN_PARTS * font * (len(item) - 1)


def _fitting(sheet: Sheet, wordings: Wordings, font: float, width: int) -> Item:
    return next((item for item in wordings if item_width(sheet, item, font) <= width), wordings[-1])


def _flow(widths: Sequence[float], font: float, width: int) -> list[tuple[int, float]]:
    """(row, x) of each item, left to right and on to the next row where it does not fit."""
    places: list[tuple[int, float]] = []
    row, x = 0, 0.0
    for needed in widths:
        if x > 0 and x + needed > width:
            row, x = row + 1, 0.0
        places.append((row, x))
        x += needed + BETWEEN_ITEMS * font
    return places


def _width(sheet: Sheet, piece: Piece, font: float) -> float:
    if isinstance(piece, Words):
        return max(sheet.measure(piece.text, font), sheet.measure(piece.widest, font) if piece.widest else 0.0)
    if isinstance(piece, Ramp):
        return (RAMP if piece.long else SMALL_RAMP) * font
    return SAMPLE * font


def _draw_item(sheet: Sheet, item: Item, font: float, x: float, middle: float, too_wide: float) -> Text | None:
    """Draws the pieces side by side, `middle` being the pixel row of their middle; the changing text."""
    moving = None
    for piece in item:
        width = _width(sheet, piece, font)
        if isinstance(piece, Words):
            width -= too_wide if piece.soft else 0.0
            shown = sheet.fit(piece.text, font, width) if piece.soft else piece.text
            text = sheet.text(x, middle + 0.36 * font, shown, font, colour=QUIET, moving=bool(piece.widest))
            moving = text if piece.widest else moving
        else:
            box = Rect(round(x), round(middle - 0.35 * font), round(width), round(0.7 * font))
            _draw_sample(sheet, piece, box)
        x += width + BETWEEN_PARTS * font
    return moving


def _draw_sample(sheet: Sheet, piece: Ramp | Stroke | Hatch, box: Rect) -> None:
    middle = (box.top + box.bottom) / 2
    if isinstance(piece, Stroke):
        sheet.line([box.left, box.right], [middle, middle], piece.colour, 0.16 * box.height + 0.6, dash=piece.dash)
        if piece.marker:
            sheet.line([(box.left + box.right) / 2], [middle], piece.colour, 0.7 * box.height, marker=piece.marker)
    elif isinstance(piece, Hatch):
        sheet.rectangle(box, piece.colour, hatch=piece.hatch)
    else:
        table = np.asarray(piece.table, dtype=float) / 255
        cells = np.linspace(0, len(table), box.width + 1).astype(int)[:-1]
        for column, cell in enumerate(cells):
            left = box.left + column
            sheet.area(
                [left, left + 1, left + 1, left],
                [box.top, box.top, box.bottom, box.bottom],
                "#" + "".join(f"{round(255 * c):02x}" for c in table[cell]),
                within=box,
            )
