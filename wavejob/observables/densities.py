"""Densities kept in fields.nc."""

from __future__ import annotations

from pydantic import Field

from ..models import Duration
from .base import Bench, Meter, Observable


class Density(Observable):
    """Probability per length at regular times, in fields.nc."""

    every: Duration | None = Field(None, description="time between two; left out: the recorded times")

    def meter(self, bench: Bench) -> Meter:
        return Meter()


class MomentumDensity(Density):
    """Probability per wave number at regular times, in fields.nc."""
