"""The one JSON object that `--format json` prints."""

from __future__ import annotations

import json
from collections.abc import Iterable, Mapping, Sequence
from typing import Any

from ..forecast import Forecast
from ..problems import Problem
from . import terminal

FORMAT = 1


def problem_entry(problem: Problem) -> dict[str, Any]:
    place = problem.place
    return {
        "path": place.path if place else "",
        "line": place.line if place else 0,
        "column": place.column if place else 0,
        "key": problem.key,
        "severity": problem.severity,
        "message": problem.message,
        "fix": problem.fix,
    }


def job_entry(
    job: str,
    fingerprint: str,
    status: str,
    *,
    folder: str | None = None,
    verdict: str | None = None,
    forecast: Forecast | None = None,
    variant: Mapping[str, str] | None = None,
) -> dict[str, Any]:
    weighed = (
        {"seconds": round(forecast.seconds, 1), "memory": forecast.memory, "disk": forecast.disk} if forecast else None
    )
    return {
        "job": job,
        **({"variant": dict(variant)} if variant else {}),
        "fingerprint": fingerprint,
        "folder": folder,
        "status": status,
        "verdict": verdict,
        "forecast": weighed,
    }


def show_json(command: str, problems: Iterable[Problem], jobs: Sequence[dict[str, Any]], **more: Any) -> None:
    """Prints the object; letters beyond ASCII as escapes, so that every terminal and pipe can carry it."""
    document = {
        "format": FORMAT,
        "command": command,
        "problems": [problem_entry(problem) for problem in problems],
        "jobs": list(jobs),
        **more,
    }
    terminal.show(json.dumps(document, indent=2, allow_nan=False))
