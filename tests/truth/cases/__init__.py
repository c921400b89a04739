"""The cases of the catalogue: job texts, and what should come out of them according to others."""

from . import curves, levels, motion, sharp, smooth
from .case import Case

CASES: tuple[Case, ...] = (*sharp.CASES, *smooth.CASES, *motion.CASES, *levels.CASES, *curves.CASES)
