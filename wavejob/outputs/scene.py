"""What the film and the overview draw: plain arrays in the file's units, no physics."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Literal

import numpy as np

Array = np.ndarray

Detector = tuple[str, float, Literal["+", "-"]]  # name, x, the direction it counts
Region = tuple[str, float, float]  # name, from, to
Probability = tuple[str, Array]  # label, values (F,)


@dataclass(frozen=True, eq=False)
class Scene:
    """One run, ready to draw. F frames, M points of x, P points of the potential.

    Lengths, times and energies are in the file's units, whose labels are given; a label "" stands for
    natural units. The particle density is per length. Raises ValueError where shapes disagree.
    """

    title: str
    subtitle: str  # particle, box, points, step: one line
    fingerprint: str
    length_label: str
    time_label: str
    energy_label: str
    x: Array  # (M,), rising
    times: Array  # (F,), rising
    density: Array  # (F, M), |psi|^2, not divided by the norm
    mean_energy: Array  # (F,), nan where there is none
    potential_x: Array  # (P,) or (F, P), not falling; a vertical edge is an x given twice
    potential: Array  # (P,), or (F, P) where it depends on time
    phase: Array | None = None  # (F, M), radians
    wavelength: float | None = None  # the shortest that matters; None where phases cannot be drawn
    verdict: str = ""  # "trusted", "doubtful", "failed", or "" where not judged
    layers: tuple[tuple[float, float], ...] = ()  # absorbing, (from, to)
    walls: tuple[float, ...] = ()  # where the field vanishes
    detectors: tuple[Detector, ...] = ()
    regions: tuple[Region, ...] = ()
    probabilities: tuple[Probability, ...] = ()  # the first three are drawn
    classical_path: Array | None = None  # (F,), mean position by F = m a, nan where it has left
    view: tuple[float, float] | None = None  # part of x to show; None for all of it
    # The overview alone:
    results: tuple[tuple[str, str], ...] = ()  # (name, value with error bar and unit), most wanted first
    failed_checks: tuple[str, ...] = ()  # what failed and what to change, one line each
    wavenumber: Array | None = None  # (K,), rising, in 1 / length
    momentum_start: Array | None = None  # (K,), density per wavenumber
    momentum_end: Array | None = None  # (K,)

    def __post_init__(self) -> None:
        frames, points = self.times.size, self.x.size
        if frames < 1 or points < 2:
            raise ValueError("a scene needs at least one time and two points")
        of_all = self.potential.shape[-1]
        wanted: dict[str, tuple[Array | None, tuple[tuple[int, ...], ...]]] = {
            "density": (self.density, ((frames, points),)),
            "phase": (self.phase, ((frames, points),)),
            "mean_energy": (self.mean_energy, ((frames,),)),
            "classical_path": (self.classical_path, ((frames,),)),
            "potential": (self.potential, ((of_all,), (frames, of_all))),
            "potential_x": (self.potential_x, ((of_all,), (frames, of_all))),
        }
        wanted |= {f"probability {label}": (values, ((frames,),)) for label, values in self.probabilities}
        if self.wavenumber is not None:
            wanted |= {
                "momentum_start": (self.momentum_start, (self.wavenumber.shape,)),
                "momentum_end": (self.momentum_end, (self.wavenumber.shape,)),
            }
        for name, (values, shapes) in wanted.items():
            if values is not None and values.shape not in shapes:
                raise ValueError(f"{name} has the shape {values.shape}, wanted is one of {shapes}")

    @property
    def frames(self) -> int:
        return self.times.size

    @property
    def potential_moves(self) -> bool:
        return self.potential.ndim == 2 or self.potential_x.ndim == 2

    def potential_at(self, frame: int) -> tuple[Array, Array]:
        """x and V of the potential in one frame, each of shape (P,)."""
        x = self.potential_x[frame] if self.potential_x.ndim == 2 else self.potential_x
        v = self.potential[frame] if self.potential.ndim == 2 else self.potential
        return x, v
