"""Remove old runs: the newest of each job stay. Lists what it would remove, unless --yes is given."""

from __future__ import annotations

import re
from argparse import ArgumentParser, ArgumentTypeError, Namespace
from collections.abc import Sequence
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from ..outputs.pruning import Outdated, outdated, remove
from ..outputs.run_tree import RUNS, claimed_runs, marked_folder
from ..problems import RunError
from ..reading.tree import PathError, find_tree, located, shown
from . import terminal
from .arguments import add_format
from .json_report import job_entry, show_json
from .sizes import counted, size

KEPT = 3


def add_arguments(parser: ArgumentParser) -> None:
    parser.add_argument(
        "folder", nargs="?", type=Path, default=Path(), metavar="DIR", help="a job tree or a folder of runs; else here"
    )
    parser.add_argument(
        "--keep", type=_count, default=KEPT, metavar="N", help=f"how many runs of each job stay, {KEPT} if left out"
    )
    parser.add_argument("--yes", action="store_true", help="remove them")
    add_format(parser)


def run(options: Namespace) -> int:
    kept, below = _place(options)
    runs = claimed_runs(kept, below)
    old = outdated(runs, options.keep, datetime.now(UTC))
    statuses: dict[Outdated, str] = dict.fromkeys(old, "would be removed")
    failed = False
    if options.yes:
        for entry in old:
            try:
                statuses[entry] = "removed" if remove(kept, entry) else "in use"
            except RunError as error:
                statuses[entry], failed = "failed", True
                terminal.say(str(error))
    if options.format == "json":
        show_json("prune", [], [_entry(entry, status) for entry, status in statuses.items()])
    else:
        for line in _lines(statuses):
            terminal.show(line)
    if not options.quiet:
        terminal.say(_summary(statuses, len(runs), removed=options.yes))
    return 1 if failed else 0


def _place(options: Namespace) -> tuple[Path, Path]:
    """The marked folder, and the part of it that is looked through. Raises PathError."""
    tree = find_tree(options.folder, options.tree)
    here = located(options.folder)
    if not here.is_dir():
        raise PathError("is no folder", "name a job tree, or a folder of runs", options.folder)
    for below in (here, tree.root / RUNS):
        kept = marked_folder(below)
        if kept is not None:
            return kept, below
    raise PathError("keeps no runs", "name a job tree that was run, or the folder given to --runs", options.folder)


def _entry(old: Outdated, status: str) -> dict[str, Any]:
    run = old.run
    return job_entry(run.job, run.fingerprint, status, folder=shown(run.path)) | {
        "reason": old.reason,
        "touched": _moment(old),
        "bytes": old.size,
    }


def _lines(statuses: dict[Outdated, str]) -> Sequence[str]:
    rows = [
        (shown(old.run.path), _moment(old), size(old.size), status + f" ({old.reason})")
        for old, status in statuses.items()
    ]
    paths, sizes = (max((len(row[column]) for row in rows), default=0) for column in (0, 2))
    return [f"{path:<{paths}}  {moment}  {room:>{sizes}}  {said}" for path, moment, room, said in rows]


def _summary(statuses: dict[Outdated, str], runs: int, *, removed: bool) -> str:
    wanted = "removed" if removed else "would be removed"
    gone = [old for old, status in statuses.items() if status == wanted]
    freed = size(sum(old.size for old in gone))
    said = f"{len(gone)} of {counted(runs, 'run')} {wanted}, {freed}"
    return said if removed or not gone else f"{said}; give --yes to remove"


def _moment(old: Outdated) -> str:
    return old.touched.strftime("%Y-%m-%dT%H:%M:%SZ")


def _count(text: str) -> int:
    if not re.fullmatch(r"0*[1-9][0-9]{0,8}", text, re.ASCII):
        raise ArgumentTypeError(f"`{text}` is no number of runs; write a whole number from 1")
    return int(text)
