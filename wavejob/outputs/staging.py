"""From a record in scaled units to the scene that film and overview draw."""

from __future__ import annotations

import numpy as np

from ..observables.overlaps import Overlap
from ..observables.places import Crossing, Inside
from ..observables.swarm import PREFIX
from ..plan import Plan
from ..results import Result
from ..simulate import Record
from .scene import Scene

Array = np.ndarray
SHOWN = 8  # results in the overview


def stage(record: Record) -> Scene:
    """Everything the pictures show, in the file's units."""
    plan, frames = record.plan, record.frames
    job, units = plan.job, plan.job.units
    length, clock, energy = (1 / units.scale(d) for d in ("length", "time", "energy"))
    times = np.array(frames.times)
    x, potential = drawn_potential(plan, times)
    k, start, end = _momenta(record)
    return Scene(
        title=job.title,
        subtitle=subtitle(plan),
        fingerprint=job.fingerprint,
        length_label=units.label("length"),
        time_label=units.label("time"),
        energy_label=units.label("energy"),
        x=frames.x * length,
        times=times * clock,
        density=np.array(frames.density) / np.float32(length),
        mean_energy=np.array(frames.energy) * energy,
        potential_x=x * length,
        potential=potential * energy,
        phase=np.array(frames.phase),
        wavelength=_wavelength(plan) * length,
        verdict=record.verdict,
        layers=_layers(plan, length),
        walls=(plan.axis.low * length, plan.axis.high * length) if plan.axis.transform == "sine" else (),
        detectors=tuple(
            (o.name, o.x * length, "+" if o.toward == "+x" else "-") for o in job.observables if isinstance(o, Crossing)
        ),
        regions=tuple((o.name, o.start * length, o.stop * length) for o in job.observables if isinstance(o, Inside)),
        probabilities=_probabilities(record, times),
        classical_path=_classical(record, times),
        view=None,
        results=tuple((r.name, _with_newton(record, r)) for r in _most_wanted(record)),
        failed_checks=tuple(f"{c.name}: {c.advice}" for c in record.checks if not c.passed),
        wavenumber=k / length,
        momentum_start=start * length,
        momentum_end=end * length,
    )


def subtitle(plan: Plan) -> str:
    """Grid and step in one line."""
    job = plan.job
    mass = f"mass {job.write(job.particle.mass, 'mass')}"
    particle = job.keys.particle if isinstance(job.keys.particle, str) else mass
    return (
        f"{particle}, {job.write(plan.axis.length, 'length')}, {plan.axis.points} points, "
        f"step {job.write(plan.step, 'time')}, order {plan.splitting.order}"
    )


def worded(plan: Plan, result: Result) -> str:
    """A result with its bar and unit, as a person would write it."""
    if result.value is None:
        return f"none: {result.note}"
    units = plan.job.units
    value = units.to_file(result.value, result.dimension)
    bar = "" if result.error is None else f" ± {units.to_file(result.error, result.dimension):.1g}"
    label = units.label(result.dimension)
    return f"{value:.6g}{bar}" + (f" {label}" if label else "")


def _most_wanted(record: Record) -> list[Result]:
    """Results that the job has expectations on, then those of detectors and regions, then the rest."""
    expected = [e.result for e in record.plan.job.keys.expect]
    named = [getattr(o, "name", None) for o in record.plan.job.observables]

    def rank(result: Result) -> int:
        if result.name in expected:
            return 0
        return 1 if result.name.partition(".")[0] in named else 2

    quantum = [result for result in record.results if not result.name.startswith(PREFIX)]
    return sorted(quantum, key=rank)[:SHOWN]


