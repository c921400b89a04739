"""`vary` and `vary_together`: which keys take which values, read from the document before any job is made of it."""

from __future__ import annotations

import math
from collections.abc import Mapping
from dataclasses import dataclass, replace
from typing import Any

from ..problems import JobFileError, Place, Problem, shown
from .key_paths import KeyPathError, find, with_value
from .merging import Key, Merged
from .quantities import Named, Units
from .quantity_text import QuantityError, Term, terms
from .validation import problem_at

MOST_VARIANTS = 10_000
SECTIONS = ("vary", "vary_together")
# Keys that decide no numbers, or that all variants share.
FIXED = ("format", "job", "about", "tags", "priority", "based_on", "units", "film", "expect", "let", *SECTIONS)


@dataclass(frozen=True)
class Walked:
    """One varied key: as it is written, where it stands, its values and the place of each."""

    key: str
    path: Key
    values: tuple[Any, ...]
    places: tuple[Place, ...]

    def text(self, step: int) -> str:
        """`b2 = 2.9 nm`."""
        return f"{self.key} = {written(self.values[step])}"


@dataclass(frozen=True)
class Walk:
    """Keys that walk in step; all have as many values."""

    keys: tuple[Walked, ...]

    @property
    def steps(self) -> int:
        return len(self.keys[0].values)


@dataclass(frozen=True)
class Walks:
    """All that is varied: every combination of the walks, the last of them running fastest."""

    walks: tuple[Walk, ...] = ()

    @property
    def count(self) -> int:
        return math.prod(walk.steps for walk in self.walks)

    @property
    def keys(self) -> tuple[Walked, ...]:
        return tuple(key for walk in self.walks for key in walk.keys)

    def steps(self, index: int) -> list[tuple[Walked, int]]:
        """Every varied key, and which of its values it has in variant `index`."""
        found: list[tuple[Walked, int]] = []
        for walk in reversed(self.walks):
            index, step = divmod(index, walk.steps)
            found[:0] = [(key, step) for key in walk.keys]
        return found

    def label(self, index: int) -> str:
        """`b2 = 2.9 nm, V0 = 300 meV`."""
        return ", ".join(key.text(step) for key, step in self.steps(index))

    def document(self, document: Merged, index: int) -> Merged:
        """The document of variant `index`: a job file without `vary`, whose varied values stand at their entries."""
        value = {key: inner for key, inner in document.value.items() if key not in SECTIONS}
        places, key_places = dict(document.places), dict(document.key_places)
        for key, step in self.steps(index):
            value = with_value(value, key.path, key.values[step])
            places[key.path] = key.places[step]
            key_places.setdefault(key.path, key.places[step])
        return replace(document, value=value, places=places, key_places=key_places)


def written(value: Any) -> str:
    """A value as a job file has it."""
    return {True: "yes", False: "no"}[value] if isinstance(value, bool) else str(value)


def read_walks(document: Merged, sections: Mapping[str, Any], units: Units, names: Mapping[str, Named]) -> Walks:
    """The walks of a document whose sections have their right form. Raises JobFileError with all mistakes."""
    problems: list[Problem] = []
    walks: list[Walk] = []
    for section in SECTIONS:
        found = [
            walked
            for place, entry in enumerate(sections.get(section) or [])
            for key, values in entry.items()
            if (walked := _walked(document, (section, place, key), values, units, names, problems))
        ]
        if section == "vary":
            walks += [Walk((walked,)) for walked in found]
        elif found and len({len(walked.values) for walked in found}) > 1:
            counts = ", ".join(f"`{walked.key}` {len(walked.values)}" for walked in found)
            said = f"what walks in step needs as many values of each key, these have: {counts}"
            problems.append(problem_at(document, (section,), said, "give all as many, or use `vary`", key=True))
        elif found:
            walks.append(Walk(tuple(found)))
    problems += _twice(document, sections, walks)
    read = Walks(tuple(walks))
    if not problems and read.count > MOST_VARIANTS:
        section = "vary" if sections.get("vary") else "vary_together"
        said = f"these are {read.count} variants, at most {MOST_VARIANTS} are run"
        problems.append(problem_at(document, (section,), said, "take fewer points", key=True))
    if problems:
        raise JobFileError(problems)
    return read


