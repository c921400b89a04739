"""What JUnit XML tells of jobs: what they assert, and why one could not be carried out."""

from __future__ import annotations

import os
from argparse import Namespace
from collections.abc import Iterable, Mapping, Sequence
from itertools import groupby
from pathlib import Path
from typing import Any

from ..job import Job
from ..outputs.junit import Assertion, Case
from ..problems import Problem, in_order
from ..reading.tree import shown
from .arguments import UsageError
from .results import check_failure


def check_target(options: Namespace) -> None:
    """Refuses a file for `--junit` that can't be written, before anything is run. Raises UsageError."""
    path: Path | None = options.junit
    if path is None:
        return
    if path.suffix != ".xml":
        raise UsageError("wavejob run", f"--junit: `{path}` does not end in .xml", "write e.g. `--junit jobs.xml`")
    if not os.path.isdir(path.parent):
        raise UsageError("wavejob run", f"--junit: there is no folder `{path.parent}`", "make it first")
    if os.path.isdir(path) or not os.access(path.parent, os.W_OK):
        raise UsageError("wavejob run", f"--junit: `{path}` can't be written", "choose another file")


def assertions(document: Mapping[str, Any], *, strict: bool) -> tuple[Assertion, ...]:
    """Expectations and checks of a results.json. What makes `wavejob run` exit with 1 is a failure here."""
    expected = [
        Assertion(f"expect {entry['result']}", entry["outcome"], entry["text"], entry["outcome"] != "met")
        for entry in document["expectations"]
    ]
    checked = [
        Assertion(
            f"check {check['name']}",
            "passed" if check["passed"] else "doubtful",
            check["reason"] if check["passed"] else check_failure(check),
            strict and not check["passed"],
        )
        for check in document["checks"]
    ]
    return (*expected, *checked)


def refused_cases(problems: Iterable[Problem], jobs: Sequence[Job]) -> list[Case]:
    """Cases of a batch of which nothing was started: an error for each file with mistakes, the other jobs skipped."""
    wrong = [problem for problem in in_order(problems) if problem.severity == "error"]
    by_file = groupby(wrong, key=lambda problem: problem.place.path if problem.place else "")
    cases = [Case(path, path, error="\n".join(one.text() for one in found)) for path, found in by_file]
    files = {case.file for case in cases}
    return cases + [
        Case(job.name, shown(job.path), skipped="nothing was started") for job in jobs if shown(job.path) not in files
    ]
