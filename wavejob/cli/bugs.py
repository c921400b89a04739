"""What is said when the program itself is at fault."""

from __future__ import annotations

import traceback
from datetime import UTC, datetime
from pathlib import Path

from ..evolve import wisdom
from ..version import __version__
from . import terminal


def report(error: BaseException, *, verbose: bool, doing: str = "") -> None:
    """One line about a bug; its traceback goes to standard error with `verbose`, else into a file."""
    trace = "".join(traceback.format_exception(error))
    report_trace(f"{type(error).__name__}: {_one_line(error)}", trace, verbose=verbose, doing=doing)


def report_trace(error: str, trace: str, *, verbose: bool, doing: str = "") -> None:
    """The same of an error that another process met: `error` is its name and text."""
    what = f"{doing}: " if doing else ""
    said = f"{what}an error inside wavejob {__version__} ({error})"
    if verbose:
        terminal.say(f"{trace}{said}; please report it with the lines above")
        return
    kept = _kept(trace)
    advice = f"please report it with `{kept}`" if kept else "run again with -v for the details, and please report it"
    terminal.say(f"{said}; {advice}")


def _one_line(error: BaseException) -> str:
    text = " ".join(str(error).split())
    return text if len(text) <= 200 else text[:197] + "..."


def _kept(trace: str) -> Path | None:
    """The file that now holds the traceback; None where the cache folder takes none."""
    moment = datetime.now(UTC).strftime("%Y-%m-%dT%H-%M-%S-%fZ")
    path = wisdom.folder() / f"error-{moment}.log"
    try:
        path.parent.mkdir(parents=True, exist_ok=True)
        path.write_text(f"wavejob {__version__}\n{trace}", encoding="utf-8", errors="backslashreplace")
    except OSError:
        return None
    return path
