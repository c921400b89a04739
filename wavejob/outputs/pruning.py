"""Old runs: which may go, how much room they take, and how they are removed."""

from __future__ import annotations

import contextlib
import os
import shutil
from collections.abc import Iterable
from dataclasses import dataclass
from datetime import UTC, datetime, timedelta
from itertools import groupby
from pathlib import Path

from ..problems import RunError
from .folder import LOCK, MANIFEST, OWNER
from .lock import locked
from .run_tree import StoredRun, claimed_runs, current_variants, in_time

AT_REST = timedelta(days=1)  # an unfinished run that was written to since may still be at work


@dataclass(frozen=True)
class Outdated:
    """A run that may go: why, when it was last written to, and its size in bytes."""

    run: StoredRun
    reason: str
    touched: datetime
    size: int


def outdated(runs: Iterable[StoredRun], keep: int, now: datetime) -> list[Outdated]:
    """Runs that may go: of each job the finished ones but for the newest `keep`, and unfinished ones at rest.

    The current variants of a varied job belong together: none of them goes.
    """
    found = []
    for _, group in groupby(sorted(runs, key=lambda run: run.job), key=lambda run: run.job):
        of_job = list(group)
        together = current_variants(of_job[0].path.parent)
        ended = in_time(run for run in of_job if run.fingerprint not in together)
        for run in ended[: max(len(ended) - keep, 0)]:
            found.append(_weighed(run, f"{keep} newer" if keep > 1 else "a newer one"))
        unfinished = [_weighed(run, "unfinished") for run in of_job if not (run.path / MANIFEST).exists()]
        found += [old for old in unfinished if now - old.touched >= AT_REST and not _held(old.run.path / LOCK)]
    return found


def remove(kept: Path, old: Outdated) -> bool:
    """Removes a run of the marked folder `kept`; False where it is no longer what it was, so that it stays.

    The manifest goes first and the note that claims the folder last: cut short, it is an unfinished run.
    Runs of another job that lie below stay. Raises RunError where the system refuses.
    """
    path = old.run.path
    if not path.is_dir() or _weighed(old.run, old.reason) != old:
        return False
    try:
        lock = locked(path / LOCK)
        if lock is None:
            return False
        with lock:
            if old.run not in claimed_runs(kept, path):
                return False
            _emptied(path)
        (path / LOCK).unlink()
    except OSError as error:
        raise RunError(f"could not remove `{path}`: {error.strerror}", "check its permissions") from error
    for folder in (path, *path.parents):
        if folder == kept:
            break
        with contextlib.suppress(OSError):  # other runs are in it
            folder.rmdir()
    return True


def _emptied(path: Path) -> None:
    """Removes all but the lock, which some systems do not let go of while it is held, and runs of other jobs."""
    (path / MANIFEST).unlink(missing_ok=True)
    for entry in sorted(path.iterdir()):
        if entry.is_dir() and not entry.is_symlink():
            if not any(entry.rglob(OWNER)):
                shutil.rmtree(entry)
        elif entry.name not in (OWNER, LOCK):
            entry.unlink()
    (path / OWNER).unlink()


def _held(lock: Path) -> bool:
    """Whether a process is at work in a folder, or may be: its lock cannot be tried."""
    if not lock.exists():
        return False
    try:
        mine = locked(lock)
    except OSError:
        return True
    if mine is None:
        return True
    with mine:
        return False


def _weighed(run: StoredRun, reason: str) -> Outdated:
    """A run with its size and the time it was last written to; runs of other jobs below it do not count."""
    found = [run.path.stat()]
    for name, folders, files in os.walk(run.path):
        here = Path(name)
        folders[:] = [folder for folder in folders if not any((here / folder).rglob(OWNER))]
        for file in files:
            with contextlib.suppress(FileNotFoundError):  # a run at work renames its files
                found.append((here / file).lstat())
    touched = datetime.fromtimestamp(max(entry.st_mtime for entry in found), UTC)
    return Outdated(run, reason, touched, sum(entry.st_size for entry in found[1:]))
