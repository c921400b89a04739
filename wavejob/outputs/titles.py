"""Long titles on one line or two."""

from __future__ import annotations

from .sheet import Sheet
from .wording import clean


def broken_into_lines(sheet: Sheet, words: str, sizes: tuple[float, float], width: float) -> tuple[list[str], float]:
    """A bold title whole on one line or two, as large as `sizes` (largest, smallest) allow.

    Two lines are preferred to one below four fifths of the largest size. Only a title that does not fit
    in two lines of the smallest size ends with an ellipsis.
    """
    words = clean(words)
    largest, smallest = sizes
    one = largest * min(1.0, width / max(sheet.measure(words, largest, bold=True), 1e-9))
    if one >= 0.8 * largest:
        return [words], one
    pixels = largest
    while pixels > smallest:
        lines = _two_lines(sheet, words, pixels, width)
        if lines:
            return lines, pixels
        pixels = max(smallest, pixels - 0.5)
    lines = _two_lines(sheet, words, smallest, width)
    if lines:
        return lines, smallest
    half = _longest_start(sheet, words, smallest, width)
    return [words[:half], sheet.fit(words[half:], smallest, width, bold=True)], smallest


def _two_lines(sheet: Sheet, words: str, pixels: float, width: float) -> list[str]:
    """Both lines where they fit, broken at a blank, else within a long word; [] where not."""
    end = _longest_start(sheet, words, pixels, width)
    blanks = [place for place in range(1, end + 1) if words[place : place + 1] == " "][::-1]
    apart = [place for place in blanks if not words[place - 1].isdigit()]  # a number keeps its unit
    for cut in [*apart, *blanks, end]:
        if cut > 0 and sheet.measure(words[cut:].strip(), pixels, bold=True) <= width:
            return [words[:cut].strip(), words[cut:].strip()]
    return []


def _longest_start(sheet: Sheet, words: str, pixels: float, width: float) -> int:
    few, many = 0, len(words)
    while few < many:
        middle = (few + many + 1) // 2
        fits = sheet.measure(words[:middle], pixels, bold=True) <= width
        few, many = (middle, many) if fits else (few, middle - 1)
    return few
