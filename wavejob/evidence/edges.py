"""What comes back from the ends of the grid, without a run of its own."""

from __future__ import annotations

import math
from dataclasses import replace

import numpy as np

from ..results import Result
from ..simulate import Record

UNSEEN = 0.5  # of the predicted change, over the value, that counts beside what a run measured
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


def with_part(record: Record, change: float, *, measured: bool = False) -> Record:
    """The record with a part "box" of `change` times the scale in all errors that know one.

    Where a run on a larger grid has measured it, that says nothing about what the layers took. To other
    probabilities a part of `change` is added in proportion: one such run may see little by chance.
    """
    taken = {result.name for result in record.results if result.name.startswith("absorbed.")}
    untouched = of_what_is_left(record) - taken

    def part(result: Result) -> float:
        if result.name in untouched or result.scale is None:
            return 0.0
        if not measured or result.name in taken:
            return change * result.scale
        return UNSEEN * change * abs(result.value or 0.0) if result.dimension == "number" else 0.0

    results = tuple(
        result
        if result.error is None or part(result) == 0
        else replace(
            result,
            error=result.error + part(result),
            error_parts={**result.error_parts, "box": result.error_parts.get("box", 0.0) + part(result)},
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
