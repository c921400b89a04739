"""A file that one process at a time can hold. The system lets go of it when the process ends, however it ends."""

from __future__ import annotations

import errno
import logging
import os
import sys
from contextlib import AbstractContextManager
from pathlib import Path

log = logging.getLogger(__name__)

NO_LOCKS = (errno.ENOSYS, errno.ENOTSUP, errno.EOPNOTSUPP, errno.ENOLCK)  # some network disks

if sys.platform == "win32":
    import msvcrt

    def _taken(handle: int) -> None:
        msvcrt.locking(handle, msvcrt.LK_NBLCK, 1)

else:
    import fcntl

    def _taken(handle: int) -> None:
        fcntl.flock(handle, fcntl.LOCK_EX | fcntl.LOCK_NB)


def locked(path: Path) -> AbstractContextManager[object] | None:
    """Holds `path`, made where it is not there, until the block ends; None where another process holds it."""
    file = os.fdopen(os.open(path, os.O_CREAT | os.O_RDWR, 0o666), "r+b")
    try:
        _taken(file.fileno())
    except (BlockingIOError, PermissionError):
        file.close()
        return None
    except OSError as error:
        if error.errno not in NO_LOCKS:
            file.close()
            raise
        log.warning("%s: this disk knows no locks; do not run one job twice at the same time", path.parent)
    return file
