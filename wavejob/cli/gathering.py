"""The jobs that paths on the command line stand for, with every mistake in them."""

from __future__ import annotations

from argparse import Namespace
from collections.abc import Sequence
from dataclasses import dataclass, field
from pathlib import Path

from ..families import Family, load_family
from ..job import Job
from ..problems import JobFileError, Place, Problem, in_order
from ..reading.tree import JobTree, find_tree, shown
from .arguments import UsageError
from .sizes import counted


@dataclass
class Gathered:
    """Job files that could be read, problems of those that could not; `files` counts both."""

    families: list[Family] = field(default_factory=list)
    problems: list[Problem] = field(default_factory=list)
    files: int = 0

    @property
    def jobs(self) -> list[Job]:
        """Every job, each variant of a varied file by itself."""
        return [job for family in self.families for job in family.jobs]


def gather(options: Namespace) -> Gathered:
    """Reads every job of `options.paths`. Raises UsageError where no path is given."""
    if not options.paths:
        raise UsageError(f"wavejob {options.command}", "no job file given", "name a job file or a folder of them")
    found = Gathered()
    seen: set[Path] = set()
    for path in options.paths:
        try:
            tree = find_tree(Path(path), options.tree)
            files = [file for file in tree.job_files(Path(path)) if file not in seen]
            if not files and not seen:
                found.problems.append(_empty(path))
        except JobFileError as error:
            found.problems += error.problems
            continue
        except (OSError, ValueError) as error:
            found.problems.append(_unreadable(Path(path), error))
            continue
        seen |= set(files)
        _read(files, tree, options.trust_paths, found)
    found.problems = list(dict.fromkeys(in_order(found.problems)))
    return found


def _read(files: Sequence[Path], tree: JobTree, trust: bool, found: Gathered) -> None:
    for file in files:
        found.files += 1
        try:
            found.families.append(load_family(file, tree, trust_paths=trust))
        except JobFileError as error:
            found.problems += error.problems
        except (OSError, UnicodeError) as error:
            found.problems.append(_unreadable(file, error))


def _empty(path: str) -> Problem:
    return Problem(
        "there are no job files in it",
        "they end in .yml or .yaml, and do not begin with `_` or `.`",
        place=Place(path),
    )


def _unreadable(path: Path, error: Exception) -> Problem:
    said = error.strerror if isinstance(error, OSError) else str(error)
    return Problem(f"can't be read: {said}", "check its name and permissions", place=Place(shown(path)))


def doubled(families: Sequence[Family]) -> list[Problem]:
    """Jobs of different trees that would share a folder once runs are kept in one place."""
    first: dict[str, Family] = {}
    return [
        Problem(
            f"has the same job id as `{shown(first[family.id].source.path)}`: `{family.id}`",
            "name both below one tree with --tree DIR, or keep their runs apart",
            place=Place(shown(family.source.path)),
        )
        for family in families
        if first.setdefault(family.id, family) is not family
    ]


def tally(problems: Sequence[Problem]) -> str:
    """`3 mistakes, 1 warning`."""
    mistakes = sum(problem.severity == "error" for problem in problems)
    parts = [counted(mistakes, "mistake")] if mistakes else []
    if len(problems) > mistakes:
        parts.append(counted(len(problems) - mistakes, "warning"))
    return ", ".join(parts) or "no mistakes"
