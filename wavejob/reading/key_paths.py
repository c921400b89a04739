"""Key paths as they are written in a job file, `potential.second.barrier.height`, found in its values."""

from __future__ import annotations

import re
from typing import Any

from ..problems import nearest, shown
from .merging import Key, name_of
from .yaml_tree import dotted

_PART = re.compile(r"([^.\[\]]+)|\[([0-9]{1,6})\]")


class KeyPathError(ValueError):
    """A key path that leads nowhere: what is wrong, and what to write instead."""

    def __init__(self, message: str, fix: str = "") -> None:
        self.message, self.fix = message, fix
        super().__init__(message, fix)


def find(text: str, value: Any) -> Key:
    """The path that `text` stands for in a job file's `value`; its last key need not be there yet.

    `[1]` counts the items of a list from 0, a name takes the item with this `name:`. Raises KeyPathError.
    """
    parts = [int(number) if number else name for name, number in _PART.findall(text)]
    if dotted(tuple(parts)) != text or not parts or isinstance(parts[0], int):
        raise KeyPathError(f"{shown(text)} is no key path", "write one such as `potential[1].barrier.height`")
    path: Key = ()
    while parts:
        used, step = _step(value, parts, path)
        path, parts = (*path, step), parts[used:]
        value = _below(value, step)
    return path


def _step(value: Any, parts: list[str | int], path: Key) -> tuple[int, str | int]:
    """The next key or place below `value`, and how many of `parts` it takes."""
    first, here = parts[0], f"`{dotted(path)}`" if path else "the file"
    if isinstance(value, dict):
        for length in range(len(parts), 0, -1):  # names of columns hold points: `stop_when.well.x.below`
            joined = ".".join(str(part) for part in parts[:length])
            if joined in value:
                return length, joined
        if isinstance(first, str) and len(parts) == 1 and path:
            return 1, first
        raise KeyPathError(f"{here} has no `{first}`", _meant(str(first), list(value)))
    if isinstance(value, list):
        if isinstance(first, int) and first < len(value):
            return 1, first
        names = [name_of(item) for item in value]
        if first in names:
            return 1, names.index(str(first))
        if isinstance(first, int):
            raise KeyPathError(f"{here} has no item [{first}]", f"it has {len(value)}, and the first is [0]")
        known = [name for name in names if name]
        raise KeyPathError(f"{here} has no item named `{first}`", _meant(first, known))
    said = f"{here} is {shown(value)}, which has no `{first}`" if path else f"there is no `{first}`"
    raise KeyPathError(said, "vary it as a whole, or write it with its keys")


def _below(value: Any, step: str | int) -> Any:
    if isinstance(value, dict):
        return value.get(step)
    return value[step]


def _meant(word: str, known: list[str]) -> str:
    near = nearest(word, known)
    if near:
        return f"did you mean `{near}`?"
    return "there are: " + ", ".join(f"`{name}`" for name in known) if known else "nothing there has a name"


def with_value(value: Any, path: Key, new: Any) -> Any:
    """`value` with `new` at `path`; all that does not hold it is shared."""
    if not path:
        return new
    step, rest = path[0], path[1:]
    if isinstance(value, list):
        return [with_value(item, rest, new) if place == step else item for place, item in enumerate(value)]
    return {**value, step: with_value(value.get(step), rest, new)}
