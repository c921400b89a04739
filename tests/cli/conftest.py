"""A job that runs in a moment, in a tree of its own, and ways to call the program."""

from __future__ import annotations

import os
import subprocess
import sys
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path

import pytest

from wavejob.cli import main

ROOT = Path(__file__).parents[2]
JOB = """\
units: natural
grid: {x: {from: -20, to: 20, points: 128}}
packet: {gaussian: {at: -5, sigma: 1, wavenumber: 1}}
evolve: {until: 2, step: 0.02, record: 0.1}
observables: [norm, {crossing: {name: through, x: 0, toward: +x}}]
classical: none
error_bars: none
film: none
edges: {x: wrap}
"""


@dataclass(frozen=True)
class Said:
    """What a call printed, and its exit code."""

    code: int
    out: str
    err: str


Call = Callable[..., Said]


@pytest.fixture
def tree(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """The current folder, with `job.yml` in it and a cache of its own."""
    monkeypatch.chdir(tmp_path)
    monkeypatch.setenv("WAVEJOB_CACHE", str(tmp_path / ".cache"))
    (tmp_path / "job.yml").write_text(JOB, encoding="utf-8")
    return tmp_path


@pytest.fixture
def call(tree: Path, capsys: pytest.CaptureFixture[str]) -> Call:
    """Calls `main` in this process, in the folder `tree`."""

    def called(*words: str | Path) -> Said:
        code = main([str(word) for word in words])
        printed = capsys.readouterr()
        return Said(code, printed.out, printed.err)

    return called


@pytest.fixture
def environment(tree: Path) -> dict[str, str]:
    """For a process of its own that finds this source."""
    return {**os.environ, "PYTHONPATH": str(ROOT), "WAVEJOB_CACHE": str(tree / ".cache")}


@pytest.fixture
def process(tree: Path, environment: dict[str, str]) -> Call:
    """Runs `python -m wavejob` in a process of its own."""

    def called(*words: str | Path, **more: str) -> Said:
        done = subprocess.run(
            [sys.executable, "-m", "wavejob", *map(str, words)],
            check=False,
            capture_output=True,
            cwd=tree,
            env=environment | more,
            timeout=120,
        )
        return Said(done.returncode, done.stdout.decode(), done.stderr.decode())

    return called
