"""Run folders as a run leaves them, with given figures, in a moment."""

from __future__ import annotations

from collections.abc import Mapping
from datetime import UTC, datetime, timedelta
from pathlib import Path
from typing import Any

from wavejob.outputs.folder import MANIFEST, RunFolder
from wavejob.outputs.tables import write_json
from wavejob.reading.tree import JobTree

NOW = datetime(2026, 6, 1, 12, tzinfo=UTC)


def runs_of(tree: Path) -> Path:
    """The marked folder of the runs of `tree`."""
    tree.mkdir(exist_ok=True)
    return JobTree(tree).runs_folder()


def figure(value: float | None, error: float | None = None, unit: str = "") -> dict[str, Any]:
    status = "off" if error is None else "estimated"
    return {
        "value": value, "error": error, "scale": 1.0, "unit": unit,
        "error_status": status, "error_parts": {}, "meaning": "",
    }  # fmt: skip


def stored(
    runs: Path,
    job: str,
    fingerprint: str,
    results: Mapping[str, Any] | None = None,
    *,
    days: float = 0,
    finished: bool = True,
    verdict: str = "trusted",
    variant: Mapping[str, str] | None = None,
) -> Path:
    """The folder of a run that ended `days` before NOW."""
    folder = RunFolder(runs, job, fingerprint)
    with folder.held():
        folder.begin()
    whose = {"job": job, "fingerprint": fingerprint}
    found = {"format": 1, **whose, "verdict": verdict, "results": results or {}, "checks": [], "expectations": []}
    write_json(folder.path / "results.json", found)
    if finished:
        ended = (NOW - timedelta(days=days)).isoformat()
        write_json(folder.path / MANIFEST, {"format": 1, **whose, "ended": ended, "partial": [], "variant": variant})
    return folder.path
