"""Compare the results of two runs, two run trees, or a tree and a baseline file: A is before, B after."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from collections import Counter
from collections.abc import Sequence
from dataclasses import dataclass
from os.path import exists, isdir, isfile
from pathlib import Path

from ..evidence.comparison import Comparison, Outcome, compare
from ..outputs.run_tree import RUNS, StoredRun, finished_runs, newest
from ..outputs.stored import Figures, read_baseline, read_figures, write_baseline
from ..problems import JobFileError, Place, Problem
from ..reading.tree import is_marked, shown
from . import terminal
from .arguments import UsageError, add_format
from .compare_words import block, entry, most_telling, tally
from .json_report import job_entry, show_json
from .sizes import counted

SIDES = "two runs, run trees or baseline files"


@dataclass(frozen=True)
class Side:
    """What A or B stands for: the newest figures of each job, and where they are.

    `alone` tells that one job was named, by the folder of its runs or of one of them.
    """

    jobs: dict[str, Figures]
    folders: dict[str, str]
    alone: bool = False


@dataclass(frozen=True)
class Pair:
    """One job on both sides, or on one; `name` is what it is called after."""

    name: str
    before: Figures | None
    after: Figures | None
    folder: str | None
    results: tuple[Comparison, ...]

    @property
    def outcome(self) -> Outcome:
        """That of the job: it appeared or vanished as a whole, or the most telling one of its results."""
        if self.before is None:
            return "appeared"
        return "vanished" if self.after is None else most_telling(self.results)


def add_arguments(parser: ArgumentParser) -> None:
    parser.add_argument(
        "sides", nargs="*", metavar="A B", help="a run's folder, a folder of runs, a job tree, or a baseline file"
    )
    parser.add_argument(
        "--write-baseline", type=Path, metavar="FILE", help="write the figures of A into FILE, to be compared later"
    )
    parser.add_argument("--strict", action="store_true", help="exit with 1 for a result that is undecided too")
    add_format(parser)


def run(options: Namespace) -> int:
    if options.write_baseline is not None:
        return _write(options)
    if len(options.sides) != 2:
        named = "nothing" if not options.sides else counted(len(options.sides), "name")
        raise UsageError("wavejob compare", f"takes two names, and got {named}", f"name {SIDES}")
    before, after = _both([Path(name) for name in options.sides])
    pairs = paired(before, after)
    results = [result for pair in pairs for result in pair.results]
    counts = Counter(result.outcome for result in results)
    if options.format == "json":
        jobs = [
            job_entry(
                pair.name,
                figures.fingerprint,
                pair.outcome,
                folder=pair.folder,
                verdict=figures.verdict,
            )
            for pair in pairs
            if (figures := pair.after or pair.before)
        ]
        found = [entry(pair.name, result) for pair in pairs for result in pair.results]
        show_json("compare", [], jobs, results=found)
    else:
        for pair in pairs:
            if pair.outcome != "same":
                terminal.show(block(pair.name, pair.outcome, pair.results))
        if not options.quiet:
            terminal.say(f"{counted(len(pairs), 'job')} compared: {tally(counts)}")
    telling = {"differs", "appeared", "vanished"} | ({"undecided"} if options.strict else set())
    return 1 if any(pair.outcome in telling for pair in pairs) else 0


def paired(before: Side, after: Side) -> list[Pair]:
    """Jobs of one name together, in order of name; two that were named by themselves whatever they are called.

    Where only one side names a job by itself, the other is narrowed to that job.
    """
    if before.alone and after.alone:
        ((first, figures),), ((second, others),) = before.jobs.items(), after.jobs.items()
        name = first if first == second else f"{first} -> {second}"
        return [_pair(name, figures, others, after.folders.get(second))]
    names = sorted({*before.jobs, *after.jobs})
    if before.alone or after.alone:
        names = sorted(before.jobs if before.alone else after.jobs)
    return [
        _pair(name, before.jobs.get(name), after.jobs.get(name), after.folders.get(name) or before.folders.get(name))
        for name in names
    ]


def _pair(name: str, before: Figures | None, after: Figures | None, folder: str | None) -> Pair:
    results = compare(before.measured if before else {}, after.measured if after else {})
    return Pair(name, before, after, folder, tuple(results))


def _both(paths: Sequence[Path]) -> list[Side]:
    """Both sides, or the mistakes in both. Raises JobFileError."""
    sides, problems = [], []
    for path in paths:
        try:
            sides.append(_side(path))
        except JobFileError as error:
            problems += error.problems
    if problems:
        raise JobFileError(dict.fromkeys(problems))
    return sides


def _side(path: Path) -> Side:
    """The figures that a name stands for. Raises JobFileError."""
    if isfile(path):  # which also takes names that are too long, or hold a zero byte
        return Side(read_baseline(path), {})
    if not isdir(path):
        raise _mistake(path, "there is no such file or folder", f"name {SIDES}")
    runs = finished_runs(path / RUNS if is_marked(path / RUNS) else path)
    chosen = newest(runs)
    if not chosen:
        raise _mistake(path, "holds no finished run", "name a folder below `runs/`, or a job tree that was run")
    figures = {job: read_figures(one) for job, one in chosen.items()}
    folders = {job: shown(one.path) for job, one in chosen.items()}
    return Side(figures, folders, len(chosen) == 1 and _is_named(path, runs))


def _is_named(path: Path, runs: Sequence[StoredRun]) -> bool:
    """Whether `path` is itself a run, or the folder that holds all runs of its job."""
    return all(path in (run.path, run.path.parent) for run in runs)


def _write(options: Namespace) -> int:
    target: Path = options.write_baseline
    if len(options.sides) != 1:
        raise UsageError(
            "wavejob compare", "`--write-baseline` takes the figures of one name", "name one run or run tree"
        )
    if target.suffix != ".json":
        raise UsageError("wavejob compare", f"`{target}` does not end in .json", "write e.g. `baseline.json`")
    if not isdir(target.parent):
        raise UsageError("wavejob compare", f"there is no folder `{target.parent}`", "make it first")
    if exists(target):
        read_baseline(target)  # or another file would be lost
    jobs = _side(Path(options.sides[0])).jobs
    write_baseline(target, jobs)
    if not options.quiet:
        results = counted(sum(len(figures.results) for figures in jobs.values()), "result")
        terminal.say(f"{shown(target)}: {results} of {counted(len(jobs), 'job')}")
        doubted = [job for job, figures in jobs.items() if figures.verdict != "trusted"]
        if doubted:
            terminal.say(f"warning: not trusted: {', '.join(doubted)}")
    if options.format == "json":
        entries = [
            job_entry(job, figures.fingerprint, "written", verdict=figures.verdict) for job, figures in jobs.items()
        ]
        show_json("compare", [], entries)
    return 0


def _mistake(path: Path, message: str, fix: str) -> JobFileError:
    return JobFileError([Problem(message, fix, place=Place(shown(path)))])
