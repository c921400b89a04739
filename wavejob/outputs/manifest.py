"""manifest.json: with what, when, how fast and from which sources a run was made. Written last."""

from __future__ import annotations

import hashlib
import json
import os
import platform
import subprocess
from collections.abc import Mapping
from dataclasses import dataclass, field
from datetime import datetime
from importlib import metadata
from pathlib import Path
from typing import Any

import pyfftw

from ..grid import Grid
from ..version import NUMERICS, __version__
from .folder import MANIFEST
from .log import utc
from .tables import FORMAT, Units, write_json

PACKAGES = (
    "numpy",
    "scipy",
    "pyfftw",
    "pydantic",
    "pint",
    "pyyaml",
    "h5netcdf",
    "h5py",
    "matplotlib",
    "imageio",
    "imageio-ffmpeg",
    "pillow",
)
GIT_SECONDS = 10  # a status of a very large tree may take longer: then the revision is left out
LOG = "run.log"  # still written to after the manifest, so it has no digest


@dataclass(frozen=True)
class Account:
    """What only the run itself knows. `step` is in scaled units, `timings` in seconds."""

    job: str
    fingerprint: str
    started: datetime
    ended: datetime
    grid: Grid
    step: float
    steps: int
    order: int
    precision: str = "double"
    timings: Mapping[str, float] = field(default_factory=dict)
    choices: Mapping[str, Any] = field(default_factory=dict)  # kernel, threads, scheme and the like
    variant: Mapping[str, str] = field(default_factory=dict)  # what is varied, and what it is here
    resumed_at: tuple[int, ...] = ()  # steps
    partial: tuple[str, ...] = ()  # what was left out: "film", "error_bars"
    warnings: tuple[str, ...] = ()


def write_manifest(folder: Path, account: Account, units: Units, tree: Path | None) -> None:
    """Writes `folder`/manifest.json; every other file must be whole by now. `tree` is the job tree."""
    document = {
        "format": FORMAT,
        "program": "wavejob",
        "version": __version__,
        "numerics": NUMERICS,
        "job": account.job,
        "fingerprint": account.fingerprint,
        **({"variant": dict(account.variant)} if account.variant else {}),
        "started": utc(account.started),
        "ended": utc(account.ended),
        "resumed_at": list(account.resumed_at),
        "partial": list(account.partial),
        "warnings": list(account.warnings),
        "timings": dict(account.timings),
        "step": {"value": float(units.to_file(account.step, "time")), "unit": units.label("time")},
        "steps": account.steps,
        "order": account.order,
        "precision": account.precision,
        "choices": dict(account.choices),
        "grid": _grid(account.grid, units),
        **surroundings(),
        "source": revision(tree) if tree else None,
        "outputs": _outputs(folder),
    }
    write_json(folder / MANIFEST, document)


def renew_digests(folder: Path) -> None:
    """Brings the sizes and digests of a manifest up to date, once files beside it were written anew."""
    document = json.loads((folder / MANIFEST).read_text(encoding="utf-8"))
    write_json(folder / MANIFEST, {**document, "outputs": _outputs(folder)})


def surroundings() -> dict[str, Any]:
    """The machine and the libraries of this process."""
    return {
        "python": platform.python_version(),
        "platform": platform.platform(),
        "cpu": _cpu(),
        "cores": _cores(),
        "packages": {name: _version(name) for name in PACKAGES},
        "fftw": {
            "version": pyfftw.fftw_version,
            "compiler": pyfftw.fftw_cc,
            "threads": getattr(pyfftw.pyfftw, "_threading_type", None),
            "alignment": pyfftw.simd_alignment,
        },
        "environment": {name: value for name, value in sorted(os.environ.items()) if name.startswith("OMP_")},
    }


def revision(tree: Path) -> dict[str, Any] | None:
    """The commit of the job tree and whether it was changed since; None where git can't tell."""
    commit = _git(tree, "rev-parse", "HEAD")
    if commit is None:
        return None
    changes = _git(tree, "status", "--porcelain")
    return {"revision": commit.strip(), "dirty": None if changes is None else bool(changes.strip())}


def _git(tree: Path, *words: str) -> str | None:
    # GIT_DIR and its like would speak of another tree; a monitor set up in the tree would run its program
    clean = {name: value for name, value in os.environ.items() if not name.startswith("GIT_")}
    try:
        done = subprocess.run(
            ["git", "-c", "core.fsmonitor=false", *words],
            cwd=tree,
            env={**clean, "GIT_OPTIONAL_LOCKS": "0", "LC_ALL": "C"},
            stdin=subprocess.DEVNULL,
            capture_output=True,
            timeout=GIT_SECONDS,
            check=True,
        )
    except (OSError, subprocess.SubprocessError):
        return None
    return done.stdout.decode("utf-8", errors="replace")


def _grid(grid: Grid, units: Units) -> dict[str, Any]:
    return {
        axis.name: {
            "from": float(units.to_file(axis.low, "length")),
            "to": float(units.to_file(axis.high, "length")),
            "unit": units.label("length"),
            "points": axis.points,
            "transform": axis.transform,
        }
        for axis in grid.axes
    }


def _outputs(folder: Path) -> dict[str, Any]:
    """Size and digest of every file a user finds in the folder, but for this one and the log."""
    files = sorted(f for f in folder.iterdir() if f.is_file() and not f.name.startswith("."))
    return {
        file.name: {"bytes": file.stat().st_size, "sha256": _digest(file)}
        for file in files
        if file.name not in (MANIFEST, LOG)
    }


def _digest(path: Path) -> str:
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def _version(package: str) -> str | None:
    try:
        return metadata.version(package)
    except metadata.PackageNotFoundError:
        return None


def _cores() -> int:
    """Cores this process may use."""
    if hasattr(os, "sched_getaffinity"):
        return len(os.sched_getaffinity(0))
    return os.cpu_count() or 1


def _cpu() -> str:
    """The processor's model, as far as the system tells."""
    try:
        lines = Path("/proc/cpuinfo").read_text(encoding="utf-8", errors="replace").splitlines()
    except OSError:
        lines = []
    models = (line.partition(":")[2].strip() for line in lines if line.startswith("model name"))
    return next(models, "") or platform.processor() or platform.machine()
