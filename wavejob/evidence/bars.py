"""Error bars: what a companion run says about the figures of a run."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from ..results import Curve, Result
from ..simulate import Record
from .companions import Companion

Array = np.ndarray

SMOOTH = 1.0  # times the difference to a coarser companion; by trial on the catalogue in tests/truth
SHARP = 3.0  # the same where the potential has sharp edges: errors then shrink less regularly
FINER = 1.5  # times the difference to a finer companion, which is itself not free of error
HOPELESS = 0.5  # of the scale: a difference beyond this is no error bar
NEIGHBOURS = 2  # rows on both sides whose largest difference counts: a difference that changes sign is not small


def factor(record: Record, companion: Companion) -> float:
    """By what the difference to the companion is multiplied."""
    if not companion.coarser:
        return FINER
    sharp = any(term.shape.breaks is not None for term in record.plan.job.landscape.terms)
    return SHARP if sharp else SMOOTH


def with_bars(record: Record, companion: Companion, other: Record) -> Record:
    """`record` with the error of every result, column and curve from the run of its companion."""
    weight = factor(record, companion)
    part = _named(companion)
    theirs = {result.name: result for result in other.results}
    results = tuple(_barred(record, r, theirs[r.name], weight, part) for r in record.results)
    rows = min(len(record.times), len(other.times))
    difference = np.abs(record.series[:rows] - other.series[:rows])
    floor = rounding(record) * np.maximum(np.abs(record.series), _scales(record))
    errors = floor.copy()
    errors[:rows] += weight * _envelope(difference)
    curves = {
        mine.name: _curve_errors(mine, their, weight, rounding(record))
        for mine, their in zip(record.curves, other.curves, strict=True)
    }
    return replace(record, results=results, series_errors=errors, curve_errors=curves)


def rounding(record: Record) -> float:
    """Relative size of all rounding errors together: what they did to norm + absorbed."""
    return record.norm_drift + 1e-14


def worst(record: Record) -> float:
    """The largest error over its scale."""
    ratios = [r.error / r.scale for r in record.results if r.error is not None and r.scale]
    return max(ratios, default=0.0)


def _named(companion: Companion) -> str:
    parts = [n for n, ratio in (("step", companion.step), ("grid", companion.points)) if abs(ratio - 1) > 1e-9]
    return " and ".join(parts)


def _barred(record: Record, mine: Result, theirs: Result, weight: float, part: str) -> Result:
    if mine.value is None or theirs.value is None:
        return replace(mine, error_status="not_converging" if mine.value is not None else "off")
    difference = abs(mine.value - theirs.value)
    scale = mine.scale or 1.0
    parts = {**mine.error_parts, part: weight * difference, "rounding": rounding(record) * max(abs(mine.value), scale)}
    thinned = record.thinned.get(mine.name)
    if thinned is not None and thinned != mine.value:
        parts["recording"] = abs(thinned - mine.value)
    status = "not_converging" if difference > HOPELESS * scale else "estimated"
    return replace(mine, error=sum(parts.values()), error_parts=parts, error_status=status)


def _scales(record: Record) -> Array:
    return np.array([record.plan.bench.scale(column.dimension) for column in record.columns])


def _envelope(values: Array) -> Array:
    """The largest of each value and its neighbours, along the first axis."""
    padded = np.pad(values, ((NEIGHBOURS, NEIGHBOURS), (0, 0)), mode="edge")
    windows = [padded[i : i + len(values)] for i in range(2 * NEIGHBOURS + 1)]
    return np.asarray(np.fmax.reduce(windows))


def _curve_errors(mine: Curve, theirs: Curve, weight: float, floor: float) -> dict[str, Array]:
    """Errors of all columns but the first: nan where there is no value, or none to compare it with."""
    errors = {}
    for index, column in enumerate(mine.columns[1:], 1):
        difference = np.abs(mine.rows[:, index] - _at_places(theirs, index, mine.rows[:, 0]))[:, None]
        total = weight * _envelope(difference)[:, 0] + floor + mine.errors.get(column.name, 0.0)
        errors[column.name] = np.where(np.isnan(mine.rows[:, index]), np.nan, total)
    return errors


def _at_places(curve: Curve, index: int, places: Array) -> Array:
    """One column of a curve, interpolated where its own places are others."""
    from scipy.interpolate import make_interp_spline

    if np.array_equal(curve.rows[:, 0], places):
        return np.asarray(curve.rows[:, index])
    return np.asarray(make_interp_spline(curve.rows[:, 0], curve.rows[:, index], k=5)(places))
