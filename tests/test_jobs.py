"""The jobs of jobs/: they read, use every kind, state what published formulas give, and are trusted when run."""

from __future__ import annotations

import json
from collections.abc import Callable
from functools import cache
from pathlib import Path

import numpy as np
import pytest

from tests.jobs_reference import atoms, electrons, molecules
from tests.jobs_reference.table import REFERENCES
from wavejob.job import Job
from wavejob.kinds import FAMILIES
from wavejob.loading import load
from wavejob.plan import make_plan
from wavejob.reading.tree import JobTree
from wavejob.run import run_job

JOBS = Path(__file__).parents[1] / "jobs"
TREE = JobTree(JOBS)
IDS = [TREE.job_id(file) for file in TREE.job_files(JOBS)]
STATED = 0.05  # of a tolerance: how far a stated value may be from its formula
QUICK = ("beam/storage_ring", "atoms/transport", "stack/thick_second", "neutrons/mirror")


@cache
def job(name: str) -> Job:
    return load(JOBS / f"{name}.yml", TREE)


@cache
def reference(name: str) -> dict[str, float]:
    return REFERENCES[name]()


def test_eight_designs_and_more_are_there() -> None:
    assert len(IDS) >= 8
    assert "first_light" in IDS


@pytest.mark.parametrize("name", IDS)
def test_job_can_be_planned_and_says_what_it_is_for(name: str) -> None:
    plan = make_plan(job(name))
    assert plan.steps > 0
    assert plan.job.keys.job
    assert plan.job.keys.about
    assert plan.job.keys.expect


@pytest.mark.parametrize("name", IDS)
def test_expected_values_are_those_of_the_formula(name: str) -> None:
    """Each value is computed anew from the source it names, without wavejob."""
    this = job(name)
    stated = [expect for expect in this.keys.expect if expect.equals is not None]
    assert stated
    for expect in stated:
        assert expect.source
        dimension = this.figures[expect.result].dimension
        value = this.units.to_file(this.units.read(expect.equals, dimension), dimension)
        tolerance = this.units.to_file(this.units.read(expect.tolerance, dimension), dimension)
        assert value == pytest.approx(reference(name)[expect.result], abs=STATED * tolerance)


def test_every_reference_belongs_to_a_job() -> None:
    assert set(REFERENCES) == set(IDS)


@pytest.mark.parametrize(
    ("table", "rows"),
    [
        ("atoms/floor.csv", atoms.floor_heights),
        ("atoms/lattice_start.csv", atoms.bloch_start),
        ("molecules/transfer_scan.csv", molecules.scan),
        ("beam/pulse_trace.csv", electrons.trace_rows),
        ("beam/model_atom.csv", electrons.model_atom),
    ],
)
def test_table_holds_what_it_says(table: str, rows: Callable[[], tuple[np.ndarray, np.ndarray]]) -> None:
    """Each table is filled from a formula, to the digits it is written with."""
    at, values = rows()
    stored = np.loadtxt(JOBS / table, delimiter=",", skiprows=2)
    np.testing.assert_allclose(stored[:, 0], at, atol=1e-9)
    np.testing.assert_allclose(stored[:, 1], values, rtol=1e-6, atol=1e-6)


def test_every_kind_is_used() -> None:
    used: dict[str, set[str]] = {family: set() for family in FAMILIES}
    for name in IDS:
        keys = job(name).keys
        for item in keys.potential:
            used["potential"].add(item.kind)
            if item.in_time:
                used["in_time"].add(item.in_time.kind)
            if item.path:
                used["path"].add(item.path.x.kind)
        used["packet"].add(keys.packet.kind)
        used["observable"] |= {item.kind for item in keys.observables or []}
    missing = {family: set(kinds) - used[family] for family, kinds in FAMILIES.items()}
    assert missing == {family: set() for family in FAMILIES}


def test_every_kind_of_edge_and_units_is_used() -> None:
    ends, systems, bases = set(), set(), 0
    for name in IDS:
        keys = job(name).keys
        ends |= {end if isinstance(end, str) else "absorb" for end in (keys.edges.x.low, keys.edges.x.high)}
        systems.add(keys.units if isinstance(keys.units, str) else "real")
        bases += "based_on" in job(name).text
    assert ends == {"wrap", "wall", "absorb"}
    assert systems == {"natural", "atomic", "real"}
    assert bases


def test_first_light_runs_whole(tmp_path: Path) -> None:
    finished = run_job(job("first_light"), tmp_path)
    assert finished.verdict == "trusted"
    results = json.loads((finished.folder / "results.json").read_text(encoding="utf-8"))
    assert {e["outcome"] for e in results["expectations"]} == {"met"}
    assert (finished.folder / "film.mp4").stat().st_size > 10_000
    assert (finished.folder / "overview.png").stat().st_size > 10_000


@pytest.mark.parametrize("name", [pytest.param(n, marks=() if n in QUICK else pytest.mark.slow) for n in IDS])
def test_job_is_trusted(name: str, tmp_path: Path) -> None:
    """The whole job without its film: every check passes and every outside value is met."""
    finished = run_job(job(name), tmp_path, film=False)
    assert finished.record is not None
    assert [check.name for check in finished.record.checks if not check.passed] == []
    assert [j.text for j in finished.record.judgements if j.outcome != "met"] == []
    assert finished.verdict == "trusted"
