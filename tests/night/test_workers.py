"""Workers: what breaks one of them fails its own job, with the reason."""

from __future__ import annotations

import os
import signal
import sys
import threading
import time
from contextlib import closing
from dataclasses import replace
from pathlib import Path

import pytest

from wavejob.families import load_family
from wavejob.night.queue import Order
from wavejob.night.workers import Ended, Event, Failed, Started, carry_out
from wavejob.reading.tree import JobTree

JOB = """\
units: natural
grid: {x: {from: -20, to: 20, points: 128}}
packet: {gaussian: {at: -5, sigma: 1, wavenumber: 1}}
evolve: {until: 2, step: 0.02}
classical: none
error_bars: none
film: none
edges: {x: wrap}
"""
LONG = JOB.replace("until: 2, step: 0.02", "until: 2000, step: 0.0001")
POSIX = pytest.mark.skipif(sys.platform == "win32", reason="signals are those of POSIX")


def order(folder: Path, number: int, text: str = JOB) -> Order:
    path = folder / f"job{number}.yml"
    path.write_text(text, encoding="utf-8")
    (job,) = load_family(path, JobTree(folder)).jobs
    return Order(number, job.name, path, job.tree, 0, job.fingerprint, folder / "runs")


def ends(events: list[Event | None]) -> dict[int, Event]:
    return {event.order.number: event for event in events if isinstance(event, Ended | Failed)}


def test_a_failure_stops_no_other(tmp_path: Path) -> None:
    orders = [order(tmp_path, number) for number in range(3)]
    orders[1] = replace(orders[1], fingerprint="0")
    found = ends(list(carry_out(orders, 2, 2**40)))
    assert isinstance(found[0], Ended)
    assert isinstance(found[2], Ended)
    assert isinstance(found[1], Failed)
    assert found[1].reason == "the job file was changed after it had been checked; run it again"
    assert len(list(tmp_path.glob("runs/*/*/manifest.json"))) == 2


@POSIX
def test_one_that_the_system_ends_is_told_with_the_signal(tmp_path: Path) -> None:
    """As where memory runs out on Linux: the process is gone without a word."""
    import multiprocessing

    events: list[Event | None] = []
    for event in carry_out([order(tmp_path, 0, LONG), order(tmp_path, 1)], 1, 2**40, every=0.05):
        events.append(event)
        if isinstance(event, Started) and event.order.number == 0:
            (child,) = multiprocessing.active_children()
            assert child.pid is not None
            threading.Timer(0.2, os.kill, (child.pid, signal.SIGKILL)).start()
    found = ends(events)
    assert isinstance(found[0], Failed)
    assert found[0].reason.startswith("its process was ended by SIGKILL, as systems do where memory runs out")
    assert isinstance(found[1], Ended)


def test_closing_stops_the_workers(tmp_path: Path) -> None:
    begun = time.monotonic()
    with closing(carry_out([order(tmp_path, 0, LONG)], 1, 2**40, every=0.05)) as events:
        assert isinstance(next(events), Started)
    assert time.monotonic() - begun < 20
    assert not list(tmp_path.glob("runs/*/*/manifest.json"))
