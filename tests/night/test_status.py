"""status.json says how far a batch is."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest

from wavejob.night.status import SPARSE, STATUS, Status


def read(folder: Path) -> dict[str, Any]:
    document: dict[str, Any] = json.loads((folder / STATUS).read_text(encoding="utf-8"))
    return document


def test_it_follows_the_jobs(tmp_path: Path) -> None:
    status = Status((tmp_path,), {"a": 10.0, "b": 10.0, "c": 20.0, "d": 5.0}, workers=2)
    status.start("a")
    status.start("b")
    status.end("a", 20.0)
    status.fail("b", "the disk is full")
    status.start("c")
    said = read(tmp_path)
    assert (said["state"], said["jobs"], said["done"], said["left"]) == ("running", 4, 1, 1)
    assert said["running"] == [{"job": "c", "share": 0.0}]
    assert said["failed"] == [{"job": "b", "reason": "the disk is full"}]
    assert said["seconds_left"] == 40.0  # `c` alone takes as long, at half the speed that was forecast
    status.end("c", 40.0)
    status.start("d")
    status.end("d", 10.0)
    assert (read(tmp_path)["state"], read(tmp_path)["seconds_left"]) == ("finished", 0.0)


def test_shares_are_written_now_and_then_and_never_fall(tmp_path: Path) -> None:
    now = [0.0]
    status = Status((tmp_path,), {"a": 10.0}, clock=lambda: now[0])
    status.start("a")
    status.go_on("a", 0.5)
    assert read(tmp_path)["running"][0]["share"] == 0.0
    now[0] = SPARSE
    status.go_on("a", 0.25)
    assert read(tmp_path)["running"][0]["share"] == 0.5
    assert status.seconds_left == pytest.approx(5.0)


def test_a_batch_that_was_stopped_says_so(tmp_path: Path) -> None:
    status = Status((tmp_path,), {"a": 1.0, "b": 1.0})
    status.start("a")
    status.running.clear()
    status.write(stopped=True)
    assert (read(tmp_path)["state"], read(tmp_path)["left"]) == ("stopped", 2)
