"""The two streams: results to standard output, all else to standard error, whatever they are joined to."""

from __future__ import annotations

import contextlib
import logging
import os
import shutil
import sys
from argparse import Namespace
from collections.abc import Iterator
from typing import TextIO

from ..problems import RunError

LOGGER = "wavejob"
NARROWEST = 40


def show(text: str = "") -> None:
    """One piece of results. A reader that has gone away (`| head`) stops the output, not the work."""
    stream = sys.stdout
    if stream is None:
        return
    try:
        stream.write(text + "\n")
        stream.flush()
    except BrokenPipeError:
        _drop(stream)
    except OSError as error:
        _drop(stream)
        raise RunError(f"could not write to standard output: {error.strerror}", "send it elsewhere") from None


def say(text: str) -> None:
    """One message; lost without a word where standard error cannot take it."""
    stream = sys.stderr
    if stream is None:
        return
    try:
        stream.write(text + "\n")
        stream.flush()
    except OSError:
        _drop(stream)


def _drop(stream: TextIO) -> None:
    """From now on `stream` leads nowhere; else Python would complain once more when it ends."""
    with contextlib.suppress(OSError, ValueError):
        nowhere = os.open(os.devnull, os.O_WRONLY)
        os.dup2(nowhere, stream.fileno())
        os.close(nowhere)


def is_live() -> bool:
    """Whether standard error is a terminal that can redraw a line."""
    return sys.stderr is not None and sys.stderr.isatty() and os.environ.get("TERM", "") not in ("", "dumb")


def width() -> int | None:
    """Columns of the terminal that shows the results; None where they go to a file or a pipe."""
    if sys.stdout is None or not sys.stdout.isatty():
        return None
    return max(shutil.get_terminal_size().columns, NARROWEST)


@contextlib.contextmanager
def prepared() -> Iterator[None]:
    """While the block lasts, letters that a stream cannot encode are written as escapes."""
    changed = []
    for stream in (sys.stdout, sys.stderr):
        if hasattr(stream, "reconfigure"):
            changed.append((stream, stream.errors))
            stream.reconfigure(errors="backslashreplace")
    try:
        yield
    finally:
        for stream, errors in changed:
            with contextlib.suppress(OSError, ValueError):
                stream.reconfigure(errors=errors)


class _ToStandardError(logging.Handler):
    def emit(self, record: logging.LogRecord) -> None:
        say(f"{record.levelname.lower()}: {record.getMessage()}")


@contextlib.contextmanager
def logged(options: Namespace) -> Iterator[None]:
    """While the block lasts, warnings of the package (with -v everything) go to standard error."""
    logger, handler = logging.getLogger(LOGGER), _ToStandardError()
    handler.setLevel(logging.DEBUG if options.verbose else logging.ERROR if options.quiet else logging.WARNING)
    level, passes_on = logger.level, logger.propagate
    logger.addHandler(handler)
    logger.setLevel(logging.DEBUG if options.verbose else logging.WARNING)
    logger.propagate = False
    try:
        yield
    finally:
        logger.removeHandler(handler)
        logger.setLevel(level)
        logger.propagate = passes_on
