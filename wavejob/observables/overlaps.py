"""Overlaps of the field with a state that does not move."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Annotated, Any

import numpy as np
from pydantic import Field

from ..models import Choice, Item, Name
from ..packets.base import PacketError
from ..packets.item import PACKETS
from ..results import Column, Curve
from ..state import Look
from .base import Array, Bench, Meter, Observable, Outline, Series


class Overlap(Observable):
    """abs(<with, psi>)^2: how much of the field is in a given state."""

    name: Name = Field(description="name in the outputs")
    with_: Annotated[Item | str, Choice(PACKETS, "packet", words=("start",))] = Field(
        alias="with", description="`start` (the initial state) or a packet, such as `gaussian: {...}`"
    )

    def columns(self, outline: Outline) -> tuple[Column, ...]:
        return (Column(self.name, "number", "probability of the state"),)

    def figures(self, outline: Outline) -> tuple[Column, ...]:
        return (
            Column(f"{self.name}.final", "number", "probability of the state at the end"),
            Column(f"{self.name}.min", "number", "smallest probability of the state recorded"),
            Column(f"{self.name}.max", "number", "largest probability of the state recorded"),
        )

    def meter(self, bench: Bench) -> Meter:
        return OverlapMeter(bench, self)

    def unfit(self, bench: Bench, psi: Array) -> tuple[str, str, str] | None:
        try:
            self.meter(bench)
        except PacketError as error:
            return "with", error.message, error.fix
        return None


class OverlapMeter(Meter):
    def __init__(self, bench: Bench, overlap: Overlap) -> None:
        self.bench, self.name = bench, overlap.name
        self.state: Any = None
        if not isinstance(overlap.with_, str):
            packet = overlap.with_.body
            self.state = packet.field(bench.axis, bench.surroundings)[None, :].conj()

    def start(self, look: Look) -> None:
        if self.state is None:
            self.state = look.psi[0].conj()

    def row(self, look: Look) -> Sequence[float]:
        amplitude = np.sum(self.state * look.psi[0]) * self.bench.axis.spacing
        return [float(abs(amplitude) ** 2)]

    def results(self, series: Series, stride: int = 1) -> dict[str, float | None]:
        values = series.values[:, 0]
        return {
            f"{self.name}.final": float(values[-1]),
            f"{self.name}.min": float(values.min()),
            f"{self.name}.max": float(values.max()),
        }


class Autocorrelation(Observable):
    """The complex overlap <psi(0), psi(t)> as a curve."""

    name: Name = Field("autocorrelation", description="name in the outputs")

    def meter(self, bench: Bench) -> Meter:
        return AutocorrelationMeter(bench, self.name)


class AutocorrelationMeter(Meter):
    samples = True

    def __init__(self, bench: Bench, name: str) -> None:
        self.bench, self.name = bench, name
        self.state: Any = None
        self.rows: list[tuple[float, float, float, float]] = []

    def start(self, look: Look) -> None:
        self.state = look.psi[0].conj()

    def sample(self, look: Look) -> None:
        c = complex(np.sum(self.state * look.psi[0]) * self.bench.axis.spacing)
        self.rows.append((look.t, c.real, c.imag, abs(c)))

    def curves(self) -> list[Curve]:
        columns = (
            Column("time", "time"),
            Column(f"{self.name}.real", "number", "real part of <psi(0), psi(t)>"),
            Column(f"{self.name}.imag", "number", "imaginary part"),
            Column(f"{self.name}.abs", "number", "modulus"),
        )
        return [Curve(self.name, columns, np.array(self.rows))]
