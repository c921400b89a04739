"""Potentials with sharp edges or corners."""

from __future__ import annotations

from pydantic import Field, model_validator

from ..models import Energy, Extent, Length, Model, PositiveEnergy, in_order
from ..shapes import Breaks, Shape
from .base import Potential, Setting


class Step(Potential):
    """`height` where x > at, 0 before."""

    at: Length = Field(description="place of the edge")
    height: Energy = Field(description="value beyond the edge")

    def shape(self, setting: Setting) -> Shape:
        return Shape.sharp(Breaks.of((self.at, self.height, 0.0)))


def between(start: float, stop: float, height: float) -> Shape:
    """`height` from `start` to `stop`, 0 elsewhere."""
    return Shape.sharp(Breaks.of((start, height, 0.0), (stop, -height, 0.0)))


class Between(Potential):
    """Base of what stands between two places."""

    start: Length = Field(alias="from", description="left edge")
    stop: Length = Field(alias="to", description="right edge")

    @model_validator(mode="after")
    def _ordered(self) -> Between:
        in_order(self, "start", "stop")
        return self


class Barrier(Between):
    """`height` between `from` and `to`, 0 elsewhere."""

    height: Energy = Field(description="value between the edges")

    def shape(self, setting: Setting) -> Shape:
        return between(self.start, self.stop, self.height)


class Well(Between):
    """-depth between `from` and `to`, 0 elsewhere."""

    depth: PositiveEnergy = Field(description="how far below 0 the floor lies, positive")

    def shape(self, setting: Setting) -> Shape:
        return between(self.start, self.stop, -self.depth)


class Bias(Between):
    """0 before `from`, a straight fall by `drop`, then flat at -drop from `to` on."""

    drop: Energy = Field(description="how far the energy falls from `from` to `to`")

    def shape(self, setting: Setting) -> Shape:
        slope = -self.drop / (self.stop - self.start)
        return Shape.sharp(Breaks.of((self.start, 0.0, slope), (self.stop, 0.0, -slope)))


class StackLayer(Model):
    """One layer of a stack."""

    thickness: Extent = Field(description="extent of the layer")
    height: Energy = Field(description="energy of its band edge")


class Stack(Potential):
    """Layers one after another from `at`; 0 before the first and after the last."""

    at: Length = Field(description="where the first layer begins")
    layers: list[StackLayer] = Field(description="the layers in order", min_length=1, max_length=1000)

    def shape(self, setting: Setting) -> Shape:
        edges, place, height = [], self.at, 0.0
        for layer in self.layers:
            edges.append((place, layer.height - height, 0.0))
            place, height = place + layer.thickness, layer.height
        edges.append((place, -height, 0.0))
        return Shape.sharp(Breaks.of(*edges))
