"""Cores and memory: what the system says, and what control groups take away (cgroups(7) of Linux)."""

from __future__ import annotations

import os
from pathlib import Path

import psutil
import pytest

from wavejob import machine


@pytest.fixture
def groups(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A made-up tree of control groups, version 2, with this process in /batch/job."""
    own = tmp_path / "cgroup"
    own.write_text("0::/batch/job\n", encoding="utf-8")
    (tmp_path / "fs" / "batch" / "job").mkdir(parents=True)
    monkeypatch.setattr(machine, "OWN_GROUPS", own)
    monkeypatch.setattr(machine, "CONTROL_GROUPS", tmp_path / "fs")
    return tmp_path


@pytest.mark.usefixtures("groups")
def test_without_limits_it_is_what_there_is() -> None:
    assert machine.memory() == psutil.virtual_memory().total
    assert machine.cores() == len(os.sched_getaffinity(0))


def test_the_smallest_limit_of_the_group_and_those_around_it_counts(groups: Path) -> None:
    (groups / "fs" / "batch" / "job" / "memory.max").write_text("max\n", encoding="utf-8")
    (groups / "fs" / "batch" / "memory.max").write_text("1073741824\n", encoding="utf-8")
    assert machine.memory() == 2**30
    (groups / "fs" / "batch" / "job" / "memory.max").write_text("536870912\n", encoding="utf-8")
    assert machine.memory() == 2**29


def test_limits_of_version_1_count_too(groups: Path) -> None:
    (groups / "cgroup").write_text("4:memory:/jobs\n2:cpu,cpuacct:/jobs\n", encoding="utf-8")
    (groups / "fs" / "memory" / "jobs").mkdir(parents=True)
    (groups / "fs" / "memory" / "jobs" / "memory.limit_in_bytes").write_text("1048576\n", encoding="utf-8")
    (groups / "fs" / "cpu" / "jobs").mkdir(parents=True)
    (groups / "fs" / "cpu" / "jobs" / "cpu.cfs_quota_us").write_text("150000\n", encoding="utf-8")
    (groups / "fs" / "cpu" / "jobs" / "cpu.cfs_period_us").write_text("100000\n", encoding="utf-8")
    assert machine.memory() == 2**20
    assert machine.cores() == 1


@pytest.mark.parametrize(("limit", "cores"), [("100000 100000", 1), ("50000 100000", 1), ("max 100000", None)])
def test_a_share_of_time_limits_cores(groups: Path, limit: str, cores: int | None) -> None:
    (groups / "fs" / "batch" / "cpu.max").write_text(limit, encoding="utf-8")
    assert machine.cores() == (cores or len(os.sched_getaffinity(0)))


def test_a_process_keeps_to_its_affinity() -> None:
    allowed = os.sched_getaffinity(0)
    try:
        os.sched_setaffinity(0, {min(allowed)})
        assert machine.cores() == 1
    finally:
        os.sched_setaffinity(0, allowed)
