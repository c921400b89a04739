"""Text laid out for the width at hand."""

from __future__ import annotations

import textwrap

from ..evolve.schedule import Schedule
from . import terminal


def paragraph(text: str, first: str = "", rest: str = "") -> str:
    """`text` behind `first`, wrapped to the terminal with `rest` before further lines; one line in a file."""
    columns = terminal.width()
    if columns is None:
        return first + text
    return textwrap.fill(
        text,
        columns,
        initial_indent=first,
        subsequent_indent=rest,
        break_long_words=False,
        break_on_hyphens=False,
        drop_whitespace=True,
    )


def count_of(schedule: Schedule) -> int:
    """How often a schedule is due, first and last step included."""
    return -(-schedule.last // schedule.every) + 1
