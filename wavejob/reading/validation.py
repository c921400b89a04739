"""A document's value read as a model: every mistake becomes a problem with place, words and cure of ours."""

from __future__ import annotations

from collections.abc import Callable, Collection
from dataclasses import replace
from typing import Any, TypeVar

from pydantic import BaseModel, ValidationError

from ..problems import Problem, nearest, shown
from .merging import Key, Merged
from .yaml_tree import dotted

BOUNDS = {
    "greater_than": ("greater than", "gt"),
    "greater_than_equal": ("at least", "ge"),
    "less_than": ("less than", "lt"),
    "less_than_equal": ("at most", "le"),
}
M = TypeVar("M", bound=BaseModel)


def problem_at(
    document: Merged, path: Key, message: str, fix: str = "", *, key: bool = False, severity: str = "error"
) -> Problem:
    """A problem at the value of `path`, or with `key` at the key itself."""
    place = document.key_place(path) if key else document.place(path)
    return Problem(message, fix, dotted(path), place, document.source(place), severity)


def read_as(
    model: type[M],
    document: Merged,
    context: Any,
    known: Callable[[Any], list[str]],
    skip: Collection[Key] = (),
) -> tuple[M | None, dict[Problem, Key]]:
    """The document's value as `model`, and all that is wrong with it, each with the path it is about.

    What is wrong is left out and the rest read again, so that one mistake does not hide others. There may
    then be a model beside mistakes, of what is left. `skip` tells what to leave out from the start. `known`
    gives the keys that the model of a mapping has, for "did you mean".
    """
    dropped, found = set(skip), dict[Problem, Key]()
    while True:
        value = _without(document.value, dropped)
        try:
            return model.model_validate(value, context=context), found
        except ValidationError as error:
            details = error.errors(include_url=False, include_input=True)
        problems = dict(_problem(replace(document, value=value), detail, known) for detail in details)
        meant = {(path[:-1], p.fix) for p, path in problems.items() if p.message.startswith("unknown key")}
        for problem, path in problems.items():
            # What is missing may be misspelt, or stand there as a key that is left out, and what holds a key
            # that is left out may miss just that.
            misspelt = (path[:-1], f"did you mean `{path[-1]}`?") in meant if path else False
            replaced = problem.message.endswith("is missing") and any(gone[:-1] == path[:-1] for gone in skip)
            if not misspelt and not replaced and not any(related(path, gone) for gone in dropped):
                found[problem] = path
        # A list is left out as a whole: its items keep their places.
        blamed = {_before_list(path) for path in problems.values()} - dropped
        if not blamed or () in blamed:
            return None, found
        dropped |= blamed


def _before_list(path: Key) -> Key:
    return next((path[:i] for i, part in enumerate(path) if isinstance(part, int)), path)


def related(path: Key, other: Key) -> bool:
    """Whether one of two paths holds the other."""
    return all(a == b for a, b in zip(path, other, strict=False))


def _without(value: Any, paths: set[Key]) -> Any:
    """`value` without the keys at `paths`; what keeps all its keys is the same object. List items stay."""
    if not paths or not isinstance(value, (dict, list)):
        return value
    below: dict[str | int, set[Key]] = {}
    for path in paths:
        if path:
            below.setdefault(path[0], set()).add(path[1:])
    if isinstance(value, list):
        return [_without(item, below.get(i, set())) for i, item in enumerate(value)]
    return {key: _without(item, below.get(key, set())) for key, item in value.items() if () not in below.get(key, ())}


def _problem(document: Merged, detail: Any, known: Callable[[Any], list[str]]) -> tuple[Problem, Key]:
    """One mistake, and the path it is about."""
    path = _present(document, detail["loc"])
    kind = detail["type"]
    if kind == "wavejob":
        return _ours(document, path, detail["ctx"])
    last = str(detail["loc"][-1]) if detail["loc"] else ""
    if kind == "extra_forbidden":
        fix = _meant(last, known(_value(document, path[:-1])))
        return problem_at(document, path, f"unknown key {shown(last)}", fix, key=True), path
    if kind == "missing":
        around = problem_at(document, path, f"`{last}` is missing", "add it", key=True)
        return replace(around, key=dotted((*path, last))), (*path, last)
    return problem_at(document, path, *_plain(kind, detail)), path


def _ours(document: Merged, path: Key, said: dict[str, Any]) -> tuple[Problem, Key]:
    """What one of our own validators found, at the key, the value or the character that it blames."""
    blamed = said["at"]
    if blamed is None:
        return problem_at(document, path, said["message"], said["fix"]), path
    path = (*path, blamed)
    value = _value(document, path) if path in document.places else None
    found = problem_at(document, path, said["message"], said["fix"], key=not _scalar(value))
    if not (said["column"] and isinstance(value, str) and found.place):
        return found, path
    at = found.source.find(value, found.place.column - 1)
    # Text over several lines, or with escapes, does not stand in the line as it is.
    moved = found if at < 0 else replace(found, place=replace(found.place, column=at + said["column"] + 1))
    return moved, path


def _scalar(value: Any) -> bool:
    return value is not None and not isinstance(value, (dict, list))


def _meant(unknown: str, keys: list[str]) -> str:
    """What to write instead of an unknown key."""
    if unknown[:1].isdigit():
        return "write decimals with a point, and one space after a comma or colon"
    near = nearest(unknown, keys)
    if near:
        return f"did you mean `{near}`?"
    return "there are: " + ", ".join(f"`{key}`" for key in keys) if keys else "nothing can stand here"


def _plain(kind: str, detail: Any) -> tuple[str, str]:
    """Message and cure for the mistakes that a model's field types find by themselves."""
    given, limits = shown(detail.get("input")), detail.get("ctx") or {}
    if kind in ("model_type", "model_attributes_type", "dict_type"):
        return (
            f"{given} stands where keys are wanted",
            "write `key: value` lines below it, or {key: value, ...}",
        )
    if kind == "list_type":
        return f"{given} stands where a list is wanted", "write one `- item` a line, or [item, item]"
    if kind == "string_type":
        return f"{given} is no text", "write a text, a number between quotes"
    if kind == "literal_error":
        return f"{given} is not accepted", f"there are: {limits.get('expected', '').replace(chr(39), '`')}"
    if kind in ("too_short", "too_long"):
        count, least, most = limits.get("actual_length"), limits.get("min_length"), limits.get("max_length")
        if kind == "too_long":
            return f"the list has {count} items", f"at most {most} are accepted"
        items = "one item" if count == 1 else f"{count or 'no'} items"
        return f"the list has {items}", f"at least {least} needed"
    if kind in BOUNDS:
        word, name = BOUNDS[kind]
        return f"must be {word} {limits.get(name):g}, got {given}", ""
    if kind.startswith(("int", "float")):
        return (
            f"{given} is no {'whole ' if kind.startswith('int') else ''}number",
            "write digits, without a unit",
        )
    return f"{given} is not accepted", "see `wavejob explain` for what is"


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
    """The value at `path`; None below a bare name, which has no parts."""
    value: Any = document.value
    for part in path:
        if not isinstance(value, (dict, list)):
            return None
        value = value[part]  # type: ignore[index]
    return value
