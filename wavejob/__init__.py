"""Quantum wave packets from job files: write one text file, run one command.

job = wavejob.load("jobs/first_light.yml")   # checked; raises wavejob.JobFileError with every mistake
record = wavejob.simulate(job)               # in memory, nothing is written
finished = wavejob.run(job)                  # into its folder below runs/, as `wavejob run` does
past = wavejob.open_run(finished.folder)     # figures, series and fields as numpy arrays
"""

from __future__ import annotations

import sys
from importlib import import_module
from types import ModuleType
from typing import TYPE_CHECKING, Any

from .version import __version__

if TYPE_CHECKING:
    from .api import load, load_family, open_run, run, run_family, simulate
    from .problems import JobFileError, RunError

__all__ = [
    "JobFileError", "RunError", "__version__", "load", "load_family", "open_run", "run", "run_family", "simulate",
]  # fmt: skip

_HOMES = {name: "api" for name in ("load", "load_family", "open_run", "run", "run_family", "simulate")}
_HOMES |= {name: "problems" for name in ("JobFileError", "RunError")}


def __getattr__(name: str) -> Any:
    """Names of the interface are found when first asked for: the command line does not wait for them."""
    if name not in _HOMES:
        raise AttributeError(f"module {__name__!r} has no attribute {name!r}")
    return getattr(import_module(f".{_HOMES[name]}", __name__), name)


class _Package(ModuleType):
    """Keeps `wavejob.run` the function when the module of that name is loaded, and `wavejob.simulate` too."""

    def __setattr__(self, name: str, value: Any) -> None:
        if name not in _HOMES or not isinstance(value, ModuleType):
            super().__setattr__(name, value)


sys.modules[__name__].__class__ = _Package
