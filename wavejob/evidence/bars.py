"""Error bars: what a companion run says about the figures of a run."""

from __future__ import annotations

import math
from collections.abc import Sequence
from dataclasses import dataclass, replace

import numpy as np

from ..checks import ROUNDING
from ..results import Accuracy, Curve, Result
from ..simulate import Record
from .companions import COARSER_POINTS, COARSER_STEP, Companion

Array = np.ndarray

SMOOTH = 1.0  # times the difference to a coarser companion; by trial on the catalogue in tests/truth
SHARP = 2.0  # the same where the potential has sharp edges: errors then shrink less regularly
SURE = 1.0  # power of the spacing with which errors shrink at least, where a run is compared with a much coarser one
FINER = 1.5  # times the difference to a finer companion, which is itself not free of error
KIN = 0.3  # of the largest difference over value of all probabilities, below which none counts: one of them may pass
# through zero where two errors cancel, while those of its kin do not. The same for mean values, over their scales
MEANS = ("position", "momentum", "width", "energy")
TRACE = 1e-3
HOPELESS = 0.5  # of the scale: a difference beyond this is no error bar
LEFT = 0.5  # probability on the grid at the end, below which mean values of the rest do not count
NEIGHBOURS = 2  # rows on both sides whose largest difference counts: a difference that changes sign is not small


@dataclass(frozen=True)
class Difference:
    """Two runs whose difference measures one part of the error, and what it is multiplied by."""

    part: str  # "step", "grid", "step and grid", ...
    mine: Record
    theirs: Record
    weight: float
    skips: frozenset[str] = frozenset()  # results and columns it says nothing about

    def of(self, name: str) -> float | None:
        """The weighted difference of a result; None where one of the two has no value."""
        if name in self.skips:
            return 0.0
        mine, theirs = self.mine.result(name).value, self.theirs.result(name).value
        return None if mine is None or theirs is None else self.weight * abs(mine - theirs)

    def of_series(self) -> Array:
        """The weighted difference of all columns at the recorded times, (rows, columns)."""
        known = np.array([column.name not in self.skips for column in self.mine.columns])
        return np.asarray(self.weight * known * _envelope(np.abs(self.mine.series - self.theirs.series)))

    def of_curve(self, curve: Curve, index: int) -> Array:
        """The weighted difference of one column of a curve, at the places of `curve`."""
        mine, theirs = (
            _at_places(next(c for c in record.curves if c.name == curve.name), index, curve.rows[:, 0])
            for record in (self.mine, self.theirs)
        )
        return self.weight * _envelope(np.abs(mine - theirs)[:, None])[:, 0]


def weight(record: Record, companion: Companion) -> float:
    """By what the difference of `record` to its companion is multiplied.

    The factors are for the usual companion. One that is coarser still errs by more, and less of the difference
    is the error of `record`: by as much as half the order of the splitting, and the spacing, make sure of.
    """
    if not companion.coarser:
        return FINER
    sharp = any(term.shape.breaks is not None for term in record.plan.job.landscape.terms)
    step = _share(companion.step, COARSER_STEP, record.plan.splitting.order / 2)
    grid = _share(1 / companion.points, 1 / COARSER_POINTS, SURE)
    return (SHARP if sharp else SMOOTH) * min(max(step, grid), 1.0)


def _share(ratio: float, usual: float, power: float) -> float:
    """The error over the difference for this ratio of steps or spacings, over the same for the usual ratio."""
    return float((usual**power - 1) / (ratio**power - 1)) if ratio > 1 else 0.0


def with_bars(record: Record, differences: Sequence[Difference], *, recording: bool = True) -> Record:
    """`record` with the error of every result, column and curve: the sum of all parts."""
    floor = record.norm_drift + 1e-15
    shared = {
        d.part: (0.0, 0.0) if d.skips else (_largest_share(record, d), _largest_mean(record, d)) for d in differences
    }
    series = floor * np.maximum(np.abs(record.series), _scales(record))
    return replace(
        record,
        results=tuple(_barred(record, result, differences, shared, recording) for result in record.results),
        series_errors=series + sum(d.of_series() for d in differences),
        curve_errors={curve.name: _curve_errors(curve, differences, floor) for curve in record.curves},
    )


def rounding(record: Record, value: float, scale: float, dimension: str) -> float:
    """What rounding errors may have done to a value: in proportion, as they did to norm + absorbed.

    An amplitude errs by the rounding error times the root of the number of transforms besides, which bounds
    what a small probability can mean.
    """
    drift = record.norm_drift + 1e-15
    if dimension != "number":
        return drift * max(abs(value), scale)
    pairs = record.steps * record.plan.splitting.stages
    amplitude = ROUNDING[record.plan.job.evolve.precision] * math.sqrt(pairs + 100)
    return drift * abs(value) + 2 * math.sqrt(abs(value)) * amplitude + amplitude**2


