"""What stands of a job in its run folder, and whether that is all that is asked for."""

from __future__ import annotations

from typing import Any

from .job import Job, plain
from .outputs.folder import RunFolder

FILM, BARS = "film", "error_bars"  # what a run may leave out


def pictures(job: Job) -> dict[str, Any]:
    """What pictures depend on beside the numbers."""
    return {"title": job.title, "film": plain(job.keys.film)}


def film_name(job: Job) -> str | None:
    """The name of the film's file; None where the job asks for none."""
    return None if isinstance(job.keys.film, str) else f"film.{job.keys.film.format}"


def made_before(folder: RunFolder) -> tuple[bool, bool]:
    """Whether a finished run has error bars, and whether it has a film: what is done again is done as fully."""
    if folder.finished() is None:
        return False, False
    return BARS not in folder.partial, FILM not in folder.partial


def has_bars(job: Job) -> bool:
    """Whether the job asks for error bars: rounding and recording alone are none."""
    parts = job.keys.error_bars
    return not isinstance(parts, str) and (parts.step or parts.grid or parts.box == "yes")


def stands(job: Job, folder: RunFolder, *, bars: bool, film: bool) -> bool:
    """Whether a finished run has all that is wanted: with `bars` its error bars, with `film` the film as it is now."""
    done = folder.finished()
    if done is None:
        return False
    left_out = folder.partial
    if bars and BARS in left_out:
        return False
    name = film_name(job) if film else None
    return name is None or (
        FILM not in left_out and done.get("choices") == pictures(job) and (folder.path / name).is_file()
    )
