"""The manifest tells all that is needed to judge or repeat a run, and never fails for want of git."""

from __future__ import annotations

import hashlib
import json
import os
import platform
import subprocess
from datetime import UTC, datetime, timedelta, timezone
from importlib import metadata
from pathlib import Path
from typing import Any

import pyfftw
import pytest

from wavejob.grid import Axis, Grid
from wavejob.outputs import manifest
from wavejob.version import NUMERICS, __version__

START = datetime(2026, 1, 2, 3, 4, 5, tzinfo=timezone(timedelta(hours=2)))
ACCOUNT = manifest.Account(
    job="stack/nominal",
    fingerprint="3f9a0c12d4",
    started=START,
    ended=START + timedelta(seconds=1.5),
    grid=Grid((Axis("x", -400.0, 400.0, 4096), Axis("y", 0.0, 30.0, 64, "sine"))),
    step=0.05,
    steps=60000,
    order=4,
    timings={"evolve": 1.25},
    partial=("film",),
    warnings=("little was absorbed",),
)


def _git(folder: Path, *words: str) -> str:
    identity = ["-c", "user.name=A", "-c", "user.email=a@example.org"]
    done = subprocess.run(["git", *identity, *words], cwd=folder, check=True, capture_output=True, text=True)
    return done.stdout.strip()


@pytest.fixture
def tree(tmp_path: Path) -> Path:
    folder = tmp_path / "tree"
    folder.mkdir()
    _git(folder, "init", "-q")
    (folder / "a.yml").write_text("x: 1\n")
    _git(folder, "add", "a.yml")
    _git(folder, "commit", "-q", "-m", "first")
    return folder


def test_manifest_tells_the_run(tmp_path: Path, units: Any, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("OMP_WAIT_POLICY", "passive")
    monkeypatch.setenv("SOME_TOKEN", "secret")
    (tmp_path / "series.csv").write_bytes(b"time\n0\n")
    (tmp_path / "run.log").write_text("still written to\n")
    (tmp_path / ".job").write_text("{}")
    manifest.write_manifest(tmp_path, ACCOUNT, units, None)
    text = (tmp_path / "manifest.json").read_text()
    found = json.loads(text)
    assert "secret" not in text
    told = {name: found[name] for name in ("format", "job", "fingerprint", "started", "ended", "steps", "order")}
    assert told == {
        "format": 1,
        "job": "stack/nominal",
        "fingerprint": "3f9a0c12d4",
        "started": "2026-01-02T01:04:05.000Z",
        "ended": "2026-01-02T01:04:06.500Z",
        "steps": 60000,
        "order": 4,
    }
    assert found["step"] == {"value": 0.05, "unit": "fs"}
    assert found["grid"]["x"] == {
        "from": -400.0,
        "to": 400.0,
        "unit": "nm",
        "points": 4096,
        "transform": "periodic",
    }
    assert found["grid"]["y"]["transform"] == "sine"
    assert (found["version"], found["numerics"]) == (__version__, NUMERICS)
    assert (found["resumed_at"], found["partial"]) == ([], ["film"])
    assert (found["timings"], found["warnings"]) == ({"evolve": 1.25}, ["little was absorbed"])
    assert found["environment"]["OMP_WAIT_POLICY"] == "passive"
    assert found["source"] is None
    digest = hashlib.sha256(b"time\n0\n").hexdigest()
    assert found["outputs"] == {"series.csv": {"bytes": 7, "sha256": digest}}


def test_surroundings_name_the_libraries() -> None:
    found = manifest.surroundings()
    assert found["packages"]["numpy"] == metadata.version("numpy")
    assert found["fftw"]["version"] == pyfftw.fftw_version
    assert found["python"] == platform.python_version()
    assert found["cpu"]
    assert found["cores"] == len(os.sched_getaffinity(0))


def test_a_missing_library_is_null(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(manifest, "PACKAGES", ("no-such-library",))
    assert manifest.surroundings()["packages"] == {"no-such-library": None}


def test_a_clean_tree_has_its_commit(tree: Path) -> None:
    assert manifest.revision(tree) == {"revision": _git(tree, "rev-parse", "HEAD"), "dirty": False}


@pytest.mark.parametrize("name", ["a.yml", "new.yml"])
def test_changed_and_new_files_make_it_dirty(tree: Path, name: str) -> None:
    (tree / name).write_text("x: 2\n")
    assert manifest.revision(tree) == {"revision": _git(tree, "rev-parse", "HEAD"), "dirty": True}


def test_another_trees_settings_do_not_lead_astray(tree: Path, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    commit = _git(tree, "rev-parse", "HEAD")
    monkeypatch.setenv("GIT_DIR", str(tmp_path / "elsewhere"))
    found = manifest.revision(tree)
    assert found
    assert found["revision"] == commit


def test_a_tree_cannot_have_its_programs_run(tree: Path) -> None:
    (tree / "spy").write_text(f"#!/bin/sh\ntouch {tree}/ran\n")
    (tree / "spy").chmod(0o755)
    _git(tree, "config", "core.fsmonitor", str(tree / "spy"))
    assert manifest.revision(tree)
    assert not (tree / "ran").exists()


def test_no_commit_yet_is_null(tmp_path: Path) -> None:
    _git(tmp_path, "init", "-q")
    assert manifest.revision(tmp_path) is None


def test_no_repository_is_null(tmp_path: Path) -> None:
    assert manifest.revision(tmp_path) is None


@pytest.mark.parametrize("error", [FileNotFoundError(), subprocess.TimeoutExpired("git", 10)])
def test_absent_or_slow_git_is_null(tree: Path, monkeypatch: pytest.MonkeyPatch, error: Exception) -> None:
    def fail(*_words: object, **_options: object) -> None:
        raise error

    monkeypatch.setattr(subprocess, "run", fail)
    assert manifest.revision(tree) is None


def test_utc_is_what_is_written() -> None:
    assert manifest.utc(datetime(2026, 1, 1, tzinfo=UTC)) == "2026-01-01T00:00:00.000Z"
