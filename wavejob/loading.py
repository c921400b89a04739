"""From a job file to a checked Job, or every mistake in it."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from dataclasses import dataclass, replace
from pathlib import Path
from typing import Any

from .job import Job, Particle, Varied
from .kinds import NOT_YET, OBSERVABLES
from .misfits import misfits
from .models import NAME, Choice, Item, Reader, dimension_at
from .particles import particle as known_particle
from .problems import JobFileError, Problem, shown
from .reading.merging import Key, Merged, read_with_bases
from .reading.quantities import Named, QuantityError, Units, unit_names, unknown_name
from .reading.tree import JobTree, find_tree
from .reading.tree import shown as shown_path
from .reading.validation import problem_at, read_as
from .reading.walks import SECTIONS, Walked, Walks, written
from .reading.yaml_tree import read_text
from .settings import JobKeys, ParticleKeys

DEFAULT_OBSERVABLES = ("norm", "position", "energy")
RESERVED_NAMES = frozenset({"x", "y", "z", "t", "pi", "start", "none"})


@dataclass(frozen=True)
class Source:
    """A job file as it was read, before any job is made of it."""

    document: Merged
    path: Path
    tree: JobTree
    text: str
    trust: bool = False

    @classmethod
    def of_file(cls, path: Path, tree: JobTree | None, trust: bool) -> Source:
        """The file at `path`. Raises JobFileError."""
        tree = tree or find_tree(path, None)
        document = read_with_bases(path, shown_path(path), tree, trust)
        return cls(document, path, tree, path.read_text(encoding="utf-8-sig"), trust)

    @classmethod
    def of_text(cls, text: str, folder: Path | None, name: str) -> Source:
        """`text`, as if it stood in `folder`. Raises JobFileError."""
        folder = (folder or Path.cwd()).resolve()
        document = read_text(text, f"{name}.yml")
        lines = {document.path: document.lines}
        merged = Merged(document.value, dict(document.places), dict(document.key_places), lines)
        return cls(merged, folder / f"{name}.yml", JobTree(folder), text)

    def reader(self, units: Units, names: Mapping[str, Named]) -> Reader:
        """What the values of this file are read with."""
        home = self.path.resolve()
        return Reader(units, names, open_path=lambda written: self.tree.inside(written, home, trust=self.trust))


def load(path: str | Path, tree: JobTree | None = None, *, trust_paths: bool = False) -> Job:
    """The job in the file at `path`. Raises JobFileError with every mistake found, and for a varied job.

    `trust_paths` allows paths inside the file to leave the job tree.
    """
    return _one(Source.of_file(Path(path), tree, trust_paths))


def parse(text: str, *, folder: Path | None = None, name: str = "job") -> Job:
    """The job in `text`; paths in it are relative to `folder`. Raises JobFileError."""
    return _one(Source.of_text(text, folder, name))


def _one(source: Source) -> Job:
    if varied := sections(source.document):
        said = "a varied job is many jobs"
        raise JobFileError([problem_at(source.document, (varied[0],), said, "read it with `load_family`", key=True)])
    return checked(source)


def sections(document: Merged) -> list[str]:
    """Those of `vary` and `vary_together` that a document has."""
    return [name for name in SECTIONS if isinstance(document.value, dict) and name in document.value]


def checked(source: Source, variant: Walks | None = None, index: int = 0) -> Job:
    """The job of a document, or variant `index` of it. Raises JobFileError with every mistake found."""
    document, path, tree = source.document, source.path, source.tree
    if variant is not None:
        document = variant.document(document, index)
    value = mapping(document)
    later = list(_not_yet(value))
    problems = [problem_at(document, key, *_later(value, key), key=True) for key in later]
    units = read_units(document, value, problems)
    names = read_names(document, value, units, problems)
    reader = source.reader(units, names)
    skip = [*later, *([("let",)] if _broken(value, names) else [])]
    keys, mistakes = read_as(JobKeys, document, reader, keys_known(reader), skip)
    problems += [p for p in mistakes if not _echoes(p, value, names)]
    units_wrong = any(p.key.startswith("units") for p in problems)
    if keys is None or units_wrong or (particle := _particle(document, keys, units, problems)) is None:
        raise JobFileError(problems)
    if keys.observables is None:
        keys = keys.model_copy(update={"observables": _default_observables()})
    varied = tuple(_setting(key, step, keys, units, names) for key, step in variant.steps(index)) if variant else ()
    job = Job(tree.job_id(path), path, source.text, document, keys, units, particle, tree, varied)
    problems += misfits(job, [*later, *mistakes.values()])
    if problems:
        raise JobFileError(problems)
    return job


def mapping(document: Merged) -> dict[str, Any]:
    """The document's keys. Raises JobFileError where it has none, or is of a later format."""
    value = document.value
    if not isinstance(value, dict):
        raise JobFileError([problem_at(document, (), "a job file is a mapping of keys", "see `wavejob new FILE`")])
    format_ = value.get("format")
    if isinstance(format_, int) and format_ > 1:
        said = f"format {format_} needs a newer wavejob"
        raise JobFileError([problem_at(document, ("format",), said, "this one reads format 1")])
    return value


