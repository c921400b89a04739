"""One process a job: what breaks one of them, be it the system itself, is told and stops no other.

Children are forked from a clean server that has loaded the program already, where the system can do that: a
job then starts in milliseconds, and none inherits threads or open files of the parent.
"""

from __future__ import annotations

import contextlib
import logging
import multiprocessing
import os
import signal
import sys
import time
import traceback
from collections.abc import Generator, Iterable, Iterator
from dataclasses import dataclass
from multiprocessing.connection import Connection, wait
from multiprocessing.process import BaseProcess
from types import FrameType
from typing import Any, Literal

from ..families import load_variant
from ..problems import JobFileError, RunError
from ..simulate import Progress
from .queue import Order, Queue

LOADED_ONCE = ["wavejob.night.workers", "wavejob.run", "wavejob.outputs.overview", "wavejob.outputs.film"]
# Idle threads sleep, and linear algebra takes none: there is one worker for each core.
QUIET_THREADS = {"OMP_WAIT_POLICY": "passive", "OMP_NUM_THREADS": "1", "OPENBLAS_NUM_THREADS": "1"}
SPARSE = 0.5  # seconds between two reports of a worker
PATIENCE = 10.0  # seconds that a child has to end when asked to
OUT_OF_MEMORY = "the memory is used up; take fewer points, allow less with --memory, or take fewer --workers"
CAUSES = {
    "SIGKILL": ", as systems do where memory runs out; take fewer --workers, or allow less with --memory",
    "SIGXCPU": ": it used up the processor time that it is allowed",
    "SIGXFSZ": ": a file grew larger than is allowed",
}


@dataclass(frozen=True)
class Event:
    """Something that happened to an order."""

    order: Order


@dataclass(frozen=True)
class Started(Event):
    """A worker has it."""


@dataclass(frozen=True)
class Went(Event):
    """It went on: `share` of its steps are done."""

    share: float
    stage: Literal["run", "film"] = "run"


@dataclass(frozen=True)
class Said(Event):
    """A warning."""

    text: str


@dataclass(frozen=True)
class Ended(Event):
    """It is finished: `status` and `verdict` as of `run.Finished`."""

    status: str
    verdict: str
    seconds: float


@dataclass(frozen=True)
class Failed(Event):
    """It could not finish. `trace` is there where the program itself is at fault."""

    reason: str
    trace: str = ""


@dataclass
class _Child:
    order: Order
    process: BaseProcess
    pipe: Connection
    begun: float
    ended: bool = False


class Stopped(KeyboardInterrupt):
    """The parent asked this worker to end."""


def carry_out(
    orders: Iterable[Order], workers: int, memory: int, *, every: float = 1.0
) -> Generator[Event | None, None, None]:
    """Carries out all orders, `workers` at a time, and tells what happens; None after `every` seconds of nothing.

    Closing the iterator early stops the workers; each of them tidies up first.
    """
    queue, children = Queue(orders, memory), dict[int, _Child]()
    context = _context()
    with _for_children():
        try:
            while queue.waiting or children:
                while len(children) < workers and (order := queue.start()) is not None:
                    children[order.number] = _started(context, order)
                    yield Started(order)
                ends = [end for child in children.values() for end in (child.pipe, child.process.sentinel)]
                if not wait(ends, every):
                    yield None
                for child in list(children.values()):
                    yield from _news(child)
                    if child.ended:
                        child.process.join()
                        child.pipe.close()
                        queue.end(child.order)
                        del children[child.order.number]
        finally:
            _stop(children.values())


def _context() -> Any:
    if "forkserver" not in multiprocessing.get_all_start_methods():
        return multiprocessing.get_context("spawn")
    context = multiprocessing.get_context("forkserver")
    context.set_forkserver_preload(LOADED_ONCE)
    return context


@contextlib.contextmanager
def _for_children() -> Iterator[None]:
    """While the block lasts, processes that are started take one sleeping thread, and import what this one does."""
    wanted = QUIET_THREADS | {"PYTHONPATH": os.pathsep.join(path or os.getcwd() for path in sys.path)}
    before = {name: os.environ.get(name) for name in wanted}
    os.environ.update(wanted)
    try:
        yield
    finally:
        for name, value in before.items():
            if value is None:
                del os.environ[name]
            else:
                os.environ[name] = value


