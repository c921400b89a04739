"""Examples of keys and kinds, made from their fields: what they need, and what they name as example."""

from __future__ import annotations

import re
from collections.abc import Mapping
from itertools import combinations
from typing import Any

from annotated_types import Ge, MinLen
from pydantic import BaseModel, ValidationError, WithJsonSchema
from pydantic.fields import FieldInfo

from ..models import Choice, Quantity, Reader, example
from ..potentials.item import POTENTIALS
from ..reading.quantities import Units
from .dictionary import Entry, Words, parts

LATER = ("to", "stop")  # must lie beyond what stands before it
NUMBER = re.compile(r"[0-9.]+")
PLAIN = re.compile(r"[A-Za-z0-9+.-][A-Za-z0-9 _.^/*+-]*")


def written(entry: Entry, known: Mapping[tuple[str, ...], Entry]) -> str:
    """A few lines of a job file that show `entry` in its place, among the entries by path."""
    return _block(nested(entry, known))


def nested(entry: Entry, known: Mapping[tuple[str, ...], Entry]) -> dict[str, Any]:
    """The outermost key with all that is needed to show `entry`."""
    path = entry.path
    value: Any = of_model(entry.model) if entry.is_kind and entry.model else _of_field(path[-1], entry.info)
    while path:
        here = known.get(path)
        if here and here.is_list and not isinstance(value, list):
            value = [value]
        beside = of_model(here.holder, showing=path[-1]) if here and here.holder else {}
        value = {**beside, path[-1]: value}
        path = path[:-1]
        if path == ("potential",) and not set(value) & set(POTENTIALS):
            value = {"step": of_model(POTENTIALS["step"]), **value}  # what stands beside a kind needs one
    return dict(value)


def of_model(model: type[BaseModel], showing: str = "") -> dict[str, Any]:
    """Values for the keys of `model` that are needed, for `showing`, and for others that make it whole."""
    fields = {info.alias or name: info for name, info in model.model_fields.items()}
    least = {key for key, info in fields.items() if info.is_required()} | ({showing} if showing else set())
    usual = least | {key for key, info in fields.items() if info.examples}
    others = [key for key in fields if key not in least]
    choices = [usual, *(least | set(more) for count in range(3) for more in combinations(others, count))]
    for chosen in choices:
        values = {key: _of_field(key, fields[key]) for key in fields if key in chosen}
        if _is_whole(model, values):
            return values
    return {key: _of_field(key, fields[key]) for key in fields if key in usual}


def _is_whole(model: type[BaseModel], values: dict[str, Any]) -> bool:
    """Whether `values` can be read; a file that they name need not be there."""
    try:
        model.model_validate(values, context=Reader(Units.from_file({"length": "nm", "time": "fs", "energy": "meV"})))
    except ValidationError as error:
        return all(detail["loc"][-1:] in (("file",), ("path",)) for detail in error.errors())
    return True


def _of_field(key: str, info: FieldInfo | None) -> Any:
    if info is None:
        return {}
    if info.examples:
        return info.examples[0]
    found = parts(info)
    value = next((v for part in found if (v := _of_part(key, part, found)) is not None), "...")
    least = next((part.min_length for part in found if isinstance(part, MinLen)), 1)
    return [value] * least if list in found else value


def _of_part(key: str, part: Any, found: list[Any]) -> Any:
    if isinstance(part, Choice):
        if part.words:
            return part.words[0]
        name, kind = next(iter(part.table.items()))
        return name if part.bare else {name: of_model(kind)}
    if isinstance(part, Quantity) and part.at_most is not None:
        return part.at_most
    if isinstance(part, Quantity):
        return _further(example(part.dimension)) if key in LATER else example(part.dimension)
    if isinstance(part, Words):
        return part.words[0]
    if isinstance(part, WithJsonSchema):
        return _of_schema(key, part.json_schema or {})
    if isinstance(part, type) and issubclass(part, BaseModel):
        return of_model(part)
    if part is int:
        return next((m.ge for m in found if isinstance(m, Ge)), 1)
    return None


def _of_schema(key: str, schema: dict[str, Any]) -> Any:
    if "examples" in schema or "enum" in schema:
        return (schema.get("examples") or schema["enum"])[0]
    if schema.get("type") in ("integer", "number"):
        return schema.get("minimum", 1)
    if schema.get("type") == "string":
        return "here" if "pattern" in schema else "table.csv" if key in ("file", "path") else None
    return 1


def _further(quantity: str) -> str:
    """The quantity with twice its number."""
    return NUMBER.sub(lambda found: f"{2 * float(found[0]):g}", quantity, count=1)


def _block(document: dict[str, Any]) -> str:
    """A mapping of one key: what is below it on lines of its own, all farther in on one line each."""
    ((key, value),) = document.items()
    if isinstance(value, list) and value and isinstance(value[0], dict):
        return "\n".join([f"{key}:", *(line for item in value for line in _item(item))])
    if isinstance(value, dict) and value:
        return "\n".join([f"{key}:", *(f"  {name}: {_flow(one)}" for name, one in value.items())])
    return f"{key}: {_flow(value)}"


def _item(item: dict[str, Any]) -> list[str]:
    """One item of a list; a kind without options as its bare name."""
    if len(item) > 1 and not any(isinstance(value, dict) for value in item.values()):
        return [f"  - {_flow(item)}"]
    lines = [f"{name}: {_flow(value)}" if value != {} else name for name, value in item.items()]
    return [f"  - {lines[0]}", *(f"    {line}" for line in lines[1:])]


def _flow(value: Any) -> str:
    """`value` as YAML on one line."""
    if isinstance(value, dict):
        return "{" + ", ".join(f"{key}: {_flow(one)}" for key, one in value.items()) + "}"
    if isinstance(value, list):
        return "[" + ", ".join(_flow(one) for one in value) + "]"
    text = str(value)
    return text if PLAIN.fullmatch(text) or text == "..." else f'"{text}"'
