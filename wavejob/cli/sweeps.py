"""The variants of a job side by side: their table and pictures, and a few lines on the screen."""

from __future__ import annotations

from collections.abc import Sequence
from typing import Any

from ..outputs.run_tree import VARIANTS
from ..problems import RunError
from ..reading.tree import shown
from ..variants import Sweep
from . import terminal
from .results import CLASSICAL, figure_text
from .sizes import counted
from .tasks import Task

MOST_ROWS = 60  # on the screen; the table has them all
MOST_RESULTS = 5  # shown where none is expected


def write_sweep(tasks: Sequence[Task], *, show: bool) -> None:
    """Table and pictures of one varied file anew, from what is finished by now; with `show` the results too."""
    family = tasks[0].family
    sweep = Sweep(family, tasks[0].runs)
    sweep.note_all()
    if not sweep.documents:
        return
    try:
        sweep.write()
        drawn = sweep.draw()
    except RunError as error:
        terminal.say(f"{family.id}: {error}")
        return
    if show:
        terminal.show(sweep_table(sweep, [path.name for path in drawn]))


def sweep_table(sweep: Sweep, drawn: Sequence[str]) -> str:
    """One row a variant: what is varied, the results that are expected (else the first ones), the verdict."""
    family, results = sweep.family, sweep.results()
    names = [name for name in family.expected if name in results]
    names = names or [name for name in results if not name.startswith(CLASSICAL)][:MOST_RESULTS]
    rows = [[*(key.key for key in family.walks.keys), *names, "verdict"]]
    for index, job in list(enumerate(family.jobs))[:MOST_ROWS]:
        document = sweep.documents.get(index)
        cells = [_figure(document, name) for name in names]
        rows.append([*(one.text for one in job.variant), *cells, document["verdict"] if document else "not run"])
    widths = [max(len(row[column]) for row in rows) for column in range(len(rows[0]))]
    padded = [[f"{cell:<{wide}}" for cell, wide in zip(row, widths, strict=True)] for row in rows]
    lines = [f"  {'  '.join(row)}".rstrip() for row in padded]
    if len(family.jobs) > MOST_ROWS:
        lines.append(f"  and {len(family.jobs) - MOST_ROWS} more in {VARIANTS}")
    title = f"{family.id}: {family.title}" if family.title != family.id else family.id
    verdicts = [document["verdict"] for document in sweep.documents.values()]
    tally = [f"{verdicts.count(v)} {v}" for v in ("trusted", "doubtful", "failed") if v in verdicts]
    place = f"in {shown(sweep.folder)}: {', '.join([VARIANTS, *drawn])}"
    return "\n".join([title, *lines, f"  {counted(len(family.jobs), 'variant')}: {', '.join(tally)}, {place}", ""])


def _figure(document: dict[str, Any] | None, name: str) -> str:
    entry = document["results"].get(name) if document else None
    return figure_text(entry["value"], entry["error"], entry["unit"]) if entry else ""
