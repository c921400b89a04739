"""A batch that is stopped: workers end, what is finished is kept."""

from __future__ import annotations

import json
import os
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from .conftest import JOB

LONG = JOB.replace("until: 2, step: 0.02", "until: 4000, step: 0.0001")


@pytest.mark.skipif(sys.platform == "win32", reason="signals are those of POSIX")
@pytest.mark.parametrize(("stop", "code"), [(signal.SIGINT, 130), (signal.SIGTERM, 143)])
def test_a_signal_stops_the_workers_and_keeps_what_is_done(
    tree: Path, environment: dict[str, str], stop: signal.Signals, code: int
) -> None:
    """Exit codes as shells give them: 128 and the number of the signal."""
    (tree / "job.yml").write_text(JOB + "priority: 1\n", encoding="utf-8")
    for name in ("long", "longer"):
        (tree / f"{name}.yml").write_text(LONG, encoding="utf-8")
    status, pids = tree / "runs" / "status.json", set[int]()
    command = [sys.executable, "-m", "wavejob", "run", ".", "--workers", "2"]
    with subprocess.Popen(
        command, cwd=tree, env=environment, stderr=subprocess.PIPE, start_new_session=True
    ) as process:
        last = time.monotonic() + 60
        while time.monotonic() < last:
            time.sleep(0.1)
            said = json.loads(status.read_text(encoding="utf-8")) if status.exists() else {"done": 0}
            if said["done"] == 1 and len(said["running"]) == 2:
                break
        pids = _group(process.pid)
        process.send_signal(stop)
        _, errors = process.communicate(timeout=60)
    assert process.returncode == code
    assert b"stopped: 1 job of 3 finished and kept" in errors
    assert b"Traceback" not in errors
    said = json.loads(status.read_text(encoding="utf-8"))
    assert (said["state"], said["done"], said["left"]) == ("stopped", 1, 2)
    assert [path.parts[-3] for path in tree.glob("runs/*/*/manifest.json")] == ["job"]
    last = time.monotonic() + 10
    while _group(process.pid) and time.monotonic() < last:
        time.sleep(0.1)
    assert len(pids) >= 3
    assert _group(process.pid) == set()


def _group(leader: int) -> set[int]:
    """The processes of a group that are still at work."""
    found = subprocess.run(["ps", "-eo", "pid,pgid,stat"], capture_output=True, text=True, check=True, env=os.environ)
    rows = [line.split() for line in found.stdout.splitlines()[1:]]
    return {int(pid) for pid, group, state in rows if int(group) == leader and not state.startswith("Z")}
