"""The Python interface: what is computed, what is written and what is read back are one and the same."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest

import wavejob

JOB = """\
units: {length: nm, time: fs, energy: meV}
particle: electron
grid: {x: {from: -20 nm, to: 20 nm, points: 128}}
packet: {gaussian: {at: -5 nm, sigma: 1 nm, wavenumber: 1 1/nm}}
evolve: {until: 10 fs, record: 1 fs}
observables: [norm, position, autocorrelation]
edges: {x: wrap}
"""


@pytest.fixture
def path(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    monkeypatch.setenv("WAVEJOB_CACHE", str(tmp_path / ".cache"))
    file = tmp_path / "job.yml"
    file.write_text(JOB, encoding="utf-8")
    return file


def test_a_run_is_read_back_as_it_was_computed(path: Path) -> None:
    job = wavejob.load(path)
    record = wavejob.simulate(job)
    assert not (path.parent / "runs").exists()
    finished = wavejob.run(job, film=False, bars=False)
    assert (finished.status, finished.folder.parent) == ("done", path.parent / "runs" / "job")
    past = wavejob.open_run(finished.folder)
    assert past.verdict == record.verdict
    assert past.results["position.x.final"].value == record.result("position.x.final").value
    assert past.results["position.x.final"].unit == past.series.units["position.x"] == "nm"
    assert past.series["time"] == pytest.approx(np.arange(11.0))
    np.testing.assert_array_equal(past.series["position.x"], record.column("position.x"))
    np.testing.assert_array_equal(past.fields["psi"][-1], record.psi)
    assert past.curve("autocorrelation")["autocorrelation.abs"][0] == pytest.approx(1)
    assert past.manifest["fingerprint"] == job.fingerprint
    dataset = past.dataset()
    assert dataset["psi"].dims == ("time", "x")
    np.testing.assert_array_equal(dataset["psi"].values, past.fields["psi"])
    assert dataset["x"].attrs["units"] == "nm"


def test_a_second_run_is_up_to_date(path: Path) -> None:
    job = wavejob.load(path)
    first = wavejob.run(job, path.parent / "kept", film=False, bars=False)
    assert wavejob.run(job, path.parent / "kept", film=False, bars=False).status == "up to date"
    assert wavejob.run(job, path.parent / "kept", film=False, bars=False, again=True).folder == first.folder


def test_a_folder_without_a_finished_run_is_refused(tmp_path: Path) -> None:
    with pytest.raises(wavejob.JobFileError, match="holds no finished run; name a folder below `runs/`"):
        wavejob.open_run(tmp_path)


def test_mistakes_come_as_one_error(path: Path) -> None:
    path.write_text(JOB.replace("sigma", "sgima"), encoding="utf-8")
    with pytest.raises(wavejob.JobFileError, match="did you mean `sigma`"):
        wavejob.load(path)


def test_names_stay_functions_when_modules_of_that_name_are_loaded() -> None:
    script = (
        "import wavejob, wavejob.cli, sys; assert 'numpy' not in sys.modules\n"
        "import wavejob.run, wavejob.simulate\n"
        "from wavejob.run import run_job\n"
        "assert callable(wavejob.run) and callable(wavejob.simulate) and callable(run_job)"
    )
    assert subprocess.run([sys.executable, "-c", script], check=False).returncode == 0


def test_a_name_that_is_not_there() -> None:
    with pytest.raises(AttributeError, match="has no attribute 'nothing'"):
        wavejob.nothing  # noqa: B018
