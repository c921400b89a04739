"""Colours of the film and the overview, chosen to be told apart by colour-blind readers.

Lines differ in dash and marker as well as in colour, and words are never coloured to carry meaning.
"""

from __future__ import annotations

import matplotlib
import numpy as np

Array = np.ndarray

PAPER = "#fcfbf8"
INK = "#1d2733"
QUIET = "#59636e"  # contrast to the paper 5.9 : 1
GRID = "#dedbd3"
POTENTIAL = "#3d4b5c"
POTENTIAL_FILL = "#e6e4de"
CLOSE_UP = "#f1eee3"
ENERGY = "#a86400"
DETECTOR = "#00707c"
REGION = "#7a6a9b"
LAYER = "#b9b4a8"
PATH = "#c2185b"
CASING = "#ffffff"
ENVELOPE = "#8aa6c1"
SHADOW = "#d3d7da"
START = "#59636e"

# Running probabilities: colour, dash, marker.
CURVES = (("#0072b2", "-", "o"), ("#c04a00", (0, (5, 2)), "s"), ("#5a3d8a", (0, (1.5, 1.5)), "^"))

LINE_COLOURS = (PAPER, INK, POTENTIAL, ENERGY, DETECTOR, REGION, PATH, CLOSE_UP, *(c for c, _, _ in CURVES))

VERDICT_MARKS = {"trusted": "\u2713", "doubtful": "?", "failed": "\u2717"}

# The stripes of a phase this short are mixed with the envelope's colour so that they do not flicker.
CLEAREST_STRIPES = 24.0  # pixels a wavelength from which the full colours are used
FAINTEST = 0.45


def rgb(colour: str) -> Array:
    """`#rrggbb` as three bytes, shape (3,), uint8."""
    return np.array([int(colour[i : i + 2], 16) for i in (1, 3, 5)], dtype=np.uint8)


def table(name: str) -> Array:
    """A colour map of matplotlib as bytes, shape (256, 3)."""
    return matplotlib.colormaps[name](np.linspace(0, 1, 256), bytes=True)[:, :3].copy()


def density_table() -> Array:
    """Dark blue to yellow: perceptually uniform and the same to red-green blind eyes."""
    return table("cividis")


def phase_table(pixels_per_wavelength: float, shortest: float) -> Array:
    """The cyclic map from -180 to 180 degrees, shape (256, 3), paler towards `shortest` pixels.

    "twilight" keeps phases more than 60 degrees apart at least 14 units of CIELAB apart for normal
    sight and the three kinds of colour blindness; cmocean's "phase" and hsv fall to 1 and 0.
    """
    clearness = (pixels_per_wavelength - shortest) / (CLEAREST_STRIPES - shortest)
    share = FAINTEST + (1 - FAINTEST) * float(np.clip(clearness, 0, 1))
    mixed = share * table("twilight") + (1 - share) * rgb(ENVELOPE)
    return np.asarray(mixed.round(), dtype=np.uint8)
