"""What comes back from the ends of the grid, without a run of its own."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from ..simulate import Record

LATE = 0.75  # of the run: what has come back by then meets what is left from then on


def returned(record: Record) -> float:
    """By about how much a probability may change through what the edges sent back.

    A share R of what a layer took comes back, with an amplitude of sqrt(R absorbed); where it meets what is
    left, it changes probabilities by up to twice the product of both amplitudes. At ends that wrap because
    nothing was said about them, what reached the rim counts in full.
    """
    leaked = sum(check.value or 0.0 for check in record.checks if check.name == "edge leakage")
    back = sum(e.shape.reflected * record.absorbed[f"{record.plan.axis.name}.{e.side}"] for e in record.plan.endings)
    return leaked + back + 2 * math.sqrt(back * _left_late(record))


def _left_late(record: Record) -> float:
    """Probability on the grid late in the run."""
    times = record.frames.times
    late = times[0] + LATE * (times[-1] - times[0])
    return float(np.interp(late, times, record.frames.norm))


def with_part(record: Record, change: float, *, absorbed_only: bool = False) -> Record:
    """The record with a part "box" of `change` times the scale in all errors that know one.

    With `absorbed_only` just what the layers took: a run on a larger grid says nothing about that.
    """
    taken = {result.name for result in record.results if result.name.startswith("absorbed.")}
    touched = taken if absorbed_only else {r.name for r in record.results} - (of_what_is_left(record) - taken)
    results = tuple(
        result
        if result.error is None or result.name not in touched or result.scale is None
        else replace(
            result,
            error=result.error + change * result.scale,
            error_parts={**result.error_parts, "box": result.error_parts.get("box", 0.0) + change * result.scale},
        )
        for result in record.results
    )
    return replace(record, results=results)


def of_what_is_left(record: Record) -> frozenset[str]:
    """Results and columns that speak of what is on the grid: another grid holds something else, and rightly so."""
    names = {"norm", "norm.final", "norm.drift", "energy.drift", "ehrenfest.position", "ehrenfest.momentum"}
    for name in [*(result.name for result in record.results), *(column.name for column in record.columns)]:
        kind = name.split(".")[0]
        moment = kind in ("position", "momentum", "width", "force", "energy")
        if kind == "absorbed" or name.endswith(".undecided") or (moment and record.plan.endings):
            names.add(name)
    return frozenset(names)
