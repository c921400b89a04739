"""A picture in pixels, counted from its upper left corner, on which matplotlib draws single artists."""

from __future__ import annotations

import warnings
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any

import matplotlib
import numpy as np
from matplotlib.artist import Artist
from matplotlib.backends.backend_agg import FigureCanvasAgg
from matplotlib.figure import Figure
from matplotlib.font_manager import FontProperties
from matplotlib.lines import Line2D
from matplotlib.patches import Polygon
from matplotlib.text import Text
from matplotlib.transforms import Bbox, IdentityTransform

from .palette import INK, PAPER
from .wording import clean

Array = np.ndarray

DPI = 100
ELLIPSIS = "\u2026"


@dataclass(frozen=True)
class Rect:
    """A rectangle of whole pixels."""

    left: int
    top: int
    width: int
    height: int

    @property
    def right(self) -> int:
        return self.left + self.width

    @property
    def bottom(self) -> int:
        return self.top + self.height


@dataclass(frozen=True)
class Panel:
    """A rectangle with a scale along each side; `y_low` lies at its bottom unless y runs `downward`."""

    rect: Rect
    x_low: float
    x_high: float
    y_low: float
    y_high: float
    downward: bool = False

    def across(self, x: Any) -> Any:
        """Pixels from the left edge of the picture."""
        return self.rect.left + (x - self.x_low) / (self.x_high - self.x_low) * self.rect.width

    def down(self, y: Any) -> Any:
        """Pixels from the upper edge of the picture."""
        share = (y - self.y_low) / (self.y_high - self.y_low)
        return self.rect.top + (share if self.downward else 1 - share) * self.rect.height

    def shows(self, x: float) -> bool:
        return self.x_low <= x <= self.x_high


@contextmanager
def plain_matplotlib() -> Iterator[None]:
    """matplotlib as it comes, whatever the user's own settings; letters the font lacks are no warning."""
    defaults = {k: v for k, v in matplotlib.rcParamsDefault.items() if not k.startswith(("backend", "interactive"))}
    with warnings.catch_warnings(), matplotlib.rc_context(defaults):
        warnings.filterwarnings("ignore", message="Glyph .* missing from")
        warnings.filterwarnings("ignore", message="Matplotlib currently does not support")
        yield


class Sheet:
    """One picture of `size` pixels. Texts are never read as formulas."""

    def __init__(self, size: tuple[int, int]) -> None:
        self.width, self.height = size
        self.figure = Figure(figsize=(self.width / DPI, self.height / DPI), dpi=DPI, facecolor=PAPER)
        self.canvas = FigureCanvasAgg(self.figure)
        self.renderer = self.canvas.get_renderer()

    def draw(self) -> Array:
        """Draws everything that is not animated; the pixels, shape (height, width, 4), to be written in."""
        self.canvas.draw()
        self.renderer = self.canvas.get_renderer()
        return np.asarray(self.canvas.buffer_rgba())

    def paint(self, *artists: Artist) -> None:
        """Draws these artists onto the pixels as they are now."""
        for artist in artists:
            artist.draw(self.renderer)

    def text(
        self,
        x: float,
        y: float,
        words: str,
        pixels: float,
        *,
        colour: str = INK,
        align: str = "left",
        upright: str = "baseline",
        bold: bool = False,
        rotation: float = 0,
        moving: bool = False,
    ) -> Text:
        artist = Text(
            x,
            self.height - y,
            clean(words),
            fontsize=pixels * 72 / DPI,
            color=colour,
            ha=align,
            va=upright,
            weight="bold" if bold else "normal",
            rotation=rotation,
            rotation_mode="anchor",
            parse_math=False,
            transform=IdentityTransform(),
            animated=moving,
        )
        self.figure.add_artist(artist)
        return artist

    def line(
        self,
        x: Any,
        y: Any,
        colour: str,
        width: float = 1.0,
        *,
        dash: Any = "-",
        within: Rect | None = None,
        marker: str = "",
        moving: bool = False,
        order: float = 2,
    ) -> Line2D:
        """A line or, with `marker`, single points of `width` pixels; clipped to the rectangle `within`."""
        artist = Line2D(
            np.asarray(x, dtype=float),
            self.height - np.asarray(y, dtype=float),
            color=colour,
            linewidth=0 if marker else width * 72 / DPI,
            linestyle=dash,
            marker=marker or None,
            markersize=width * 72 / DPI,
            markeredgewidth=0,
            transform=IdentityTransform(),
            animated=moving,
            zorder=order,
            solid_joinstyle="round",
            solid_capstyle="butt",
        )
        self.figure.add_artist(artist)
        if within is not None:
            artist.set_clip_box(self.box(within))
        return artist

    def move(self, line: Line2D, x: Any, y: Any) -> None:
        line.set_data(np.asarray(x, dtype=float), self.height - np.asarray(y, dtype=float))

    def area(
        self,
        x: Any,
        y: Any,
        colour: str,
        *,
        within: Rect,
        hatch: str = "",
        moving: bool = False,
        order: float = 1,
    ) -> Polygon:
        """A filled polygon, or a hatched one with nothing behind the hatch."""
        artist = Polygon(
            self.corners(x, y),
            closed=True,
            facecolor="none" if hatch else colour,
            edgecolor=colour,
            linewidth=0,
            hatch=hatch or None,
            transform=IdentityTransform(),
            animated=moving,
            zorder=order,
        )
        self.figure.add_artist(artist)
        artist.set_clip_box(self.box(within))
        return artist

    def rectangle(self, rect: Rect, colour: str, *, hatch: str = "", order: float = 1) -> Polygon:
        x, y = [rect.left, rect.right, rect.right, rect.left], [rect.top, rect.top, rect.bottom, rect.bottom]
        return self.area(x, y, colour, within=rect, hatch=hatch, order=order)

    def corners(self, x: Any, y: Any) -> Array:
        """Corner points as matplotlib counts them, shape (n, 2)."""
        return np.column_stack([np.asarray(x, dtype=float), self.height - np.asarray(y, dtype=float)])

    def box(self, rect: Rect) -> Bbox:
        return Bbox.from_extents(rect.left, self.height - rect.bottom, rect.right, self.height - rect.top)

    def measure(self, words: str, pixels: float, bold: bool = False) -> float:
        """Width of a text in pixels."""
        font = FontProperties(size=pixels * 72 / DPI, weight="bold" if bold else "normal")
        return float(self.renderer.get_text_width_height_descent(clean(words) or " ", font, False)[0])

    def fit(self, words: str, pixels: float, width: float, bold: bool = False) -> str:
        """`words`, with an ellipsis for the end that does not fit into `width`."""
        words = clean(words)
        if self.measure(words, pixels, bold) <= width:
            return words
        few, many = 0, len(words)
        while few < many:
            middle = (few + many + 1) // 2
            fits = self.measure(words[:middle].rstrip() + ELLIPSIS, pixels, bold) <= width
            few, many = (middle, many) if fits else (few, middle - 1)
        return words[:few].rstrip() + ELLIPSIS

    def shrink(self, words: str, pixels: float, width: float, smallest: float) -> float:
        """The size, from `pixels` down to `smallest`, at which `words` fit into `width`."""
        needed = self.measure(words, pixels)
        return max(smallest, min(pixels, pixels * width / needed if needed else pixels))

    def texts(self) -> list[Text]:
        """Every text that is visible and not empty."""
        return [t for t in self.figure.findobj(Text) if t.get_visible() and t.get_text()]
