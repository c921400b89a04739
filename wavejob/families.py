"""A varied job file: one job for each combination of its values, all checked before any of them runs."""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, replace
from functools import cached_property
from pathlib import Path
from typing import Any

from .job import Job, Varied
from .loading import Source, checked, keys_known, mapping, read_names, read_units, sections
from .problems import JobFileError, Problem, nearest
from .reading.merging import Key, Merged
from .reading.quantities import QuantityError
from .reading.tree import JobTree
from .reading.validation import problem_at, read_as
from .reading.walks import SECTIONS, Walks, read_walks, written
from .settings import ExpectKeys, VaryKeys

MOST_FILMS = 20  # variants; larger families draw films only where the file asks for them
SAME = 1e-9  # relative difference of two values that are meant to be one


@dataclass(frozen=True)
class Family:
    """The jobs of one file, in the order of its values; a file without `vary` is a family of one."""

    source: Source
    walks: Walks
    jobs: tuple[Job, ...]

    @property
    def id(self) -> str:
        return self.jobs[0].id

    @property
    def title(self) -> str:
        return self.jobs[0].keys.job or self.id

    @property
    def is_varied(self) -> bool:
        return bool(self.walks.walks)

    @cached_property
    def expected(self) -> tuple[str, ...]:
        """The results that the file names in `expect`, in its order."""
        written = self.source.document.value.get("expect") or []
        return tuple(dict.fromkeys(str(one["result"]) for one in written))


def load_family(path: str | Path, tree: JobTree | None = None, *, trust_paths: bool = False) -> Family:
    """Every job of the file at `path`. Raises JobFileError with every mistake found in any of them."""
    return _family(Source.of_file(Path(path), tree, trust_paths))


def parse_family(text: str, *, folder: Path | None = None, name: str = "job") -> Family:
    """Every job of `text`; paths in it are relative to `folder`. Raises JobFileError."""
    return _family(Source.of_text(text, folder, name))


def load_variant(path: Path, tree: JobTree, index: int, *, trust_paths: bool = False) -> Job:
    """One job of the file at `path`, counted from 0. Raises JobFileError."""
    source = Source.of_file(path, tree, trust_paths)
    if not sections(source.document):
        return checked(source)
    return _variant(source, _walks(source), index)


def _family(source: Source) -> Family:
    if not sections(source.document):
        return Family(source, Walks(), (_without_when(checked(source)),))
    walks = _walks(source)
    jobs, wrong = [], []
    for index in range(walks.count):
        try:
            jobs.append(_variant(source, walks, index))
        except JobFileError as error:
            wrong.append((walks.label(index), error.problems))
    problems = told_once(wrong, walks.count)
    if not wrong:
        problems += _never_judged(source.document, jobs)
    if problems:
        raise JobFileError(problems)
    return Family(source, walks, tuple(jobs))


def _walks(source: Source) -> Walks:
    """What the file varies. Raises JobFileError."""
    document = source.document
    value = mapping(document)
    problems: list[Problem] = []
    units = read_units(document, value, problems)
    names = read_names(document, value, units, problems)
    reader = source.reader(units, names)
    head = replace(document, value={name: value[name] for name in SECTIONS if name in value})
    keys, mistakes = read_as(VaryKeys, head, reader, keys_known(reader))
    problems += mistakes
    if problems or keys is None:
        raise JobFileError(problems)
    return read_walks(document, {"vary": keys.vary, "vary_together": keys.vary_together}, units, names)


def _variant(source: Source, walks: Walks, index: int) -> Job:
    job = checked(source, walks, index)
    if walks.count > MOST_FILMS and "film" not in job.keys.model_fields_set:
        job = replace(job, keys=job.keys.model_copy(update={"film": "none"}))
    return _without_when(job)


def _without_when(job: Job) -> Job:
    """The job with the expectations that are judged in it, and no others. Raises JobFileError."""
    if all(expect.when is None for expect in job.keys.expect):
        return job
    problems = [problem for index, expect in enumerate(job.keys.expect) for problem in _misfit(job, index, expect)]
    if problems:
        raise JobFileError(problems)
    places = tuple(index for index, expect in enumerate(job.keys.expect) if _applies(job, expect))
    kept = [job.keys.expect[index].model_copy(update={"when": None}) for index in places]
    return replace(job, keys=job.keys.model_copy(update={"expect": kept}), expected_at=places)


def _misfit(job: Job, index: int, expect: ExpectKeys) -> Iterable[Problem]:
    """What is wrong with the `when` of an expectation."""
    varied = {one.key: one for one in job.variant}
    for key, value in (expect.when or {}).items():
        path: Key = ("expect", index, "when", key)
        if not varied:
            yield job.problem(path, "nothing is varied in this job", "leave `when` out, or add `vary`")
        elif key not in varied:
            near = nearest(key, varied)
            known = ", ".join(f"`{name}`" for name in varied)
            fix = f"did you mean `{near}`?" if near else f"there are: {known}"
            yield job.problem(path, f"`{key}` is not varied", fix)
        elif varied[key].value is not None:
            try:
                job.units.read(value, varied[key].dimension)
            except QuantityError as error:
                yield job.problem(path, error.message, error.fix)


def _applies(job: Job, expect: ExpectKeys) -> bool:
    varied = {one.key: one for one in job.variant}
    return all(_is(job, varied[key], value) for key, value in (expect.when or {}).items())


def _is(job: Job, varied: Varied, value: Any) -> bool:
    if varied.value is None:
        return written(value) == varied.text
    wanted = job.units.read(value, varied.dimension)
    return abs(wanted - varied.value) <= SAME * max(abs(wanted), abs(varied.value))


def _never_judged(document: Merged, jobs: Sequence[Job]) -> list[Problem]:
    """One problem for each expectation whose `when` no variant meets."""
    given = [ExpectKeys.model_construct(**one) for one in document.value.get("expect") or []]
    return [
        problem_at(
            document,
            ("expect", index, "when"),
            "no variant has these values",
            "write values as they stand in `vary`",
        )
        for index, expect in enumerate(given)
        if getattr(expect, "when", None) and not any(_applies(job, expect) for job in jobs)
    ]


def told_once(found: Sequence[tuple[str, Sequence[Problem]]], count: int) -> list[Problem]:
    """What is wrong in several of `count` variants, each told once with the first of those it is wrong in.

    `found` holds the label of a variant and its problems; what is the same in all of them needs no label.
    """
    by_spot: dict[Any, list[tuple[str, Problem]]] = {}
    for label, problems in found:
        for problem in problems:
            by_spot.setdefault((problem.place, problem.key, problem.severity), []).append((label, problem))
    told = []
    for group in by_spot.values():
        label, first = group[0]
        others = len({label for label, _ in group}) - 1
        if not label or (others == count - 1 and len({problem.message for _, problem in group}) == 1):
            told += list(dict.fromkeys(problem for _, problem in group))
            continue
        more = f" and {others} more variants" if others > 1 else " and another variant" if others else ""
        told.append(replace(first, message=f"with {label}{more}: {first.message}"))
    return told