def _twice(document: Merged, sections: Mapping[str, Any], walks: list[Walk]) -> list[Problem]:
    """One problem for each key that is varied twice, or within another that is."""
    entries = [(section, place) for section in SECTIONS for place in range(len(sections.get(section) or []))]
    found: list[Problem] = []
    keys = [key for walk in walks for key in walk.keys]
    for place, key in enumerate(keys):
        other = next((k for k in keys[:place] if all(a == b for a, b in zip(k.path, key.path, strict=False))), None)
        if other is not None:
            entry = next(e for e in reversed(entries) if (*e, key.key) in document.key_places)
            said = f"`{key.key}` is varied twice" if other.path == key.path else f"`{other.key}` is varied too"
            found.append(problem_at(document, (*entry, key.key), said, "keep one of the two", key=True))
    return found


def _walked(
    document: Merged,
    entry: Key,
    values: Any,
    units: Units,
    names: Mapping[str, Named],
    problems: list[Problem],
) -> Walked | None:
    """One entry read; None where it is wrong, which is then noted."""
    key = str(entry[-1])
    try:
        path = _path(document, key, names)
    except KeyPathError as error:
        problems.append(problem_at(document, entry, error.message, error.fix, key=True))
        return None
    if isinstance(values, list):
        return Walked(key, path, tuple(values), tuple(document.place((*entry, i)) for i in range(len(values))))
    try:
        steps = between(values["from"], values["to"], values["points"], units, names)
    except QuantityError as error:
        problems.append(problem_at(document, (*entry, "from"), error.message, error.fix))
        return None
    return Walked(key, path, tuple(steps), (document.place(entry),) * len(steps))


def _path(document: Merged, key: str, names: Mapping[str, Named]) -> Key:
    if key in names:
        return ("let", key)
    first = key.partition(".")[0].partition("[")[0]
    if first in FIXED and not key.startswith("let."):
        raise KeyPathError(f"`{first}` cannot be varied", "vary what decides the numbers")
    whole = {name: inner for name, inner in document.value.items() if name not in SECTIONS}
    try:
        path = find(key, whole)
    except KeyPathError as error:
        if "." in key or "[" in key:
            raise
        known = [*names, *whole]
        listed = ", ".join(f"`{name}`" for name in names) or "none"
        raise KeyPathError(
            f"no key and no name of `let` is called {shown(key)}",
            f"names are: {listed}" if len(known) > len(whole) else error.fix,
        ) from None
    inside: Any = whole
    for part in path:
        inside = inside.get(part) if isinstance(inside, dict) else inside[part]
    if isinstance(inside, dict | list):
        held = "keys" if isinstance(inside, dict) else "a list"
        raise KeyPathError(f"`{key}` holds {held}, no value", "name a value in it")
    return path


def between(low: Any, high: Any, count: int, units: Units, names: Mapping[str, Named]) -> list[Any]:
    """`count` values from `low` to `high`, both included, as a user would write them. Raises QuantityError."""
    ends = [terms(low), terms(high)]
    if all(len(end) == 1 and not end[0].name for end in ends):
        first, last = ends[0][0], ends[1][0]
        if _same(first, last):
            unit = first.unit or last.unit
            _refuse_order(first.factor, last.factor)
            whole = isinstance(low, int) and isinstance(high, int)
            return [_number(n, unit, whole=whole) for n in _spread(first.factor, last.factor, count)]
    read = [units.read_named(end, names) for end in (low, high)]
    kind = read[0].dimension if read[0].dimension != "number" else read[1].dimension
    low_value, high_value = (units.read(end, kind, names) for end in (low, high))
    _refuse_order(low_value, high_value)
    texts = [units.write(value, kind).partition(" ") for value in _spread(low_value, high_value, count)]
    return [_number(float(number), unit, whole=False) for number, _, unit in texts]


def _same(first: Term, last: Term) -> bool:
    """Whether both ends count in one unit; a bare zero counts in any."""
    return first.unit == last.unit or any(not term.unit and term.factor == 0 for term in (first, last))


def _refuse_order(low: float, high: float) -> None:
    if not low < high:
        raise QuantityError("`to` must be greater than `from`", "swap them, or write the values as a list")


def _spread(low: float, high: float, count: int) -> list[float]:
    return [*(low + (high - low) * (step / (count - 1)) for step in range(count - 1)), high]


def _number(value: float, unit: str, *, whole: bool) -> Any:
    number = float(f"{value:.12g}")
    if unit:
        return f"{number:.12g} {unit}"
    return int(number) if whole and number.is_integer() else number
