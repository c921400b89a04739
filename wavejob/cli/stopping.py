"""A polite end on Ctrl-C and on SIGTERM: what is at work unwinds, what is finished is kept."""

from __future__ import annotations

import contextlib
import signal
import threading
from collections.abc import Iterator
from types import FrameType


class Terminated(KeyboardInterrupt):
    """SIGTERM; it takes the way of Ctrl-C through all code, and ends with another exit code."""


def _terminate(_: int, __: FrameType | None) -> None:
    raise Terminated


@contextlib.contextmanager
def stoppable() -> Iterator[None]:
    """While the block lasts SIGTERM raises Terminated. Only the main thread may ask for that."""
    if threading.current_thread() is not threading.main_thread():
        yield
        return
    before = signal.signal(signal.SIGTERM, _terminate)
    try:
        yield
    finally:
        signal.signal(signal.SIGTERM, before)
