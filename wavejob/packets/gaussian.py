"""Gaussian packets, alone and in sums."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

import numpy as np
from pydantic import Field, GetJsonSchemaHandler, model_validator
from pydantic.json_schema import JsonSchemaValue

from ..grid import Axis
from ..models import (
    Angle,
    Extent,
    Length,
    Model,
    Momentum,
    Number,
    PositiveEnergy,
    Velocity,
    Wavenumber,
    refuse,
)
from ..potentials.base import Toward, sign
from .base import Array, Packet, PacketError, Surroundings, normalised, waves

LEAST_LEFT = 1e-10  # of the probabilities of a sum's packets, below which they are said to cancel
ROOM = 6.0  # standard deviations a packet needs on both sides, in place and in wave number: 2e-9 is left outside


class GaussianPacket(Packet):
    """exp(-(x - at)^2 / (4 sigma^2) + i k (x - at))."""

    at: Length = Field(description="mean place")
    sigma: Extent = Field(description="standard deviation of place in |psi|^2")
    energy: PositiveEnergy | None = Field(
        None, description="of the central wave number, hbar^2 k^2 / 2m; needs `toward`", examples=["70 meV"]
    )
    toward: Toward | None = Field(None, description="direction of travel, with `energy`", examples=["+x"])
    wavenumber: Wavenumber | None = Field(None, description="mean wave number p / hbar, radians per length")
    momentum: Momentum | None = Field(None, description="mean momentum")
    velocity: Velocity | None = Field(None, description="mean velocity")

    @model_validator(mode="after")
    def _one_motion(self) -> GaussianPacket:
        given = [name for name in ("energy", "wavenumber", "momentum", "velocity") if getattr(self, name) is not None]
        if len(given) > 1:
            listed = " and ".join(f"`{name}`" for name in given)
            raise refuse(f"{listed} each set the motion of the packet", "keep one of them", at=given[1])
        if (self.energy is None) != (self.toward is None):
            missing = "toward" if self.toward is None else "energy"
            raise refuse(f"`{missing}` is missing", "`energy` and `toward: +x` or `-x` go together")
        return self

    def mean_wavenumber(self, mass: float) -> float:
        if self.energy is not None and self.toward is not None:
            return sign(self.toward) * float(np.sqrt(2 * mass * self.energy))
        if self.velocity is not None:
            return mass * self.velocity
        return self.wavenumber if self.wavenumber is not None else (self.momentum or 0.0)

    def field(self, axis: Axis, surroundings: Surroundings) -> Array:
        return normalised(waves(axis.x, self.at, self.sigma, self.mean_wavenumber(surroundings.mass)), axis)

    def extent(self) -> tuple[float, float]:
        return self.at - ROOM * self.sigma, self.at + ROOM * self.sigma

    def widest_wavenumber(self, mass: float) -> float:
        return abs(self.mean_wavenumber(mass)) + ROOM / (2 * self.sigma)


def overlaps(packets: Sequence[GaussianPacket], mass: float) -> Array:
    """<a, b> of all pairs of Gaussian packets in closed form, shape (packets, packets)."""
    at = np.array([packet.at for packet in packets])
    narrow = 1 / (4 * np.array([packet.sigma for packet in packets]) ** 2)
    k = np.array([packet.mean_wavenumber(mass) for packet in packets])
    total, product = narrow[:, None] + narrow, narrow[:, None] * narrow
    apart, turning = at[:, None] - at, k - k[:, None]
    # Phases are counted from the first packet of a pair, which keeps them small.
    middle = -narrow * apart / total
    phase = turning * middle + k * apart
    size = np.sqrt(2 * np.sqrt(product) / total) * np.exp(-product / total * apart**2 - turning**2 / (4 * total))
    return np.asarray(size * np.exp(1j * phase))


class Summand(Model):
    """One packet of a sum."""

    weight: Number = Field(1.0, description="amplitude (not probability) before normalising")
    phase: Angle = Field(0.0, description="phase of the amplitude, radians")
    gaussian: GaussianPacket = Field(description="the packet")


class SumPacket(Packet):
    """Gaussian packets added with their amplitudes and phases, then normalised."""

    parts: list[Summand] = Field(description="the packets", min_length=1, max_length=100)

    @classmethod
    def __get_pydantic_json_schema__(cls, schema: Any, handler: GetJsonSchemaHandler) -> JsonSchemaValue:
        whole = handler(schema)
        return {"anyOf": [handler.resolve_ref_schema(whole)["properties"]["parts"], whole]}

    @model_validator(mode="before")
    @classmethod
    def _bare_list(cls, value: object) -> object:
        return {"parts": value} if isinstance(value, list) else value

    @model_validator(mode="after")
    def _not_nothing(self) -> SumPacket:
        if all(part.weight == 0 for part in self.parts):
            raise refuse("all weights of the sum are 0", "give one packet a weight")
        return self

    @property
    def amplitudes(self) -> Array:
        """Complex amplitudes of the packets, the largest of modulus 1."""
        weights = np.array([part.weight for part in self.parts])
        return np.asarray(weights / np.abs(weights).max() * np.exp(1j * np.array([part.phase for part in self.parts])))

    def field(self, axis: Axis, surroundings: Surroundings) -> Array:
        total = np.zeros(axis.points, complex)
        for part, amplitude in zip(self.parts, self.amplitudes, strict=True):
            one = part.gaussian
            total += amplitude * waves(axis.x, one.at, one.sigma, one.mean_wavenumber(surroundings.mass))
        return normalised(total, axis)

    def check(self, mass: float) -> None:
        amplitudes = self.amplitudes
        norm = (amplitudes.conj() @ overlaps([part.gaussian for part in self.parts], mass) @ amplitudes).real
        if not norm > LEAST_LEFT * np.sum(np.abs(amplitudes) ** 2):
            raise PacketError("the packets of the sum cancel each other", "change a weight, a phase or a packet")

    def extent(self) -> tuple[float, float]:
        extents = [part.gaussian.extent() for part in self.parts]
        return min(low for low, _ in extents), max(high for _, high in extents)

    def widest_wavenumber(self, mass: float) -> float:
        return max(part.gaussian.widest_wavenumber(mass) for part in self.parts)
