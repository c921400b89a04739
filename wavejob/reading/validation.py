"""A document's value read as a model: every mistake found becomes a problem with place, words and cure of ours."""

from __future__ import annotations

from collections.abc import Callable
from typing import Any, TypeVar

from pydantic import BaseModel, ValidationError

from ..problems import Problem, nearest
from .merging import Key, Merged
from .yaml_tree import dotted

M = TypeVar("M", bound=BaseModel)


def problem_at(document: Merged, path: Key, message: str, fix: str = "", *, key: bool = False, severity: str = "error") -> Problem:
    """A problem at the value of `path`, or with `key` at the key itself."""
    place = document.key_place(path) if key else document.place(path)
    return Problem(message, fix, dotted(path), place, document.source(place), severity)


def read_as(
    model: type[M], document: Merged, context: Any, known: Callable[[Any], list[str]]
) -> tuple[M | None, list[Problem]]:
    """The document's value as `model`, or None and all that is wrong with it.

    `known` gives the keys that the model of a mapping has, for "did you mean".
    """
    try:
        return model.model_validate(document.value, context=context), []
    except ValidationError as error:
        details = error.errors(include_url=False, include_input=True)
    problems = [_problem(document, detail, known) for detail in details]
    missing = [p for p in problems if p.message.endswith("is missing")]
    meant = {(p.key.rpartition(".")[0], p.fix) for p in problems if p.message.startswith("unknown key")}
    # A misspelt key is one mistake, not also a missing one.
    echoes = [p for p in missing if (p.key, f"did you mean {p.message.split()[0]}?") in meant]
    return None, list(dict.fromkeys(p for p in problems if p not in echoes))


def _problem(document: Merged, detail: Any, known: Callable[[Any], list[str]]) -> Problem:
    path = _present(document, detail["loc"])
    kind = detail["type"]
    if kind == "wavejob":
        return problem_at(document, path, detail["ctx"]["message"], detail["ctx"]["fix"])
    last = str(detail["loc"][-1]) if detail["loc"] else ""
    if kind == "extra_forbidden":
        keys = known(_value(document, path[:-1]))
        near = nearest(last, keys)
        listed = ", ".join(f"`{key}`" for key in keys)
        return problem_at(
            document, path, f"unknown key `{last}`", f"did you mean `{near}`?" if near else f"there are: {listed}", key=True
        )
    if kind == "missing":
        return problem_at(document, path, f"`{last}` is missing", "add it", key=True)
    return problem_at(document, path, *_plain(kind, detail))


def _plain(kind: str, detail: Any) -> tuple[str, str]:
    """Message and cure for the mistakes that a model's field types find by themselves."""
    given, limits = _shown(detail.get("input")), detail.get("ctx") or {}
    if kind in ("model_type", "model_attributes_type", "dict_type"):
        return f"{given} is no mapping", "write `key: value` lines below it, or {key: value, ...}"
    if kind == "list_type":
        return f"{given} is no list", "write one `- item` a line, or [item, item]"
    if kind == "string_type":
        return f"{given} is no text", "put it between quotes"
    if kind == "literal_error":
        return f"{given} is not accepted", f"there are: {limits.get('expected', '').replace(chr(39), '`')}"
    if kind == "too_short":
        return f"has {limits.get('actual_length')} items", f"at least {limits.get('min_length')} are needed"
    if kind == "too_long":
        return "has too many items", f"at most {limits.get('max_length')} are accepted"
    return f"{given} is not accepted", "see `wavejob explain` for what is"


def _shown(value: Any) -> str:
    text = {True: "yes", False: "no", None: "nothing"}.get(value) if isinstance(value, (bool, type(None))) else None
    if text is None:
        text = "a mapping" if isinstance(value, dict) else "a list" if isinstance(value, list) else f"`{value}`"
    return text if len(text) <= 60 else text[:56] + "...`"


def _present(document: Merged, loc: tuple[str | int, ...]) -> Key:
    """The part of a location that the document has: models add tags of their own between the keys."""
    path: Key = ()
    for part in loc:
        # A kind serves as a tag too: what stands beside it is then one level up.
        for longer in ((*path, part), (*path[:-1], part)):
            if path != longer and (longer in document.places or longer in document.key_places):
                path = longer
                break
    return path


def _value(document: Merged, path: Key) -> Any:
    value = document.value
    for part in path:
        value = value[part]
    return value
