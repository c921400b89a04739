"""Files appear whole or not at all: written beside the target, then renamed over it."""

from __future__ import annotations

import contextlib
import errno
import os
import secrets
from collections.abc import Iterator
from pathlib import Path
from typing import IO, Any, Literal

from ..problems import RunError

ELSEWHERE = "choose a folder you may write to with --runs DIR"
ROOM = "make room, for instance with `wavejob prune`, or choose another disk with --runs DIR"
SHORTER = "shorten the name of the job file or its folders, or choose a shorter --runs DIR"
CAUSES = {
    errno.ENOSPC: ("the disk is full", ROOM),
    errno.EDQUOT: ("your quota on this disk is used up", ROOM),
    errno.EFBIG: ("the file would be larger than allowed here", "raise the limit, or store fewer snapshots"),
    errno.EROFS: ("the file system is read-only", ELSEWHERE),
    errno.EACCES: ("you may not write there", ELSEWHERE),
    errno.EPERM: ("you may not write there", ELSEWHERE),
    errno.ENAMETOOLONG: ("the name is too long", SHORTER),
    errno.ENOENT: ("its folder is gone", "leave the run folder alone while a job runs"),
    errno.ENOTDIR: ("a file stands where a folder is needed", "move that file away, or choose --runs DIR"),
    errno.EEXIST: ("a file stands where a folder is needed", "move that file away, or choose --runs DIR"),
    errno.EIO: ("the disk reports an error", "check the disk, or choose another one with --runs DIR"),
}


@contextlib.contextmanager
def atomic(path: Path, mode: Literal["w", "wb"] = "w") -> Iterator[IO[Any]]:
    """An open file that becomes `path` when the block ends well, and nothing when it does not.

    Text is UTF-8 with `\\n`. Raises RunError where the file can't be written.
    """
    encoding, newline = ("utf-8", "\n") if mode == "w" else (None, None)
    with atomic_path(path) as temporary, temporary.open(mode, encoding=encoding, newline=newline) as file:
        yield file


@contextlib.contextmanager
def atomic_path(path: Path) -> Iterator[Path]:
    """A temporary name beside `path`, with its ending, for writers that open a file themselves."""
    temporary = path.with_name(f".{path.stem}.{secrets.token_hex(4)}{path.suffix}")
    try:
        # made here and not by the writer, so that the permissions are those the user's umask asks for
        os.close(os.open(temporary, os.O_CREAT | os.O_EXCL | os.O_WRONLY, 0o666))
    except OSError as error:
        raise unwritable(path, error) from error
    try:
        yield temporary
        _to_disk(temporary)
        os.replace(temporary, path)
        if os.name == "posix":
            _to_disk(path.parent)
    except OSError as error:
        if error.filename is None or Path(error.filename) in (temporary, path, path.parent):
            raise unwritable(path, error) from error
        raise  # it speaks of another file
    finally:
        with contextlib.suppress(OSError):  # gone, where all went well
            temporary.unlink()


def unwritable(path: Path, error: OSError) -> RunError:
    """What to tell a user when the system refuses to write `path`."""
    cause, fix = CAUSES.get(error.errno or 0, (error.strerror or str(error), ELSEWHERE))
    return RunError(f"could not write `{path}`: {cause}", fix)


def _to_disk(path: Path) -> None:
    """Waits until `path`, a file or a folder, is safe from a power cut."""
    handle = os.open(path, os.O_RDONLY)
    try:
        os.fsync(handle)
    finally:
        os.close(handle)