def worst(record: Record, wanted: Accuracy) -> float:
    """The largest error over what is wanted, of the results that count."""
    return max((r.error / wanted.limit(r) for r in counted(record) if r.error is not None), default=0.0)


def counted(record: Record) -> list[Result]:
    """The results that the accuracy wanted is for: those with expectations, or without any all of them.

    Mean values of what is left on the grid do not count once less than half is left: their errors grow as
    it goes, and say nothing about the rest of the run.
    """
    expected = {expect.result for expect in record.plan.job.keys.expect}
    if expected:
        return [result for result in record.results if result.name in expected]
    left = record.left
    return [
        result
        for result in record.results
        if left >= LEFT or result.dimension not in ("length", "momentum", "energy", "force")
    ]


def _is_probability(result: Result) -> bool:
    return result.dimension == "number" and result.name.partition(".")[2] not in ("drift", "position", "momentum")


def _is_mean(result: Result) -> bool:
    return result.dimension != "number" and result.name.split(".")[0] in MEANS


def _largest_share(record: Record, difference: Difference) -> float:
    """The largest difference over value of all probabilities that are no mere trace."""
    shares = [
        (difference.of(r.name) or 0.0) / abs(r.value)
        for r in record.results
        if r.value is not None and _is_probability(r) and abs(r.value) > TRACE and not _of_the_rest(r)
    ]
    return max(shares, default=0.0)


def _of_the_rest(result: Result) -> bool:
    """What is left on the grid is no kin of what left it: its error may be large beside its value."""
    return result.name.startswith("norm.") or result.name.endswith(".undecided")


def _largest_mean(record: Record, difference: Difference) -> float:
    """The largest difference over scale of all mean values."""
    shares = [(difference.of(r.name) or 0.0) / r.scale for r in record.results if _is_mean(r) and r.scale]
    return max(shares, default=0.0)


def _barred(
    record: Record,
    result: Result,
    differences: Sequence[Difference],
    shared: dict[str, tuple[float, float]],
    recording: bool,
) -> Result:
    if result.value is None:
        return result
    found = {d.part: d.of(result.name) for d in differences}
    probable, mean = abs(result.value) * _is_probability(result), (result.scale or 0.0) * _is_mean(result)
    least = {part: KIN * (of_values * probable + of_scales * mean) for part, (of_values, of_scales) in shared.items()}
    parts = {part: max(value, least[part]) for part, value in found.items() if value is not None}
    if len(parts) < len(found):
        return replace(result, error_parts={}, error_status="not_converging", note="a companion run has no such value")
    scale = result.scale or 1.0
    hopeless = any(value > HOPELESS * scale for value in parts.values())
    parts = {**result.error_parts, **parts, "rounding": rounding(record, result.value, scale, result.dimension)}
    thinned = record.thinned.get(result.name) if recording else None
    if thinned is not None and thinned != result.value:
        parts["recording"] = abs(thinned - result.value)
    return replace(
        result,
        error=sum(parts.values()),
        error_parts=parts,
        error_status="not_converging" if hopeless else "estimated",
    )


def _scales(record: Record) -> Array:
    return np.array([record.plan.bench.scale(column.dimension) for column in record.columns])


def _envelope(values: Array) -> Array:
    """The largest of each value and its neighbours, along the first axis."""
    padded = np.pad(values, ((NEIGHBOURS, NEIGHBOURS), (0, 0)), mode="edge")
    windows = [padded[i : i + len(values)] for i in range(2 * NEIGHBOURS + 1)]
    return np.asarray(np.fmax.reduce(windows))


def _curve_errors(curve: Curve, differences: Sequence[Difference], floor: float) -> dict[str, Array]:
    """Errors of all columns but the first: nan where there is no value, or none to compare it with."""
    errors = {}
    for index, column in enumerate(curve.columns[1:], 1):
        total = floor + curve.errors.get(column.name, 0.0) + sum(d.of_curve(curve, index) for d in differences)
        errors[column.name] = np.where(np.isnan(curve.rows[:, index]), np.nan, total)
    return errors


def _at_places(curve: Curve, index: int, places: Array) -> Array:
    """One column of a curve, interpolated where its own places are others."""
    from scipy.interpolate import make_interp_spline

    if np.array_equal(curve.rows[:, 0], places):
        return np.asarray(curve.rows[:, index])
    return np.asarray(make_interp_spline(curve.rows[:, 0], curve.rows[:, index], k=5)(places))
