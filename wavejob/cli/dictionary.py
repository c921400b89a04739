"""Every word of a job file, found in the models that read it: keys, kinds, and what values they take."""

from __future__ import annotations

import types
from collections.abc import Iterator
from dataclasses import dataclass
from functools import cache
from typing import Annotated, Any, Literal, Union, get_args, get_origin

from annotated_types import Ge, Le
from pydantic import WithJsonSchema
from pydantic.fields import FieldInfo

from ..models import Choice, Item, Model, NamedQuantity, Quantity
from ..settings import JobKeys


@dataclass(frozen=True)
class Entry:
    """A key, or a kind of a family; `model` says what stands below it, `info` how a key is read.

    `holder` is the model that a key belongs to; None for the outermost keys, and for keys beside a kind.
    """

    path: tuple[str, ...]
    what: str  # "key", or the family: "potential", "packet", "observable", "function of time", "path"
    model: type[Model] | None = None
    info: FieldInfo | None = None
    holder: type[Model] | None = None

    @property
    def dotted(self) -> str:
        return ".".join(self.path)

    @property
    def is_kind(self) -> bool:
        return self.info is None

    @property
    def is_list(self) -> bool:
        return self.info is not None and list in parts(self.info)


@dataclass(frozen=True)
class Words:
    """The words that a field accepts."""

    words: tuple[Any, ...]


@cache
def entries() -> tuple[Entry, ...]:
    """Every key and kind, in the order of the models."""
    return tuple(_walk(JobKeys, (), set()))


def _walk(model: type[Model], path: tuple[str, ...], seen: set[type[Model]]) -> Iterator[Entry]:
    seen.add(model)
    for name, info in model.model_fields.items():
        here = (*path, info.alias or name)
        found = parts(info)
        below = [part for part in found if _is_model(part)]
        holder = model if path and not issubclass(model, Item) else None
        yield Entry(here, "key", below[0] if below else None, info, holder)
        named = next(iter(info.examples[0]), "") if dict in found and info.examples else ""
        for part in below:
            if part not in seen:
                yield from _walk(part, (*here, named) if named else here, seen)
        for choice in (part for part in found if isinstance(part, Choice)):
            yield from _kinds(choice, here, seen)


def _kinds(choice: Choice, path: tuple[str, ...], seen: set[type[Model]]) -> Iterator[Entry]:
    new = {name: kind for name, kind in choice.table.items() if kind not in seen}
    for name, kind in new.items():
        yield Entry((*path, name), choice.what, kind)
        yield from _walk(kind, (*path, name), seen)
    if choice.beside is not Item and choice.beside not in seen:
        yield from _walk(choice.beside, path, seen)


def _is_model(part: Any) -> bool:
    return isinstance(part, type) and issubclass(part, Model) and not issubclass(part, Item)


def parts(info: FieldInfo) -> list[Any]:
    """What a field is made of: markers first, then types, from the outside in."""
    return [*info.metadata, *_parts(info.annotation)]


def _parts(annotation: Any) -> Iterator[Any]:
    origin = get_origin(annotation)
    if origin is Annotated:
        inner, *marks = get_args(annotation)
        for mark in marks:
            yield from mark.metadata if isinstance(mark, FieldInfo) else (mark,)
        yield from _parts(inner)
    elif origin is Literal:
        yield Words(get_args(annotation))
    elif origin in (Union, types.UnionType):
        for one in get_args(annotation):
            yield from _parts(one)
    elif origin in (list, dict):
        yield origin
        yield from _parts(get_args(annotation)[-1])
    elif annotation is not type(None):
        yield annotation


def form(info: FieldInfo) -> str:
    """What a field takes, in words: `a length such as 5 nm`."""
    found = parts(info)
    forms = list(dict.fromkeys(said for part in found if (said := _form(part, found))))
    text = " or ".join(forms) or "a value"
    if list in found:
        text = f"a list: {text}"
    elif dict in found:
        text = f"names with values: {text}"
    return text


def form_of(model: type[Model]) -> str:
    """The keys of a mapping, `{from:, to:}`."""
    return "{" + ", ".join(f"{key}:" for key in list(model.keys())) + "}"


def _form(part: Any, found: list[Any]) -> str:
    """The words for one part; "" where another part says more."""
    if isinstance(part, Choice):
        bare = [f"`{word}`" for word in part.words]
        return " or ".join([*bare, f"one {part.what}: {', '.join(part.table)}"])
    if isinstance(part, Quantity):
        bound = _bound(part)
        return f"{part.wanted()}{bound}".replace("`", "")
    if isinstance(part, Words):
        return " or ".join(str(word) for word in part.words)
    if isinstance(part, WithJsonSchema):
        return _of_schema(part.json_schema or {})
    if _is_model(part):
        return form_of(part)
    if any(isinstance(other, (WithJsonSchema, Quantity)) for other in found):
        return ""
    if part is NamedQuantity:
        return "a quantity"
    if part is int:
        return _whole([m for m in found if isinstance(m, (Ge, Le))])
    return {str: "text", float: "a number", bool: "yes or no"}.get(part, "") if isinstance(part, type) else ""


def _bound(quantity: Quantity) -> str:
    if quantity.above is not None:
        return f", greater than {quantity.above:g}"
    return f", at least {quantity.at_least:g}" if quantity.at_least is not None else ""


def _whole(bounds: list[Any]) -> str:
    least = next((b.ge for b in bounds if isinstance(b, Ge)), None)
    most = next((b.le for b in bounds if isinstance(b, Le)), None)
    return _range("a whole number", least, most)


def _range(what: str, least: Any, most: Any) -> str:
    return what if least is None or most is None else f"{what} from {least} to {most}"


def _of_schema(schema: dict[str, Any]) -> str:
    if "oneOf" in schema:
        return " or ".join(_of_schema(one) for one in schema["oneOf"])
    if schema.get("maxProperties") == 1:
        return f"a key with {_of_schema(schema['additionalProperties'])}"
    if schema.get("type") == "array":
        return "a list of values"
    if "properties" in schema:
        return "{" + ", ".join(f"{key}:" for key in schema["properties"]) + "}"
    if "enum" in schema:
        return " or ".join(str(word) for word in schema["enum"] if not isinstance(word, bool))
    if schema.get("type") == "integer":
        return _range("a whole number", schema.get("minimum"), schema.get("maximum"))
    if schema.get("type") == "number":
        return _range("a number", schema.get("minimum"), schema.get("maximum"))
    if schema.get("type") == "string":
        return "a name" if "pattern" in schema else "text"
    return "a quantity" if isinstance(schema.get("type"), list) else ""
