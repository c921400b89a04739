"""A job: the whole checked job file in scaled units, ready to be planned. `loading.py` makes it."""

from __future__ import annotations

import hashlib
import json
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import cached_property
from pathlib import Path
from typing import Any

from .models import Item
from .observables.base import Observable, Outline
from .observables.levels import StartLevel
from .observables.swarm import OWN_FIGURES, by_newton
from .packets.base import Packet, Surroundings
from .packets.eigenstate import EigenstatePacket
from .potentials.base import Setting
from .problems import Problem
from .reading.merging import Key, Merged
from .reading.quantities import Named, Units
from .reading.tree import JobTree
from .reading.validation import problem_at
from .results import Accuracy, Column
from .settings import EvolveKeys, JobKeys
from .shapes import Landscape
from .version import NUMERICS

DEFAULT_ACCURACY = 1e-4


@dataclass(frozen=True)
class Particle:
    """Mass in scaled units, charge in units of e."""

    mass: float
    charge: float


@dataclass(frozen=True)
class Varied:
    """What one varied key is in a variant: its text, and where that is a quantity, its value in scaled units."""

    key: str
    text: str
    value: float | None = None
    dimension: str = "number"

    def __str__(self) -> str:
        return f"{self.key} = {self.text}"


@dataclass(frozen=True)
class Job:
    """A checked job. Lengths, times and energies are in scaled units (hbar = 1); `units` turns them back."""

    id: str
    path: Path
    text: str  # the job file as it was
    document: Merged = field(repr=False)
    keys: JobKeys = field(repr=False)
    units: Units
    particle: Particle
    tree: JobTree
    variant: tuple[Varied, ...] = ()  # of a varied job: what sets this one apart
    expected_at: tuple[int, ...] | None = None  # places in the file of the expectations kept; None: all are

    @property
    def title(self) -> str:
        return ", ".join([self.keys.job or self.id, *map(str, self.variant)])

    @property
    def name(self) -> str:
        """The id, and what sets a variant apart: `stack/scan (b2 = 2.9 nm)`."""
        return f"{self.id} ({', '.join(map(str, self.variant))})" if self.variant else self.id

    @property
    def evolve(self) -> EvolveKeys:
        return self.keys.evolve

    @property
    def packet(self) -> Packet:
        packet: Packet = self.keys.packet.body
        return packet

    @property
    def accuracy(self) -> Accuracy:
        """The numerical error wanted in the results."""
        given = self.evolve.accuracy
        if given is None:
            return Accuracy(DEFAULT_ACCURACY)
        return Accuracy(given) if isinstance(given, float) else Accuracy(given.down_to, given.relative)

    @property
    def setting(self) -> Setting:
        return Setting(self.particle.mass, self.particle.charge, self.units)

    @cached_property
    def landscape(self) -> Landscape:
        """The potential as it is meant."""
        return Landscape(tuple(item.term(self.setting) for item in self.keys.potential))

    @property
    def surroundings(self) -> Surroundings:
        return Surroundings(self.setting, self.landscape, self.evolve.start)

    @property
    def observables(self) -> list[Observable]:
        items = self.keys.observables
        return [] if items is None else [item.body for item in items]

    @property
    def measured(self) -> list[Observable]:
        """The observables, and what is always asked about the packet."""
        packet = self.packet
        return [*self.observables, *([StartLevel(packet=packet)] if isinstance(packet, EigenstatePacket) else [])]

    @cached_property
    def layers(self) -> tuple[str, ...]:
        """Names of the absorbing ends, "x.low" and "x.high"."""
        ends = self.keys.edges.x
        return tuple(f"x.{side}" for side in ("low", "high") if not isinstance(getattr(ends, side), str))

    @property
    def outline(self) -> Outline:
        return Outline(("x",), self.layers)

    @cached_property
    def columns(self) -> dict[str, Column]:
        """The columns of the time series, by name."""
        return {column.name: column for o in self.measured for column in o.columns(self.outline)}

    @cached_property
    def figures(self) -> dict[str, Column]:
        """The results the run will yield, by name."""
        found = {figure.name: figure for o in self.measured for figure in o.figures(self.outline)}
        return found | {figure.name: figure for figure in self.classical_figures}

    @cached_property
    def classical_figures(self) -> tuple[Column, ...]:
        """Those of the results that F = m a yields."""
        if isinstance(self.keys.classical, str):
            return ()
        shared = (figure for o in self.measured for figure in o.classical_figures(self.outline))
        return (*(by_newton(figure) for figure in shared), *OWN_FIGURES)

    def expectation(self, number: int) -> Key:
        """Where an expectation stands in the file."""
        return "expect", number if self.expected_at is None else self.expected_at[number]

    def problem(self, path: Key, message: str, fix: str = "", severity: str = "error") -> Problem:
        """A problem at a key of the job file."""
        return problem_at(self.document, path, message, fix, severity=severity)

    def write(self, value: float, dimension: str) -> str:
        """A quantity as a user would write it, to four digits."""
        return self.units.rounded(value, dimension)

    @cached_property
    def fingerprint(self) -> str:
        """A short hash of what decides the numbers: not titles, pictures, expectations or choices made here."""
        keys = self.keys
        decisive = {
            "numerics": NUMERICS,
            "units": [self.units.label(d) for d in ("length", "time", "energy")],
            "particle": [self.particle.mass, self.particle.charge],
            **{
                name: plain(getattr(keys, name))
                for name in ("grid", "potential", "edges", "packet", "evolve", "observables", "snapshots")
            },
        }
        for name in ("classical", "error_bars"):
            if name in keys.model_fields_set:
                decisive[name] = plain(getattr(keys, name))
        text = json.dumps(decisive, sort_keys=True, allow_nan=False)
        return hashlib.sha256(text.encode()).hexdigest()[:10]


def plain(value: Any) -> Any:
    """A model as plain data: kinds by name, scaled numbers, digests for files."""
    if isinstance(value, Item):
        beside = {n: plain(getattr(value, n)) for n in type(value).model_fields if n != f"{value.kind}_"}
        return {value.kind: plain(value.body), **{k: v for k, v in beside.items() if v is not None}}
    if hasattr(value, "digest"):
        return value.digest
    if isinstance(value, Named):
        return [value.value, value.dimension]
    if hasattr(type(value), "model_fields"):
        data = {name: plain(getattr(value, name)) for name in type(value).model_fields}
        return {**data, **{k: plain(v) for k, v in (value.__pydantic_extra__ or {}).items()}}
    if isinstance(value, (list, tuple)):
        return [plain(item) for item in value]
    if isinstance(value, Mapping):
        return {str(k): plain(v) for k, v in value.items()}
    # Rounding may differ between two ways to write one quantity: 2 ps and 2000 fs are the same job.
    return float(f"{value:.12g}") if isinstance(value, float) else value
