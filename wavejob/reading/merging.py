"""`based_on`: one document laid over another, with the place of every value kept."""

from __future__ import annotations

import os
from collections.abc import Mapping
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

from ..problems import JobFileError, Place, Problem
from ..problems import shown as nicely
from .tree import JobTree, PathError
from .yaml_tree import Document, read_document

LONGEST_CHAIN = 8

# Sets of keys of which one at most may stand in a mapping, by where that is (`*` for any key): a key of
# one set in the override takes the place of the others in the base.
ALTERNATIVES: dict[tuple[str, ...], tuple[frozenset[str], ...]] = {
    ("grid", "*"): (frozenset({"points"}), frozenset({"spacing"})),
    ("edges", "*"): (frozenset({"absorb", "energies"}), frozenset({"low", "high"})),
    ("packet", "gaussian"): (
        frozenset({"energy", "toward"}),
        frozenset({"wavenumber"}),
        frozenset({"momentum"}),
        frozenset({"velocity"}),
    ),
    ("evolve",): (frozenset({"step"}), frozenset({"accuracy"})),
    ("evolve", "stop_when", "*"): (frozenset({"below"}), frozenset({"above"})),
}
KINDS = {("packet",): frozenset({"channel"})}  # mappings of one kind, and the keys that may stand beside it
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

    def children(self) -> dict[str | int, _Node]:
        """The values of a mapping or list, by key or place."""
        inner = self.value.items() if isinstance(self.value, dict) else enumerate(self.value)
        nodes: dict[str | int, _Node] = {key: _Node(value, {}, {}) for key, value in inner}
        for path, place in self.places.items():
            if path:
                nodes[path[0]].places[path[1:]] = place
        for path, place in self.key_places.items():
            if len(path) > 1:
                nodes[path[0]].key_places[path[1:]] = place
        return nodes


def read_with_bases(path: Path, shown: str, tree: JobTree, trust: bool = False) -> Merged:
    """The document at `path` over all it is `based_on`. Raises JobFileError."""
    document = read_document(path, shown)
    chain = [(path.resolve(), document)]
    while True:
        here, doc = chain[-1]
        if not isinstance(doc.value, dict):
            place = doc.place(())
            said = "a job file is a mapping of keys"
            raise JobFileError([Problem(said, "see `wavejob new FILE`", place=place, source=doc.source(place))])
        if "based_on" not in doc.value:
            break
        at = doc.place(("based_on",))
        try:
            written = doc.value["based_on"]
            if not isinstance(written, str):
                raise PathError(f"{nicely(written)} is no path", "write the path of one file, relative to this one")
            base = tree.inside(written, here, trust=trust)
        except PathError as error:
            raise _at(doc, at, error.message, error.fix) from None
        if base.resolve() in [file for file, _ in chain]:
            raise _at(doc, at, f"`{written}` leads back to itself", "take one `based_on` of the circle out")
        if len(chain) > LONGEST_CHAIN:
            raise _at(
                doc,
                at,
                f"this is the {LONGEST_CHAIN + 1}th file below one another",
                f"at most {LONGEST_CHAIN} are followed; merge some of them",
            )
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
        if merged is not None:
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
    value = {key: inner for key, inner in merged.value.items() if key != "based_on"}
    return Merged(value, merged.places, merged.key_places, lines)


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
        if key in PATH_KEYS and isinstance(item, str) and item and not item.startswith(("~", "/"))
        else _rebased(item, base, home)
        for key, item in value.items()
    }


def _over(base: _Node, top: _Node, path: tuple[str, ...] = ()) -> _Node:
    """`top` laid over `base`: maps merge, lists of named items merge by name, all else is replaced."""
    if isinstance(base.value, dict) and isinstance(top.value, dict):
        displaced = _displaced(base.value, top.value, path)
        below, above = base.children(), top.children()
        children = {key: node for key, node in below.items() if key not in displaced}
        for key, node in above.items():
            children[key] = _over(below[key], node, (*path, str(key))) if key in children else node
        return _joined(children, top, {**base.key_places, **top.key_places})
    if isinstance(base.value, list) and isinstance(top.value, list):
        names, old = [name_of(item) for item in top.value], [name_of(item) for item in base.value]
        if names and all(names) and any(old):
            items = dict(enumerate(base.children().values()))
            for name, node in zip(names, top.children().values(), strict=True):
                # A name given twice keeps both, to be refused where they stand.
                items[old.index(name) if name in old and names.count(name) == 1 else len(items)] = node
            return _joined(dict(items), top, {})
    return top


def _displaced(base: dict[str, Any], top: dict[str, Any], path: tuple[str, ...]) -> set[str]:
    """The keys of the base that cannot stand beside those of the override."""
    if path in KINDS:
        kinds = top.keys() - KINDS[path]
        return set() if kinds <= base.keys() else base.keys() - KINDS[path]
    for pattern, sets in ALTERNATIVES.items():
        if len(pattern) == len(path) and all(p in ("*", key) for p, key in zip(pattern, path, strict=True)):
            return {key for keys in sets if any(s & top.keys() for s in sets if s != keys) for key in keys - top.keys()}
    return set()


def name_of(item: Any) -> str | None:
    """The `name:` of a list item, beside its kind or among its parameters."""
    if not isinstance(item, dict):
        return None
    if isinstance(item.get("name"), str):
        return str(item["name"])
    inner = [body["name"] for body in item.values() if isinstance(body, dict) and isinstance(body.get("name"), str)]
    return str(inner[0]) if inner else None


def _joined(children: Mapping[Any, _Node], top: _Node, keys: dict[Key, Place]) -> _Node:
    value: Any = {key: node.value for key, node in children.items()}
    if isinstance(top.value, list):
        value = list(value.values())
    places: dict[Key, Place] = {(): top.places[()]} if () in top.places else {}
    key_places: dict[Key, Place] = {k: place for k, place in keys.items() if len(k) == 1 and k[0] in children}
    for key, node in children.items():
        places.update({(key, *path): place for path, place in node.places.items()})
        key_places.update({(key, *path): place for path, place in node.key_places.items()})
    return _Node(value, places, key_places)
