"""Quantum wave packets from job files: write one text file, run one command."""

from .version import __version__

__all__ = ["__version__"]
