"""resolved.yml: the job with every default and choice made explicit, and why each choice was made."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import yaml
from pydantic import BaseModel

from ..ensemble import trajectories
from ..models import Item, Quantity, quantity_of
from ..plan import Plan
from ..reading.quantities import Named, Units
from ..tabulated import TableFile
from .files import atomic


def write_resolved(path: Path, plan: Plan) -> None:
    """A job file that says all that `plan` settled. Raises RunError where it cannot be written."""
    job = plan.job
    resolved = as_written(job.keys, job.units)
    resolved.pop("based_on", None)
    resolved.pop("let", None)
    resolved["units"] = _units(job.units)
    if isinstance(job.keys.particle, str) or job.keys.particle is None:
        resolved["particle"] = job.keys.particle or {
            "mass": _quantity(job.particle.mass, "mass", job.units),
            "charge": _quantity(job.particle.charge, "charge", job.units),
        }
    axis = resolved["grid"]["x"]
    axis.pop("spacing", None)
    axis["points"] = plan.axis.points
    for ending in plan.endings:
        resolved["edges"]["x"][ending.side]["absorb"] = _quantity(ending.shape.depth, "length", job.units)
    evolve = resolved["evolve"]
    evolve.pop("accuracy", None)
    evolve["step"] = _quantity(plan.step, "time", job.units)
    evolve["order"] = plan.splitting.order
    evolve["record"] = _quantity(plan.record * plan.step, "time", job.units)
    if not isinstance(job.keys.classical, str):
        resolved["classical"]["trajectories"] = trajectories(plan)
    lines = [
        "# The job with every default and choice made explicit. Choices made here:",
        *(f"#   {key}: {why}" for key, why in _reasons(plan).items()),
    ]
    body = yaml.safe_dump(resolved, sort_keys=False, allow_unicode=True, width=100, default_flow_style=None)
    with atomic(path) as file:
        file.write("\n".join(lines) + "\n" + body)


def _reasons(plan: Plan) -> dict[str, str]:
    job = plan.job
    reasons = {f"grid.x.points {plan.axis.points}": plan.notes["points"]}
    reasons[f"evolve.step {job.write(plan.step, 'time')}"] = plan.notes["step"]
    reasons[f"evolve.order {plan.splitting.order}"] = f"{plan.splitting.name}, {plan.splitting.source}"
    rows = job.write(plan.record * plan.step, "time")
    reasons[f"evolve.record {rows}"] = "as written" if job.evolve.record else "about 400 rows"
    reasons[f"samples every {job.write(plan.sample * plan.step, 'time')}"] = (
        "integrals over time resolve every beat between the energies of the packet"
    )
    for ending in plan.endings:
        reasons[f"edges.x.{ending.side}"] = (
            f"layer of {job.write(ending.shape.depth, 'length')}, tuned to wave numbers above "
            f"{job.write(ending.shape.k_min, 'wavenumber')}; predicted reflection {ending.shape.reflected:.1e}"
        )
    return reasons


def _units(units: Units) -> Any:
    if units.system != "file":
        return units.system
    return {d: units.label(d) for d in ("length", "time", "energy")}


def as_written(model: BaseModel, units: Units) -> dict[str, Any]:
    """A model as a job file would have it: quantities with units, kinds by name, defaults included."""
    data: dict[str, Any] = {}
    for name, info in type(model).model_fields.items():
        value = getattr(model, name)
        if value is None or value == {} or value == []:
            continue
        data[info.alias or name] = _plain(value, quantity_of(info), units)
    for name, named in (model.__pydantic_extra__ or {}).items():
        data[name] = _plain(named, None, units)
    return data


def _plain(value: Any, quantity: Quantity | None, units: Units) -> Any:
    if isinstance(value, float) and quantity is not None:
        return value if quantity.dimension in ("number", "angle") else _quantity(value, quantity.dimension, units)
    if isinstance(value, Item):
        beside = as_written(value, units)
        return {value.kind: as_written(value.body, units), **{k: v for k, v in beside.items() if k != value.kind}}
    if isinstance(value, BaseModel):
        return as_written(value, units)
    if isinstance(value, Named):
        return _quantity(value.value, value.dimension, units)
    if isinstance(value, TableFile) or hasattr(value, "written"):
        return value.written
    if isinstance(value, list):
        return [_plain(item, quantity, units) for item in value]
    if isinstance(value, dict):
        return {key: _plain(item, None, units) for key, item in value.items()}
    return {True: "yes", False: "no"}[value] if isinstance(value, bool) else value


def _quantity(value: float, dimension: str, units: Units) -> Any:
    """As a person would write it, to 15 digits; in natural units a bare number, so that it reads back as one."""
    number = f"{units.to_file(value, dimension):.15g}"
    label = units.label(dimension)
    return f"{number} {label}" if label else float(number)
