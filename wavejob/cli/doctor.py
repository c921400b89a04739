"""Look at this machine: versions, cores and memory allowed, cache folder, video encoder, transform speed."""

from __future__ import annotations

import os
import platform
import tempfile
import time
from argparse import ArgumentParser, Namespace
from importlib import metadata
from pathlib import Path
from typing import Any

from .. import machine
from ..evolve import wisdom
from ..limits import readable
from ..problems import Problem
from ..version import NUMERICS, __version__
from . import terminal
from .arguments import add_format
from .json_report import show_json
from .words import paragraph

PACKAGES = (
    "numpy",
    "scipy",
    "pyfftw",
    "pydantic",
    "pint",
    "pyyaml",
    "h5py",
    "h5netcdf",
    "matplotlib",
    "imageio-ffmpeg",
)
SIZES = (1024, 4096, 16384, 65536)
TIMED = 0.05  # seconds spent on each size


def add_arguments(parser: ArgumentParser) -> None:
    add_format(parser)


def run(options: Namespace) -> int:
    found = findings()
    problems = doubts(found)
    if options.format == "json":
        show_json("doctor", problems, [], machine=found)
    else:
        for name, text in _lines(found):
            terminal.show(paragraph(text, f"{name:<11} ", " " * 12))
        for problem in problems:
            terminal.say(problem.text())
    return 1 if any(problem.severity == "error" for problem in problems) else 0


def findings() -> dict[str, Any]:
    """Everything found, as plain data; sizes in bytes, times in seconds."""
    pairs = _pairs()  # first, because it loads the transforms, which set how idle threads wait
    return {
        "version": __version__,
        "numerics": NUMERICS,
        "python": platform.python_version(),
        "platform": platform.platform(),
        "processor": machine.processor(),
        "cores": machine.cores(),
        "cores_installed": os.cpu_count() or 1,
        "memory": machine.memory(),
        "packages": {name: _version(name) for name in PACKAGES},
        "cache": {"folder": str(wisdom.folder()), "writable": _is_writable(wisdom.folder())},
        "encoder": _encoder(),
        "wait_policy": os.environ.get("OMP_WAIT_POLICY"),
        "transform_pairs": pairs,
    }


def doubts(found: dict[str, Any]) -> list[Problem]:
    """What should be mended, with its cure."""
    problems = []
    missing = [name for name, version in found["packages"].items() if version is None]
    if missing:
        problems.append(Problem(f"not installed: {', '.join(missing)}", "install wavejob again with pip"))
    if not found["cache"]["writable"]:
        problems.append(
            Problem(
                f"the cache folder `{found['cache']['folder']}` can't be written: every run plans anew",
                "set WAVEJOB_CACHE to a folder you may write to",
                severity="warning",
            )
        )
    if found["encoder"] is None:
        problems.append(
            Problem("no video encoder was found; films need one", "pip install imageio-ffmpeg", severity="warning")
        )
    if str(found["wait_policy"]).lower() == "active":
        problems.append(
            Problem(
                "OMP_WAIT_POLICY is `active`: idle threads keep cores busy that others need",
                "unset it, or set it to `passive`",
                severity="warning",
            )
        )
    return problems


def _lines(found: dict[str, Any]) -> list[tuple[str, str]]:
    cache, cores, installed = found["cache"], found["cores"], found["cores_installed"]
    packages = ", ".join(f"{name} {version or 'missing'}" for name, version in found["packages"].items())
    pairs = ", ".join(f"{points} points {1e6 * seconds:.3g} us" for points, seconds in found["transform_pairs"].items())
    return [
        ("wavejob", f"{found['version']}, numerics {found['numerics']}"),
        ("python", f"{found['python']} on {found['platform']}"),
        ("packages", packages),
        ("processor", found["processor"]),
        ("cores", f"{cores} of {installed} may be used"),
        ("memory", f"{readable(found['memory'])} may be used"),
        ("cache", f"{cache['folder']}, {'writable' if cache['writable'] else 'not writable'}"),
        ("encoder", found["encoder"] or "none"),
        ("waiting", f"OMP_WAIT_POLICY is {found['wait_policy']}"),
        ("speed", f"one transform there and back: {pairs}"),
    ]


def _version(package: str) -> str | None:
    try:
        return metadata.version(package)
    except metadata.PackageNotFoundError:
        return None


def _is_writable(folder: Path) -> bool:
    try:
        folder.mkdir(parents=True, exist_ok=True)
        with tempfile.TemporaryFile(dir=folder):
            return True
    except OSError:
        return False


def _encoder() -> str | None:
    import imageio_ffmpeg

    try:
        return str(imageio_ffmpeg.get_ffmpeg_exe())
    except RuntimeError:
        return None


def _pairs() -> dict[str, float]:
    """Points -> seconds of one planned transform there and back, the fastest of several."""
    from ..evolve.transforms import Settings, Transforms
    from ..grid import Axis, Grid

    found = {}
    for points in SIZES:
        transforms = Transforms(Settings(Grid((Axis("x", 0.0, 1.0, points),)), 1, 1))
        transforms.psi[...] = 0
        fastest, end = float("inf"), time.perf_counter() + TIMED
        while time.perf_counter() < end:
            begun = time.perf_counter()
            transforms.forward()
            transforms.backward()
            fastest = min(fastest, time.perf_counter() - begun)
        found[str(points)] = fastest
    return found
