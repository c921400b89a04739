"""Text laid out for the width at hand."""

from __future__ import annotations

import textwrap
from collections.abc import Sequence

from ..evolve.schedule import Schedule
from . import terminal


def paragraph(text: str, first: str = "", rest: str = "") -> str:
    """`text` behind `first`, wrapped to the terminal with `rest` before further lines; one line in a file."""
    columns = terminal.width()
    if columns is None or not text:  # which textwrap would take for no line at all
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


def columns(rows: Sequence[tuple[str, str]], indent: str) -> list[str]:
    """Rows of a name and a text, the texts below each other."""
    wide = min(max((len(name) for name, _ in rows), default=0), 32)
    return [paragraph(text, f"{indent}{name:<{wide}}  ", " " * (len(indent) + wide + 2)) for name, text in rows]
