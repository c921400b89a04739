"""The cache of FFTW's measurements: it may speed a run up, and can never spoil one."""

from __future__ import annotations

import json
import logging
from pathlib import Path

import numpy as np
import pytest

from wavejob.evolve import SPLITTINGS, plan, wisdom
from wavejob.grid import Axis, Grid
from wavejob.hamiltonian import Hamiltonian

AXIS = Axis("x", -8.0, 8.0, 64)


def run(**options: object) -> np.ndarray:
    psi0 = np.exp(-(AXIS.x[None, None] ** 2)) + 0j
    stepper = plan(Hamiltonian(Grid((AXIS,)), (1.0,)), SPLITTINGS["strang"], 0.1, psi0, **options)
    stepper.advance(0, 3)
    return stepper.psi.copy()


def stored(folder: Path) -> list[Path]:
    return sorted(folder.glob("*"))


def test_what_was_learnt_is_kept_and_used(tmp_path, monkeypatch):
    run(cache=tmp_path)
    (path,) = stored(tmp_path)
    assert path.suffix == ".json"
    content = json.loads(path.read_text())
    assert "(1, 1, 64) | periodic | double" in content["key"]
    monkeypatch.setattr(wisdom, "save", lambda *_: pytest.fail("planned anew though all was known"))
    run(cache=tmp_path)


def test_the_folder_comes_from_the_environment(tmp_path, monkeypatch):
    monkeypatch.setenv("WAVEJOB_CACHE", str(tmp_path / "elsewhere"))
    run()
    assert len(stored(tmp_path / "elsewhere")) == 1


def test_other_precision_or_shape_has_its_own_file(tmp_path):
    run(cache=tmp_path)
    run(cache=tmp_path, precision="single")
    assert len(stored(tmp_path)) == 2


@pytest.mark.parametrize(
    "text",
    ["", "not json", "[]", '{"key": 1}', "{}", '{"key": "KEY", "wisdom": ["(rubbish", "", ""]}', "\x00\xff"],
)
def test_a_corrupt_file_is_replaced(tmp_path, text, caplog):
    good = run(cache=tmp_path)
    (path,) = stored(tmp_path)
    before = json.loads(path.read_text())
    path.write_text(text.replace("KEY", before["key"].replace('"', '\\"')), encoding="latin-1")
    with caplog.at_level(logging.WARNING):
        np.testing.assert_allclose(run(cache=tmp_path), good, atol=1e-15)
    assert json.loads(path.read_text())["key"] == before["key"]
    assert stored(tmp_path) == [path]


def test_a_cache_that_cannot_be_written_is_reported_once(tmp_path, caplog):
    (tmp_path / "file").write_text("in the way")
    with caplog.at_level(logging.WARNING):
        first = run(cache=tmp_path / "file" / "cache")
        second = run(cache=tmp_path / "file" / "cache")
    np.testing.assert_allclose(first, second, atol=1e-15)
    (message,) = [record.getMessage() for record in caplog.records]
    assert "going on without it" in message


def test_reproducible_runs_leave_the_cache_alone(tmp_path):
    run(cache=tmp_path, reproducible=True)
    assert stored(tmp_path) == []
