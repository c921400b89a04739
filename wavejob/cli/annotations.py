"""Problems as lines that a code host shows beside the lines of the file they are about.

The form is `::error file=jobs/a.yml,line=3,col=5::what is wrong`. Hosts that read it say so in the environment,
with GITHUB_ACTIONS=true; the lines go to standard error, beside the messages for people.
"""

from __future__ import annotations

import os
from collections.abc import Iterable, Sequence
from pathlib import Path
from typing import Any

from ..job import Job
from ..problems import Place, Problem
from ..reading.tree import shown
from . import terminal
from .results import check_failure

ASKS, ROOT = "GITHUB_ACTIONS", "GITHUB_WORKSPACE"


def annotate(problems: Iterable[Problem], *, quiet: bool = False) -> None:
    """Says a line for each problem (with `quiet` for mistakes only), where the environment asks for that."""
    if os.environ.get(ASKS) != "true":
        return
    for problem in problems:
        if not quiet or problem.severity == "error":
            terminal.say(annotation(problem))


def annotation(problem: Problem) -> str:
    """The line for one problem; its path as seen from the top of the checkout, if that is known."""
    place = problem.place or Place("")
    where = {"file": _from_root(place.path), "line": place.line, "col": place.column}
    named = ",".join(f"{name}={_escaped(str(value), ':,')}" for name, value in where.items() if value)
    said = f"{problem.message}; {problem.fix}" if problem.fix else problem.message
    if problem.key:
        said = f"{problem.key}: {said}"
    return f"::{problem.severity}{' ' + named if named else ''}::{_escaped(said)}"


def judged(job: Job, document: dict[str, Any]) -> list[Problem]:
    """Expectations that are not met, where they stand in the job file; checks that failed, as warnings about it."""
    wanted = [expect.result for expect in job.keys.expect]
    found = []
    for entry in document["expectations"]:
        index = wanted.index(entry["result"])
        wanted[index] = ""  # the next of this name is another
        if entry["outcome"] != "met":
            found.append(job.problem(job.expectation(index), f"{entry['outcome']}: {entry['text']}"))
    return found + [
        about(job, check_failure(check), severity="warning") for check in document["checks"] if not check["passed"]
    ]


def about(job: Job, message: str, severity: str = "error") -> Problem:
    """A problem of a whole job."""
    return Problem(message, place=Place(shown(job.path), 1), severity=severity)


def _from_root(path: str) -> str:
    root = os.environ.get(ROOT)
    if not root or not path:
        return path
    full = Path(path).absolute()
    return full.relative_to(root).as_posix() if full.is_relative_to(root) else path


def _escaped(text: str, more: Sequence[str] = "") -> str:
    """`text` with what ends a line or a field written as the host reads it, in percent notation."""
    for character in ("%", "\r", "\n", *more):
        text = text.replace(character, f"%{ord(character):02X}")
    return text
