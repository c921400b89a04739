"""The folder of one run: whose it is, whether it is finished, and how it is begun."""

from __future__ import annotations

import contextlib
import json
from collections.abc import Collection, Iterator
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from ..problems import RunError
from .files import unwritable
from .lock import locked
from .tables import write_json

MANIFEST = "manifest.json"  # written last: a folder without it is unfinished
RESULTS = "results.json"
OWNER = ".job"  # tells whose folder this is, from the first moment on
LOCK = ".lock"  # held by the process that writes here; it may stay when nobody does


@dataclass(frozen=True)
class RunFolder:
    """`runs/<job>/<fingerprint>`. A job's id may hold `/`; its folders are then nested."""

    runs: Path
    job: str
    fingerprint: str

    def __post_init__(self) -> None:
        names = self.job.split("/")
        if not self.job.isprintable() or "\\" in self.job or any(name in ("", ".", "..") for name in names):
            raise ValueError(f"no job id: {self.job!r}")
        if not self.fingerprint.isalnum():
            raise ValueError(f"no fingerprint: {self.fingerprint!r}")

    @property
    def path(self) -> Path:
        return self.runs.joinpath(*self.job.split("/"), self.fingerprint)

    def finished(self) -> dict[str, Any] | None:
        """The manifest of a finished run of this very job; None where it, or what was found, is missing or damaged."""
        manifest = document(self.path / MANIFEST)
        whole = self._is_mine(manifest) and self._is_mine(document(self.path / RESULTS))
        return manifest if whole else None

    @property
    def partial(self) -> tuple[str, ...]:
        """What a finished run left out, such as "film"; a later full run completes it."""
        return tuple((self.finished() or {}).get("partial", ()))

    @contextlib.contextmanager
    def held(self) -> Iterator[None]:
        """Makes the folder and claims it; no other process can while the block lasts.

        Raises RunError for a folder of another job, for one that another process holds, and where the disk refuses.
        """
        try:
            self.path.mkdir(parents=True, exist_ok=True)
            self._claim()
            lock = locked(self.path / LOCK)
        except OSError as error:
            raise unwritable(self.path, error) from error
        if lock is None:
            raise RunError(
                f"another process is at work in `{self.path}`", "wait until it has ended, or choose --runs DIR"
            )
        with lock:
            yield

    def begin(self, keep: Collection[str] = ()) -> None:
        """Clears what an earlier run left, but for the names in `keep`; to be called while the folder is held.

        From here on the run is unfinished, until its manifest is written. Raises RunError where the disk refuses.
        """
        try:
            self._clear({*keep, OWNER, LOCK})
        except OSError as error:
            raise unwritable(self.path, error) from error

    def _claim(self) -> None:
        note = self.path / OWNER
        if not note.exists():
            strange = sorted(entry.name for entry in self.path.iterdir() if not _is_own_or_folder(entry))
            if strange:
                raise RunError(
                    f"`{self.path}` holds files that no run has left there, such as `{strange[0]}`",
                    "move that folder away, or choose another place with --runs DIR",
                )
            write_json(note, {"job": self.job, "fingerprint": self.fingerprint})
        owner = document(note)
        if not self._is_mine(owner):
            whose = f"job `{owner.get('job')}`" if owner else "something else"
            raise RunError(f"`{self.path}` belongs to {whose}", "rename one of the jobs, or choose --runs DIR")

    def _clear(self, keep: Collection[str]) -> None:
        """Removes this run's files, the manifest first: cut short, the folder counts as unfinished.

        Folders stay: a job `a/b` may have its own below a job `a`.
        """
        if MANIFEST not in keep:
            (self.path / MANIFEST).unlink(missing_ok=True)
        for entry in self.path.iterdir():
            if entry.name not in keep and not (entry.is_dir() and not entry.is_symlink()):
                entry.unlink()

    def _is_mine(self, note: dict[str, Any] | None) -> bool:
        return note is not None and (note.get("job"), note.get("fingerprint")) == (self.job, self.fingerprint)


def _is_own_or_folder(entry: Path) -> bool:
    """Whether an entry may stand in a folder that nobody claimed yet: a cut-off note, or a job's folder."""
    return entry.is_dir() or entry.name == LOCK or entry.name.startswith(f".{OWNER}.")


def document(path: Path) -> dict[str, Any] | None:
    """The JSON object in a file; None where it is missing or damaged."""
    try:
        document = json.loads(path.read_bytes())
    except (OSError, ValueError):
        return None
    return document if isinstance(document, dict) else None
