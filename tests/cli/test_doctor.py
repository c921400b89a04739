"""`wavejob doctor`: what it finds is what the system says."""

from __future__ import annotations

import json
import os
import platform
from importlib import metadata
from pathlib import Path

import pytest

from .conftest import Call


def test_json_tells_the_machine(call: Call, tree: Path) -> None:
    found = call("doctor", "--format", "json")
    assert (found.code, found.err) == (0, "")
    document = json.loads(found.out)
    machine = document["machine"]
    assert document["command"] == "doctor"
    assert machine["python"] == platform.python_version()
    assert machine["packages"]["numpy"] == metadata.version("numpy")
    assert 1 <= machine["cores"] <= (os.cpu_count() or 1)
    assert machine["cache"] == {"folder": str(tree / ".cache"), "writable": True}
    assert Path(machine["encoder"]).is_file()
    assert machine["wait_policy"] == "passive"
    assert [int(points) for points in machine["transform_pairs"]] == [1024, 4096, 16384, 65536]
    assert all(0 < seconds < 1 for seconds in machine["transform_pairs"].values())


def test_a_cache_that_cannot_be_written_is_a_warning(call: Call, tree: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("WAVEJOB_CACHE", str(tree / "job.yml" / "cache"))
    found = call("doctor")
    assert found.code == 0
    assert "not writable" in found.out
    assert "set WAVEJOB_CACHE to a folder you may write to" in found.err
