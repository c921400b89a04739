"""Names of detectors, regions and walls above the stage, packed so that none touches another."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass

from .sheet import Sheet

GAP = 4.0  # pixels between a name and its line, and between two names


@dataclass(frozen=True)
class Name:
    """A name to be put near pixel column `x`; a `beside` one stands next to its line, else centred on it."""

    words: str
    x: float
    colour: str
    beside: bool = True


@dataclass(frozen=True)
class PlacedName:
    name: Name
    left: float
    row: int  # 0 is the lowest, next to the stage


def pack(
    sheet: Sheet, names: Sequence[Name], font: float, span: tuple[float, float], most_rows: int
) -> tuple[list[PlacedName], list[Name]]:
    """Places for the names, most needed first, between the columns of `span`; and those that found none."""
    taken: list[list[tuple[float, float]]] = [[] for _ in range(most_rows)]
    placed, homeless = [], []
    for name in names:
        width = sheet.measure(name.words, font)
        spot = _free_spot(name, width, span, taken)
        if spot is None:
            homeless.append(name)
            continue
        row, left = spot
        taken[row].append((left - GAP, left + width + GAP))
        if name.beside:  # its line passes the rows below
            for lower in taken[: row + 1]:
                lower.append((name.x - 1.5, name.x + 1.5))
        placed.append(PlacedName(name, left, row))
    return placed, homeless


def _free_spot(
    name: Name, width: float, span: tuple[float, float], taken: list[list[tuple[float, float]]]
) -> tuple[int, float] | None:
    lefts = [name.x + GAP, name.x - GAP - width] if name.beside else [name.x - width / 2]
    for row, spots in enumerate(taken):
        line_passes = not name.beside or all(
            right <= name.x - 1.5 or left >= name.x + 1.5 for lower in taken[: row + 1] for left, right in lower
        )
        for left in lefts:
            inside = span[0] <= left and left + width <= span[1]
            if inside and line_passes and all(right <= left or start >= left + width for start, right in spots):
                return row, left
    return None
