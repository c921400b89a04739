"""`based_on`: one document laid over another, with the place of every value kept."""

from __future__ import annotations

import os
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from ..problems import JobFileError, Place, Problem
from .tree import JobTree, PathError
from .yaml_tree import Document, read_document

LONGEST_CHAIN = 8

# Of each group at most one key stands in a mapping: the override's takes the place of the base's.
EITHER_OR: tuple[frozenset[str], ...] = (
    frozenset({"points", "spacing"}),
    frozenset({"step", "accuracy"}),
    frozenset({"omega", "frequency", "stiffness"}),
    frozenset({"energy", "wavenumber", "momentum", "velocity"}),
    frozenset({"by", "to"}),
    frozenset({"equals", "below", "above", "within"}),
)
PATH_KEYS = ("file", "path")  # keys whose text is a path, relative to the file it stands in

Key = tuple[str | int, ...]


@dataclass
class Merged:
    """A value with the places of its parts, by key path, and the lines of every file they came from."""

    value: Any
    places: dict[Key, Place]
    key_places: dict[Key, Place]
    lines: dict[str, list[str]] = field(default_factory=dict)

    def place(self, path: Key) -> Place:
        """The place of the value at `path`, or of the nearest one around it."""
        while path and path not in self.places:
            path = path[:-1]
        return self.places.get(path) or Place("")

    def key_place(self, path: Key) -> Place:
        return self.key_places.get(path) or self.place(path)

    def source(self, place: Place) -> str:
        """The line at `place` as it stands in its file."""
        lines = self.lines.get(place.path, [])
        return lines[place.line - 1] if 0 < place.line <= len(lines) else ""


@dataclass(frozen=True)
class _Node:
    """One value with the places below it; paths inside are relative to the node."""

    value: Any
    places: dict[Key, Place]
    key_places: dict[Key, Place]

    def child(self, key: str | int) -> _Node:
        def below(table: dict[Key, Place]) -> dict[Key, Place]:
            return {path[1:]: place for path, place in table.items() if path and path[0] == key}

        return _Node(self.value[key], below(self.places), {k: v for k, v in below(self.key_places).items() if k})


def read_with_bases(path: Path, shown: str, tree: JobTree, trust: bool = False) -> Merged:
    """The document at `path` over all it is `based_on`. Raises JobFileError."""
    document = read_document(path, shown)
    chain = [(path.resolve(), document)]
    while isinstance(chain[-1][1].value, dict) and "based_on" in chain[-1][1].value:
        here, doc = chain[-1]
        at = doc.place(("based_on",))
        try:
            written = doc.value["based_on"]
            if not isinstance(written, str):
                raise PathError("is not a path", "write the path of one file")
            base = tree.inside(written, here, trust=trust)
        except PathError as error:
            raise _at(doc, at, error.message, error.fix) from None
        if base.resolve() in [file for file, _ in chain]:
            raise _at(doc, at, f"`{written}` is based on this file, in a circle", "break the circle")
        if len(chain) > LONGEST_CHAIN:
            raise _at(doc, at, f"a chain of more than {LONGEST_CHAIN} files", "merge some of them")
        beside = os.path.relpath(base, path.resolve().parent)
        chain.append((base.resolve(), read_document(base, os.path.join(os.path.dirname(shown), beside))))
    return _folded(chain, path.resolve().parent)


def _folded(chain: list[tuple[Path, Document]], home: Path) -> Merged:
    lines = {doc.path: doc.lines for _, doc in chain}
    problems: list[Problem] = []
    merged: _Node | None = None
    for file, doc in reversed(chain):
        value = _rebased(doc.value, file.parent, home)
        node = _Node(value, dict(doc.places), dict(doc.key_places))
        if merged is not None and isinstance(value, dict) and isinstance(merged.value, dict):
            mine, theirs = value.get("units"), merged.value.get("units")
            if mine is not None and theirs is not None and mine != theirs:
                place = doc.place(("units",))
                problems.append(
                    Problem(
                        "a file may not change the units of the file it is based on",
                        "drop `units` here",
                        "units",
                        place,
                        doc.source(place),
                    )
                )
        merged = node if merged is None else _over(merged, node)
    if problems or merged is None:
        raise JobFileError(problems)
    if isinstance(merged.value, dict):
        merged.value.pop("based_on", None)
    return Merged(merged.value, merged.places, merged.key_places, lines)


def _at(doc: Document, place: Place, message: str, fix: str) -> JobFileError:
    return JobFileError([Problem(message, fix, "based_on", place, doc.source(place))])


def _rebased(value: Any, base: Path, home: Path) -> Any:
    """`value` with the paths in it made relative to `home`."""
    if base == home:
        return value
    if isinstance(value, list):
        return [_rebased(item, base, home) for item in value]
    if not isinstance(value, dict):
        return value
    return {
        key: os.path.relpath(base / item, home)
        if key in PATH_KEYS and isinstance(item, str) and not os.path.isabs(item)
        else _rebased(item, base, home)
        for key, item in value.items()
    }


def _over(base: _Node, top: _Node) -> _Node:
    """`top` laid over `base`: maps merge, lists of named items merge by name, all else is replaced."""
    if isinstance(base.value, dict) and isinstance(top.value, dict):
        children = {}
        for key in base.value:
            group = next((g for g in EITHER_OR if key in g), frozenset())
            if key in top.value:
                children[key] = _over(base.child(key), top.child(key))
            elif not (group & top.value.keys() or _other_kind(base.value, top.value, key)):
                children[key] = base.child(key)
        for key in top.value:
            if key not in base.value:
                children[key] = top.child(key)
        keys = {k: place for node in (base, top) for k, place in node.key_places.items() if len(k) == 1}
        return _joined({k: v for k, v in children.items()}, top, keys)
    if isinstance(base.value, list) and isinstance(top.value, list):
        named = [_name_of(item) for item in top.value]
        old = [_name_of(item) for item in base.value]
        if named and all(named) and any(name in old for name in named):
            items = [base.child(i) for i in range(len(old))]
            for i, name in enumerate(named):
                if name in old:
                    items[old.index(name)] = top.child(i)
                else:
                    items.append(top.child(i))
            return _joined(dict(enumerate(items)), top, {})
    return top


def _other_kind(base: dict[str, Any], top: dict[str, Any], key: str) -> bool:
    """True where `key` is the one kind of the base's mapping and `top` names another kind."""
    return isinstance(base[key], dict) and len(base) == 1 and len(top) == 1 and key not in top


def _name_of(item: Any) -> str | None:
    """The `name:` of a list item, beside its kind or among its parameters."""
    if not isinstance(item, dict):
        return None
    if isinstance(item.get("name"), str):
        return str(item["name"])
    inner = [body["name"] for body in item.values() if isinstance(body, dict) and isinstance(body.get("name"), str)]
    return str(inner[0]) if inner else None


def _joined(children: dict[Any, _Node], top: _Node, keys: dict[Key, Place]) -> _Node:
    value: Any = {key: node.value for key, node in children.items()}
    if all(isinstance(key, int) for key in children) and children:
        value = [node.value for node in children.values()]
    places = {(): top.places[()]} if () in top.places else {}
    key_places = {k: v for k, v in keys.items() if k[0] in children}
    for key, node in children.items():
        places.update({(key, *path): place for path, place in node.places.items()})
        key_places.update({(key, *path): place for path, place in node.key_places.items()})
    return _Node(value, places, key_places)