def drawn_potential(plan: Plan, times: Array) -> tuple[Array, Array]:
    """x and V as they are meant: vertical edges as doubled places; (P,), or (frames, P) where V changes."""
    landscape, axis = plan.job.landscape, plan.axis
    even = np.linspace(axis.low, axis.high, 1201)
    when = times if landscape.depends_on_time else times[:1]
    tiny = 1e-9 * axis.length
    rows_x, rows_v = [], []
    for t in when:
        edges = [
            p for term in landscape.terms if term.shape.breaks for p in term.shape.breaks.positions + term.shift(t)
        ]
        places = np.array([p for p in edges if axis.low < p < axis.high])
        x = np.sort(np.concatenate([even, places - tiny, places + tiny]))
        rows_x.append(x)
        rows_v.append(landscape.value(x, t))
    if not landscape.depends_on_time:
        return rows_x[0], rows_v[0]
    if len({x.size for x in rows_x}) > 1:  # an edge has left the grid: all rows on the even places
        return even, np.array([landscape.value(even, t) for t in when])
    return np.array(rows_x), np.array(rows_v)


def _wavelength(plan: Plan) -> float:
    """The wavelength at the 99 % quantile of the initial wave numbers and of the kinetic energy they can gain."""
    axis = plan.axis
    k = 2 * np.pi * np.fft.fftfreq(axis.points, axis.spacing)
    weight = np.abs(np.fft.fft(plan.psi)) ** 2
    order = np.argsort(np.abs(k))
    share = np.cumsum(weight[order]) / weight.sum()
    fastest = float(np.abs(k)[order][np.searchsorted(share, 0.99)])
    return 2 * np.pi / max(fastest, 2 * np.pi / axis.length)


def _layers(plan: Plan, length: float) -> tuple[tuple[float, float], ...]:
    axis = plan.axis
    return tuple(
        (axis.low * length, (axis.low + e.shape.depth) * length)
        if e.side == "low"
        else ((axis.high - e.shape.depth) * length, axis.high * length)
        for e in plan.endings
    )


def _probabilities(record: Record, times: Array) -> tuple[tuple[str, Array], ...]:
    """What crossed the detectors so far, what is in the regions and in given states, what the ends absorbed."""
    found = list(record.crossed.items())
    columns = [column.name for column in record.columns]
    regions = [o.name for o in record.plan.job.observables if isinstance(o, Inside) and o.name in columns]
    states = [o.name for o in record.plan.job.observables if isinstance(o, Overlap)]
    absorbed = [name for name in columns if name.startswith("absorbed.")]
    shown = [*regions, *states, *absorbed]
    found += [(name, np.interp(times, record.times, record.column(name))) for name in shown]
    if not found and "norm" in columns:
        found = [("norm", np.interp(times, record.times, record.column("norm")))]
    return tuple(found[:3])


def _classical(record: Record, times: Array) -> Array | None:
    """The path of F = m a from the mean start, nan once it is absorbed; None where the job leaves it out."""
    if record.classical is None or record.classical.path is None:
        return None
    axis, way = record.plan.axis, record.classical.path
    x = way.x[np.searchsorted(way.times, times)]
    for ending in record.plan.endings:
        middle = ending.shape.depth / 2
        beyond = x < axis.low + middle if ending.side == "low" else x > axis.high - middle
        if beyond.any():
            x[int(np.argmax(beyond)) :] = np.nan
    jumps = np.flatnonzero(np.abs(np.diff(x)) > axis.length / 2)
    x[jumps] = np.nan
    return x / record.plan.job.units.scale("length")


def _with_newton(record: Record, result: Result) -> str:
    """A result as it is worded, and beside it what F = m a gives."""
    by_name = {r.name: r for r in record.results}
    other = by_name.get(f"{PREFIX}{result.name}")
    if other is None or other.value is None:
        return worded(record.plan, result)
    value = record.plan.job.units.to_file(other.value, other.dimension)
    return f"{worded(record.plan, result)} (F = m a: {value:.4g})"


def _momenta(record: Record) -> tuple[Array, Array, Array]:
    """Wave numbers in rising order, and the momentum densities at start and end."""
    axis = record.plan.axis
    k = 2 * np.pi * np.fft.fftfreq(axis.points, axis.spacing)
    order = np.argsort(k)

    def density(psi: Array) -> Array:
        return np.asarray(np.abs(np.fft.fft(psi)[order]) ** 2 * axis.spacing**2 / (2 * np.pi))

    return k[order], density(record.plan.psi), density(record.psi)
