"""Where things stand in a film of a given size, in whole pixels."""

from __future__ import annotations

from dataclasses import dataclass

from .axes import beneath
from .sheet import Rect

LINE = 1.35  # height of a row of text, in font sizes


@dataclass(frozen=True)
class Widths:
    """The upright divisions: one column of stage and carpet and, where wanted, one to the right of it."""

    font: float
    axis: int  # room for numbers and name of a side axis
    stage_left: int
    stage_width: int
    right_left: int
    right_width: int  # 0 where there is no right column

    @property
    def stage_right(self) -> int:
        return self.stage_left + self.stage_width


@dataclass(frozen=True)
class Layout:
    """All rectangles. `beside` is the free place next to the stage, `key` the one at the foot."""

    stage: Rect
    carpet: Rect
    beside: Rect
    chances: Rect
    key: Rect
    readouts: Rect
    title_y: float
    subtitle_y: float
    run_y: float  # of the line with the fingerprint


def font_size(height: int) -> float:
    """Pixels: in proportion to the picture, but still readable in a small one."""
    return max(13 * height / 720, 9.5)


def widths(size: tuple[int, int], right_column: bool) -> Widths:
    width, height = size
    unit, font = height / 720, font_size(height)
    axis = round(1.25 * LINE * font + 3.85 * font + 8)
    left = round(axis + 6 * unit)
    margin = round(max(22 * unit, 1.4 * font))
    right_width = round(max(0.225 * width, 17.5 * font)) if right_column else 0
    gap = round(max(20 * unit, font)) if right_column else 0
    stage = width - left - axis - gap - right_width - margin
    return Widths(font, axis, left, stage, left + stage + axis + gap, right_width)


def arrange(
    size: tuple[int, int],
    across: Widths,
    *,
    title_lines: int,
    title_pixels: float,
    name_rows: int,
    close_up: bool,
    key_rows: int,
) -> Layout:
    """Stage and carpet share the height that the words leave. `key_rows` is 0 where the key stands beside."""
    unit, font = size[1] / 720, across.font
    line = LINE * font
    title_y = 14 * unit + 1.15 * title_pixels
    subtitle_y = title_y + (title_lines - 1) * 1.2 * title_pixels + 1.45 * font
    stage_top = round(subtitle_y + 0.7 * font + name_rows * line + 4)
    key_height = round(key_rows * line)
    foot = round(size[1] - max(8 * unit, 4) - key_height)
    carpet_bottom = foot - (beneath(0, font, named=True) + round(0.3 * font))
    between = beneath(0, font, named=False) + round(0.5 * font) if close_up else round(font)
    stage_height = (carpet_bottom - stage_top - between) // 2
    carpet_top = stage_top + stage_height + between
    left, width = across.stage_left, across.stage_width
    right, right_width = across.right_left, across.right_width
    return Layout(
        stage=Rect(left, stage_top, width, stage_height),
        carpet=Rect(left, carpet_top, width, carpet_bottom - carpet_top),
        beside=Rect(right, stage_top, right_width, stage_height),
        chances=Rect(right, carpet_top, right_width, carpet_bottom - carpet_top),
        key=Rect(left, foot, width + across.axis, key_height),
        readouts=Rect(right, foot, right_width, key_height),
        title_y=title_y,
        subtitle_y=subtitle_y,
        run_y=title_y + 1.45 * font,
    )
