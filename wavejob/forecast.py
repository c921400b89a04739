"""How long a planned job will take and how much it will need: rough, from its sizes and a short measurement.

The constants were measured on one x86-64 machine, as multiples of a transform pair by numpy, timed anew on
the machine at hand. Other work on it, or error bars that ask for a finer run, can multiply the time.
"""

from __future__ import annotations

import math
import time
from dataclasses import dataclass
from functools import cache

import numpy as np

from .evolve.schedule import Schedule
from .limits import FIELD_BYTES, needs, total
from .observables.densities import Density
from .plan import Plan

LARGEST_TIMED = 2**13  # points; larger pairs are reckoned from this one by N log N
TIMED = 5  # pairs, of which the fastest counts

STAGE_SECONDS, STAGE_PAIRS = (
    4e-6,
    0.7,
)  # of one stage of a step: Python around it, and the work in numpy pairs
CHANGING_SECONDS = 4e-8  # more per point, stage and term whose factor is made anew at every step
LOOK_SECONDS, LOOK_PAIRS = 20e-6, 0.2  # of each observable at a recorded time or a sample
ALWAYS_LOOKED = 3  # what every run watches for its checks and pictures, in observables
PLAN_SECONDS = 0.3
BARS = 1.4  # a companion run on a coarser grid with a longer step costs 0.36 of the run
IMPORT_SECONDS, FRAME_SECONDS = 1.5, 0.015  # pictures: matplotlib, and each frame drawn and encoded

CELL_BYTES = 20  # of a number in a table
FRAME_BYTES_ON_DISK = 1200
PICTURE_BYTES = 250_000  # the overview, and what every folder holds


@dataclass(frozen=True)
class Forecast:
    """Seconds, and bytes of memory and disk."""

    seconds: float
    memory: int
    disk: int


def forecast(plan: Plan, *, bars: bool = True, film: bool = True) -> Forecast:
    """What carrying out `plan` will take; without its error bars or its film where these are not wanted."""
    frames = plan.frames if film else None
    held = needs(plan.job, plan.axis.points, plan.recorded, plan.sampled, frames, plan.step)
    return Forecast(_seconds(plan, bars, frames), int(total(held)), _disk(plan, frames))


def _seconds(plan: Plan, bars: bool, frames: Schedule | None) -> float:
    points, stages = plan.axis.points, plan.steps * plan.splitting.stages
    pair = _pair(min(points, LARGEST_TIMED)) * _work(points) / _work(min(points, LARGEST_TIMED))
    changing = sum(part.depends_on_time for part in plan.hamiltonian.parts)
    stage = STAGE_SECONDS + STAGE_PAIRS * pair + CHANGING_SECONDS * changing * points
    looks = (_count(plan.recorded) + _count(plan.sampled)) * (ALWAYS_LOOKED + len(plan.job.observables))
    loop = stages * stage + looks * (LOOK_SECONDS + LOOK_PAIRS * pair)
    pictures = IMPORT_SECONDS + FRAME_SECONDS * (_count(frames) if frames else 0)
    return PLAN_SECONDS + loop * (BARS if bars and plan.job.keys.error_bars != "none" else 1) + pictures


def _work(points: int) -> float:
    return points * math.log2(points)


@cache
def _pair(points: int) -> float:
    """Seconds of one transform there and back by numpy."""
    field = np.ones(points, complex)
    fastest = math.inf
    for _ in range(TIMED):
        begun = time.perf_counter()
        np.fft.ifft(np.fft.fft(field))
        fastest = min(fastest, time.perf_counter() - begun)
    return fastest


def _disk(plan: Plan, frames: Schedule | None) -> int:
    job, points = plan.job, plan.axis.points
    rows = _count(plan.recorded) * (1 + len(job.columns))
    fields = 1 + (_count(plan.every(job.keys.snapshots.every)) if job.keys.snapshots else 0)
    densities = sum(
        _count(plan.every(o.every) if o.every else plan.recorded) for o in job.observables if isinstance(o, Density)
    )
    stored = points * FIELD_BYTES * (fields + densities / 2)
    film = FRAME_BYTES_ON_DISK * _count(frames) if frames else 0
    return int(PICTURE_BYTES + CELL_BYTES * rows + stored + film)


def _count(schedule: Schedule) -> int:
    return -(-schedule.last // schedule.every) + 1
