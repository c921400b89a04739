"""run.log: what happened in a run, with times in UTC."""

from __future__ import annotations

import contextlib
import logging
import sys
from collections.abc import Iterator
from datetime import UTC, datetime
from pathlib import Path

from .files import unwritable

LOGGER = "wavejob"  # every module logs below this name


class _Handler(logging.FileHandler):
    """A file whose failure stops the run with a clear message instead of a traceback on the side."""

    def handleError(self, record: logging.LogRecord) -> None:
        error = sys.exc_info()[1]
        if isinstance(error, OSError):
            raise unwritable(Path(self.baseFilename), error) from error
        super().handleError(record)


class _Formatter(logging.Formatter):
    def format(self, record: logging.LogRecord) -> str:
        moment = datetime.fromtimestamp(record.created, UTC)
        return f"{utc(moment)} {record.levelname} {super().format(record)}"


def utc(moment: datetime) -> str:
    """A time with time zone as ISO 8601 in UTC."""
    return moment.astimezone(UTC).isoformat(timespec="milliseconds").replace("+00:00", "Z")


@contextlib.contextmanager
def run_log(path: Path) -> Iterator[logging.Logger]:
    """Appends to `path` all that is logged below `wavejob` while the block lasts; then closes the file."""
    logger = logging.getLogger(LOGGER)
    try:
        handler = _Handler(path, mode="a", encoding="utf-8", errors="backslashreplace")
    except OSError as error:
        raise unwritable(path, error) from error
    handler.setFormatter(_Formatter())
    level = logger.level
    logger.addHandler(handler)
    logger.setLevel(logging.INFO)
    try:
        yield logger
    finally:
        logger.setLevel(level)
        logger.removeHandler(handler)
        with contextlib.suppress(OSError):  # a disk that refuses was reported with the line itself
            handler.close()
