"""Every kind there is, by the name it has in a job file.

To add a kind: write the class (the recipe stands in the base class of its family), add one line to the table of
its family, and one job in jobs/ that uses it. Reading, messages, schema, `explain` and the reference text follow.
"""

from __future__ import annotations

from .models import Model
from .observables.base import Observable
from .observables.densities import Density, MomentumDensity
from .observables.levels import Levels
from .observables.moments import Ehrenfest, Energy, Force, Momentum, Norm, Position, Width
from .observables.overlaps import Autocorrelation, Overlap
from .observables.places import Crossing, Inside
from .observables.spectrum import Spectrum
from .observables.timing import Arrival, Dwell
from .observables.transmission import Transmission
from .packets.item import PACKETS
from .potentials.item import POTENTIALS
from .time_shapes import FACTORS, PATHS

OBSERVABLES: dict[str, type[Observable]] = {
    "norm": Norm,
    "position": Position,
    "momentum": Momentum,
    "width": Width,
    "energy": Energy,
    "force": Force,
    "ehrenfest": Ehrenfest,
    "inside": Inside,
    "crossing": Crossing,
    "arrival": Arrival,
    "dwell": Dwell,
    "transmission": Transmission,
    "levels": Levels,
    "overlap": Overlap,
    "autocorrelation": Autocorrelation,
    "spectrum": Spectrum,
    "density": Density,
    "momentum_density": MomentumDensity,
}

FAMILIES: dict[str, dict[str, type[Model]]] = {
    "potential": dict(POTENTIALS),
    "packet": dict(PACKETS),
    "observable": dict(OBSERVABLES),
    "in_time": dict(FACTORS),
    "path": dict(PATHS),
}

# Kinds and keys of the job-file format that this version reads but cannot carry out; `*` stands for any one.
NOT_YET: tuple[tuple[str, ...], ...] = (
    ("channels",),
    ("derive",),
    ("average",),
    ("magnetic",),
    ("mean_field",),
    ("grid", "y"),
    ("grid", "z"),
    ("edges", "y"),
    ("edges", "z"),
    ("particle", "mass_profile"),
    ("particle", "mass", "x"),
    ("particle", "mass", "y"),
    ("particle", "mass", "z"),
    ("potential", "*", "slits"),
    ("potential", "*", "image"),
    ("potential", "*", "channel"),
    ("potential", "*", "*", "axis"),
    ("potential", "*", "path", "y"),
    ("potential", "*", "path", "z"),
    ("packet", "channel"),
    ("packet", "*", "axis"),
    ("observables", "*", "populations"),
    ("expect", "*", "equals_result"),
)
