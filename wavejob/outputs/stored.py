"""Figures read back for a comparison: of a run's results.json, or of a baseline file that keeps many jobs'."""

from __future__ import annotations

from collections.abc import Mapping
from pathlib import Path
from typing import Annotated, TypeVar

from pydantic import BaseModel, ConfigDict, Field, ValidationError

from ..evidence.comparison import Measured
from ..problems import JobFileError, Place, Problem
from ..reading.tree import shown
from .run_tree import StoredRun
from .tables import FORMAT, write_json

LARGEST = 64 * 1024**2  # bytes of a file of figures; tens of thousands of jobs fit


class Figure(BaseModel):
    """One result; other keys that results.json has are passed over."""

    model_config = ConfigDict(frozen=True, allow_inf_nan=False)

    value: float | None
    error: Annotated[float, Field(ge=0)] | None
    unit: str
    scale: float | None = None


class Figures(BaseModel):
    """The results of one run."""

    model_config = ConfigDict(frozen=True)

    fingerprint: str
    verdict: str
    results: dict[str, Figure]

    @property
    def measured(self) -> dict[str, Measured]:
        """The results as they are compared."""
        return {
            name: Measured(figure.value, figure.error, figure.unit, figure.scale)
            for name, figure in self.results.items()
        }


class Baseline(BaseModel):
    """A baseline file: the figures of many jobs, without anything that changes from run to run."""

    model_config = ConfigDict(frozen=True)

    format: int
    jobs: dict[str, Figures]


Document = TypeVar("Document", bound=BaseModel)


def read_figures(run: StoredRun) -> Figures:
    """The figures of a finished run. Raises JobFileError where they are damaged."""
    return _read(Figures, run.path / "results.json", "holds no figures", "run its job again with --again")


def read_baseline(path: Path) -> dict[str, Figures]:
    """The figures by job. Raises JobFileError for a file that is no baseline."""
    fix = "make one with `wavejob compare DIR --write-baseline FILE`"
    baseline = _read(Baseline, path, "is no baseline", fix)
    if baseline.format > FORMAT:
        raise _problem(path, f"has format {baseline.format}, newer than {FORMAT}", "use a newer wavejob")
    return baseline.jobs


def write_baseline(path: Path, jobs: Mapping[str, Figures]) -> None:
    """Writes `jobs` in order of name, so that a new version of the file shows what changed."""
    document = {
        "format": FORMAT,
        "jobs": {job: jobs[job].model_dump() for job in sorted(jobs)},
    }
    write_json(path, document)


def _read(model: type[Document], path: Path, wrong: str, fix: str) -> Document:
    try:
        if path.stat().st_size > LARGEST:
            raise _problem(path, wrong, fix, f"it has more than {LARGEST} bytes")
        return model.model_validate_json(path.read_bytes())
    except OSError as error:
        raise _problem(path, wrong, fix, error.strerror or str(error)) from None
    except ValidationError as error:
        first = error.errors(include_url=False, include_context=False, include_input=False)[0]
        where = ".".join(map(str, first["loc"]))
        raise _problem(path, wrong, fix, f"{where}: {first['msg']}" if where else first["msg"]) from None


def _problem(path: Path, wrong: str, fix: str, why: str = "") -> JobFileError:
    said = f"{wrong} ({why})" if why else wrong
    return JobFileError([Problem(said, fix, place=Place(shown(path)))])