def _started(context: Any, order: Order) -> _Child:
    mine, theirs = context.Pipe(duplex=False)
    process = context.Process(target=work, args=(order, theirs), name=order.name, daemon=True)
    process.start()
    theirs.close()
    return _Child(order, process, mine, time.monotonic())


def _news(child: _Child) -> Iterator[Event]:
    """What a child has said since last asked, and how it ended if it said nothing of that."""
    gone = not child.process.is_alive()  # asked first: what it said before it went is in the pipe
    with contextlib.suppress(EOFError, OSError):
        while not child.ended and child.pipe.poll():
            kind, *said = child.pipe.recv()
            event = _event(child, kind, said)
            child.ended = isinstance(event, Ended | Failed)
            yield event
    if gone and not child.ended:
        child.ended = True
        yield Failed(child.order, _cause(child.process.exitcode))


def _event(child: _Child, kind: str, said: list[Any]) -> Event:
    if kind == "ended":
        return Ended(child.order, str(said[0]), str(said[1]), time.monotonic() - child.begun)
    kinds: dict[str, type[Any]] = {"went": Went, "said": Said, "failed": Failed}
    event: Event = kinds[kind](child.order, *said)
    return event


def _cause(code: int | None) -> str:
    """Why a process ended that did not say so itself."""
    if code is None or code >= 0:
        return f"its process ended with exit code {code}"
    try:
        name = signal.Signals(-code).name
    except ValueError:
        name = f"signal {-code}"
    return f"its process was ended by {name}{CAUSES.get(name, '')}"


def _stop(children: Iterable[_Child]) -> None:
    """Asks the children to end, and ends those that do not."""
    children = list(children)
    for child in children:
        child.process.terminate()
    last = time.monotonic() + PATIENCE
    for child in children:
        child.process.join(max(last - time.monotonic(), 0.1))
        if child.process.is_alive():
            child.process.kill()
            child.process.join()
        child.pipe.close()


def _terminated(_: int, __: FrameType | None) -> None:
    raise Stopped


class _ToParent(logging.Handler):
    """Sends what is logged to the parent."""

    def __init__(self, pipe: Connection) -> None:
        super().__init__(logging.WARNING)
        self.pipe = pipe

    def emit(self, record: logging.LogRecord) -> None:
        self.pipe.send(("said", record.getMessage()))


def work(order: Order, pipe: Connection) -> None:
    """Carries out one order, in a process of its own; all that is to be told goes into `pipe`."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)  # Ctrl-C reaches the whole group: the parent decides
    signal.signal(signal.SIGTERM, _terminated)
    logger = logging.getLogger("wavejob")
    logger.addHandler(_ToParent(pipe))
    logger.propagate = False
    try:
        pipe.send(_done(order, pipe))
    except Stopped:
        return
    except (BrokenPipeError, ConnectionResetError):  # the parent is gone, and nobody waits for this
        return
    except (RunError, JobFileError) as error:
        pipe.send(("failed", str(error)))
    except MemoryError:
        pipe.send(("failed", OUT_OF_MEMORY))
    except Exception as error:
        said = " ".join(str(error).split())
        pipe.send(("failed", f"{type(error).__name__}: {said[:200]}", traceback.format_exc()))


def _done(order: Order, pipe: Connection) -> tuple[str, str, str]:
    from ..run import run_job  # here, because it loads the transforms, which the parent never needs

    job = load_variant(order.path, order.tree, order.variant, trust_paths=order.trust)
    if job.fingerprint != order.fingerprint:
        raise RunError("the job file was changed after it had been checked", "run it again")
    spoken = [time.monotonic()]

    def tell(share: float, stage: str) -> None:
        if time.monotonic() - spoken[0] >= SPARSE:
            spoken[0] = time.monotonic()
            pipe.send(("went", share, stage))

    def step(progress: Progress) -> None:
        tell(progress.step / progress.steps, "run")

    finished = run_job(
        job,
        order.runs,
        again=order.again,
        bars=order.bars,
        film=order.film,
        progress=step,
        film_progress=lambda done, total: tell(done / total, "film"),
    )
    return "ended", finished.status, finished.verdict