def _setting(walked: Walked, step: int, keys: JobKeys, units: Units, names: Mapping[str, Named]) -> Varied:
    """What a varied key is in this variant, as a quantity wherever it is one."""
    value = walked.values[step]
    text = written(value)
    if isinstance(value, bool):
        return Varied(walked.key, text)
    named = names.get(str(walked.path[1])) if walked.path[0] == "let" else None
    try:
        known = named.dimension if named else dimension_at(keys, walked.path)
        known = known or units.read_named(value, names).dimension
        unit = "" if isinstance(value, str) else units.label(known)
        return Varied(walked.key, f"{text} {unit}".rstrip(), units.read(value, known, names), known)
    except QuantityError:  # a word, such as the name of a particle
        return Varied(walked.key, text)


def _echoes(problem: Problem, value: dict[str, Any], names: dict[str, Named]) -> bool:
    """Whether a mistake is the use of a name that `let` defines, but wrongly."""
    return any(problem.message == unknown_name(name) for name in _broken(value, names))


def _broken(value: dict[str, Any], names: dict[str, Named]) -> list[str]:
    """The names of `let` that could not be read."""
    let = value.get("let")
    return [name for name in let if name not in names] if isinstance(let, dict) else ["let"] if let else []


def keys_known(reader: Reader) -> Any:
    def known(mapping: Any) -> list[str]:
        model = reader.read_as.get(id(mapping))
        return model.keys() if model is not None else []  # type: ignore[attr-defined]

    return known


def _default_observables() -> list[Item]:
    items = Choice(OBSERVABLES, "observable", bare=True).items()
    return [items[name].model_validate({name: {}}) for name in DEFAULT_OBSERVABLES]


def _not_yet(value: dict[str, Any]) -> Iterator[Key]:
    """The paths of what is not available yet, none of them inside another."""
    found: list[Key] = []
    for pattern in NOT_YET:
        found += [path for path in _matches(value, pattern) if not any(path[: len(f)] == f for f in found)]
    yield from found


def _later(value: Any, path: Key) -> tuple[str, str]:
    """Message and cure for a key, or a name in a list, that is not available yet."""
    for part in path:
        value = value[part]
    word = value if isinstance(path[-1], int) else path[-1]
    return f"`{word}` is not available yet", "leave it out"


def _matches(value: Any, pattern: tuple[str, ...], path: Key = ()) -> Iterator[Key]:
    """The paths in `value` that fit `pattern`, where `*` stands for any key or place of a list."""
    if not pattern:
        yield path
        return
    wanted, rest = pattern[0], pattern[1:]
    inner = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    for key, item in inner:
        if wanted in ("*", key):
            yield from _matches(item, rest, (*path, key))
            if rest == (item,):  # a kind that stands there as its name alone
                yield (*path, key)


def read_units(document: Merged, value: dict[str, Any], problems: list[Problem]) -> Units:
    """The file's units; where they are wrong, some that let the rest be read."""
    written = value.get("units")
    if isinstance(written, dict):
        parts: list[tuple[Key, Any]] = [(("units", kind), {kind: unit}) for kind, unit in written.items()]
    else:
        parts = [(("units",), written)]
    wrong = []
    for key, part in parts:
        try:
            Units.from_file(part)
        except QuantityError as error:
            wrong.append(problem_at(document, key, error.message, error.fix, key=error.message.startswith("`units`")))
    problems += wrong
    return Units.from_file({"length": "nm", "time": "fs", "energy": "meV"} if wrong else written)


def read_names(document: Merged, value: dict[str, Any], units: Units, problems: list[Problem]) -> dict[str, Named]:
    """The quantities of `let`; later ones may use earlier ones."""
    names: dict[str, Named] = {}
    written = value.get("let")
    if written is None:
        return names
    if not isinstance(written, dict):
        problems.append(
            problem_at(
                document,
                ("let",),
                f"{shown(written)} stands where names are wanted",
                "write {b2: 3 nm, V0: 300 meV}",
            )
        )
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
        mass, charge = written.mass, written.charge
        if mass is None and units.system == "file":
            if "mass" not in document.value["particle"]:  # else it was refused already
                problem = problem_at(document, ("particle",), "`mass` is missing", "add it, or name a particle")
                problems.append(replace(problem, key="particle.mass"))
            return None
        unless_given = 1.0 if units.system == "natural" else 0.0
        return Particle(1.0 if mass is None else mass, unless_given if charge is None else charge)
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
