"""From a job file to a checked Job, or every mistake in it."""

from __future__ import annotations

from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from typing import Any

from .job import Job, Particle
from .kinds import NOT_YET, OBSERVABLES
from .misfits import misfits
from .models import NAME, Choice, Item, Reader, shown
from .particles import particle as known_particle
from .problems import JobFileError, Problem
from .reading.merging import Key, Merged, read_with_bases
from .reading.quantities import Named, QuantityError, Units, unit_names
from .reading.tree import JobTree, find_tree
from .reading.tree import shown as shown_path
from .reading.validation import problem_at, read_as
from .reading.yaml_tree import dotted, read_text
from .settings import JobKeys, ParticleKeys

DEFAULT_OBSERVABLES = ("norm", "position", "energy")
RESERVED_NAMES = frozenset({"x", "y", "z", "t", "pi", "start", "none"})


def load(path: str | Path, tree: JobTree | None = None, *, trust_paths: bool = False) -> Job:
    """The job in the file at `path`. Raises JobFileError with every mistake found.

    `trust_paths` allows paths inside the file to leave the job tree.
    """
    path = Path(path)
    tree = tree or find_tree(path, None)
    name = shown_path(path)
    document = read_with_bases(path, name, tree, trust_paths)
    return _checked(document, path, tree, trust_paths, path.read_text(encoding="utf-8-sig"))


def parse(text: str, *, folder: Path | None = None, name: str = "job") -> Job:
    """The job in `text`; paths in it are relative to `folder`. Raises JobFileError."""
    folder = (folder or Path.cwd()).resolve()
    document = read_text(text, f"{name}.yml")
    merged = Merged(document.value, dict(document.places), dict(document.key_places), {document.path: document.lines})
    return _checked(merged, folder / f"{name}.yml", JobTree(folder), False, text)


def _checked(document: Merged, path: Path, tree: JobTree, trust: bool, text: str) -> Job:
    value = document.value
    if not isinstance(value, dict):
        raise JobFileError([problem_at(document, (), "a job file is a mapping of keys", "see `wavejob new FILE`")])
    format_ = value.get("format")
    if isinstance(format_, int) and format_ > 1:
        raise JobFileError(
            [problem_at(document, ("format",), f"format {format_} needs a newer wavejob", "this one reads format 1")]
        )
    problems, later = _not_yet(document, value)
    units = _units(document, value)
    names = _names(document, value, units, problems)
    reader = Reader(units, names, open_path=lambda written: tree.inside(written, path, trust=trust))
    keys, mistakes = read_as(JobKeys, document, reader, _keys_of(reader))
    problems += [p for p in mistakes if not any(p.key.startswith(key) or p.key == holder for key, holder in later)]
    if keys is None:
        raise JobFileError(problems)
    if keys.observables is None:
        keys = keys.model_copy(update={"observables": _default_observables()})
    particle = _particle(document, keys, units, problems)
    if particle is not None:
        job = Job(tree.job_id(path), path, text, document, keys, units, particle, tree)
        problems += misfits(job)
        if not problems:
            return job
    raise JobFileError(problems)


def _keys_of(reader: Reader) -> Any:
    def known(mapping: Any) -> list[str]:
        model = reader.read_as.get(id(mapping))
        return model.keys() if model is not None else []  # type: ignore[attr-defined]

    return known


def _default_observables() -> list[Item]:
    items = Choice(OBSERVABLES, "observable", bare=True).items()
    return [items[name].model_validate({name: {}}) for name in DEFAULT_OBSERVABLES]


def _not_yet(document: Merged, value: dict[str, Any]) -> tuple[list[Problem], list[tuple[str, str]]]:
    """Problems for what is not available yet, and the keys (with those around them) that need no other complaint."""
    problems, later = [], []
    for pattern in NOT_YET:
        for path in _matches(value, pattern):
            problems.append(problem_at(document, path, f"`{path[-1]}` is not available yet", "leave it out", key=True))
            later.append((dotted(path), dotted(path[:-1])))
    return problems, later


def _matches(value: Any, pattern: tuple[str, ...], path: Key = ()) -> Iterator[Key]:
    """The paths in `value` that fit `pattern`, where `*` stands for any place of a list."""
    if not pattern:
        yield path
    elif pattern[0] == "*":
        for index, item in enumerate(value if isinstance(value, list) else []):
            if isinstance(item, str) and pattern[1:] == (item,):
                yield (*path, index)
            yield from _matches(item, pattern[1:], (*path, index))
    elif isinstance(value, dict) and pattern[0] in value:
        yield from _matches(value[pattern[0]], pattern[1:], (*path, pattern[0]))


def _units(document: Merged, value: dict[str, Any]) -> Units:
    written = value.get("units")
    try:
        if written is not None and not isinstance(written, (str, dict)):
            raise QuantityError(
                f"{shown(written)} is no system of units", "write `natural`, `atomic` or {length: nm, time: fs, energy: meV}"
            )
        return Units.from_file(written)
    except QuantityError as error:
        raise JobFileError([problem_at(document, ("units",), error.message, error.fix)]) from None


def _names(document: Merged, value: dict[str, Any], units: Units, problems: list[Problem]) -> dict[str, Named]:
    """The quantities of `let`; later ones may use earlier ones."""
    names: dict[str, Named] = {}
    written = value.get("let")
    if written is None:
        return names
    if not isinstance(written, dict):
        problems.append(problem_at(document, ("let",), "`let` is a mapping of names", "write {b2: 3 nm, V0: 300 meV}"))
        return names
    taken = unit_names() | RESERVED_NAMES | set(JobKeys.keys())
    for name, text in written.items():
        if not NAME.fullmatch(name) or "-" in name:
            problem = ("cannot be a name", "use a letter, then letters, digits or `_`")
        elif name in taken:
            problem = ("is the name of a unit, a key or an axis", "choose another name")
        elif isinstance(text, bool) or not isinstance(text, (int, float, str)):
            problem = ("is no quantity", "write a number with its unit")
        else:
            try:
                names[name] = units.read_named(text, names)
                continue
            except QuantityError as error:
                problem = (error.message, error.fix)
        key = problem[0].startswith(("cannot", "is the name"))
        said = f"`{name}` {problem[0]}" if problem[0].startswith(("cannot", "is ")) else problem[0]
        problems.append(problem_at(document, ("let", name), said, problem[1], key=key))
    return names


def _particle(document: Merged, keys: JobKeys, units: Units, problems: list[Problem]) -> Particle | None:
    """The particle in scaled units; natural and atomic units have one of mass 1 and charge 1 or -1."""
    written = keys.particle
    if isinstance(written, ParticleKeys):
        return Particle(written.mass, written.charge)
    if written is None and units.system in ("natural", "atomic"):
        return Particle(1.0, 1.0)
    if written is None:
        problem = problem_at(document, (), "`particle` is missing", "add `particle: electron` or {mass:, charge:}")
        problems.append(replace(problem, key="particle"))
        return None
    try:
        known = known_particle(written)
        return Particle(units.read(f"{known.mass!r} kg", "mass"), known.charge)
    except QuantityError as error:
        problems.append(problem_at(document, ("particle",), error.message, error.fix))
        return None
