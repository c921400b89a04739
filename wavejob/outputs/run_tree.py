"""The runs below a folder: whose they are, when they ended, which of a job is the newest."""

from __future__ import annotations

import os
import re
from collections.abc import Iterable, Iterator, Sequence
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Any

from ..reading.tree import PathError, is_marked
from .folder import MANIFEST, OWNER, RunFolder, document

RUNS = "runs"
VARIANTS = "variants.csv"  # beside the runs of a varied job: those that belong to it now


@dataclass(frozen=True)
class StoredRun:
    """One run folder; `ended` is None while it is unfinished, `variant` says what sets it apart in a varied job."""

    path: Path
    job: str
    fingerprint: str
    ended: datetime | None
    variant: tuple[tuple[str, str], ...] = ()

    @property
    def name(self) -> str:
        """The job, and what sets a variant apart: `stack/scan (b2 = 2.9 nm)`."""
        apart = ", ".join(f"{key} = {value}" for key, value in self.variant)
        return f"{self.job} ({apart})" if apart else self.job


def finished_runs(folder: Path) -> list[StoredRun]:
    """Every finished run in `folder` and below it, known by its manifest alone: a copied run counts too."""
    found = []
    for path in _folders(folder):
        manifest = document(path / MANIFEST)
        run = _described(path, manifest, _moment(manifest)) if manifest else None
        if run is not None and run.ended is not None:
            found.append(run)
    return found


def newest(runs: Sequence[StoredRun]) -> dict[str, StoredRun]:
    """By name, the finished run of each job or variant that ended last, in order of name.

    Variants that the table beside them no longer lists are left out, unless there is no other run.
    """
    chosen: dict[str, StoredRun] = {}
    for run in in_time(runs):
        listed = current_variants(run.path.parent) if run.variant and len(runs) > 1 else set()
        if not listed or run.fingerprint in listed:
            chosen[run.name] = run
    return dict(sorted(chosen.items()))


def in_time(runs: Iterable[StoredRun]) -> list[StoredRun]:
    """Finished runs, the oldest first."""
    ended = [(run.ended, run.fingerprint, run) for run in runs if run.ended is not None]
    return [run for _, _, run in sorted(ended, key=lambda entry: entry[:2])]


def claimed_runs(kept: Path, below: Path) -> list[StoredRun]:
    """Every run at its own place in the marked folder `kept`, in `below` or under it, finished or not.

    A folder without the note that claims it, or that was moved from where its job's runs are, is none.
    """
    found = []
    for path in _folders(below):
        run = _described(path, document(path / OWNER), None)
        if run is None:
            continue
        try:
            folder = RunFolder(kept, run.job, run.fingerprint)
        except ValueError:
            continue
        if folder.path == path:
            found.append(StoredRun(path, run.job, run.fingerprint, _moment(folder.finished() or {})))
    return found


def current_variants(job: Path) -> set[str]:
    """Every word in the table of variants of a job's folder, fingerprints among them; empty where there is none."""
    try:
        return set(re.findall(r"\w+", (job / VARIANTS).read_text(encoding="utf-8", errors="replace")))
    except FileNotFoundError:
        return set()


def marked_folder(path: Path) -> Path | None:
    """The marked folder that `path` is or lies in."""
    return next((folder for folder in (path, *path.parents) if is_marked(folder)), None)


def _folders(top: Path) -> Iterator[Path]:
    """`top` and all folders below it, in order of name; links are not followed, other folders of runs not entered."""
    for name, folders, _ in os.walk(top, onerror=_unsearchable):
        here = Path(name)
        folders[:] = sorted(folder for folder in folders if not is_marked(here / folder))
        yield here


def _described(path: Path, note: dict[str, Any] | None, ended: datetime | None) -> StoredRun | None:
    job, fingerprint, variant = ((note or {}).get(key) for key in ("job", "fingerprint", "variant"))
    if not isinstance(job, str) or not isinstance(fingerprint, str):
        return None
    apart = tuple((key, str(value)) for key, value in variant.items()) if isinstance(variant, dict) else ()
    return StoredRun(path, job, fingerprint, ended, apart)


def _moment(manifest: dict[str, Any]) -> datetime | None:
    try:
        moment = datetime.fromisoformat(manifest["ended"])
    except (KeyError, TypeError, ValueError):
        return None
    return moment if moment.tzinfo else moment.replace(tzinfo=UTC)


def _unsearchable(error: OSError) -> None:
    if isinstance(error, FileNotFoundError):  # removed meanwhile
        return
    raise PathError(f"can't be searched: {error.strerror}", "check its permissions", Path(error.filename))
