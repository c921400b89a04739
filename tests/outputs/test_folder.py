"""A run folder belongs to one job for good, and is finished only with its manifest."""

from __future__ import annotations

import json
import os
from pathlib import Path

import pytest

from wavejob.outputs.folder import RunFolder
from wavejob.problems import RunError


def _finish(folder: RunFolder, **more: object) -> None:
    document = {"job": folder.job, "fingerprint": folder.fingerprint, **more}
    for name in ("results.json", "manifest.json"):
        (folder.path / name).write_text(json.dumps(document))


def _begin(folder: RunFolder, **more: list[str]) -> None:
    with folder.held():
        folder.begin(**more)


def test_folder_stands_below_the_jobs_id(tmp_path: Path) -> None:
    folder = RunFolder(tmp_path, "stack/nominal", "3f9a0c12d4")
    assert folder.path == tmp_path / "stack" / "nominal" / "3f9a0c12d4"
    assert folder.finished() is None
    _begin(folder)
    assert folder.path.is_dir()
    assert folder.finished() is None


def test_finished_is_told_by_the_manifest(tmp_path: Path) -> None:
    folder = RunFolder(tmp_path, "a", "f1")
    _begin(folder)
    _finish(folder, partial=["film"])
    assert folder.finished() == {"job": "a", "fingerprint": "f1", "partial": ["film"]}
    assert folder.partial == ("film",)


@pytest.mark.parametrize(
    "text",
    ["", "{", "[]", "null", '{"job": "a", "fingerprint": "f2"}', '{"job": "b", "fingerprint": "f1"}', "\xff"],
)
def test_a_damaged_or_strange_manifest_is_unfinished(tmp_path: Path, text: str) -> None:
    folder = RunFolder(tmp_path, "a", "f1")
    _begin(folder)
    (folder.path / "manifest.json").write_bytes(text.encode("latin-1"))
    assert folder.finished() is None
    assert folder.partial == ()


def test_remains_are_cleared_but_for_what_is_kept(tmp_path: Path) -> None:
    folder = RunFolder(tmp_path, "a", "f1")
    _begin(folder)
    for name in ("series.csv", ".film.1234.mp4", "checkpoint.npz"):
        (folder.path / name).write_text("x")
    _finish(folder)
    _begin(folder, keep=["checkpoint.npz"])
    assert sorted(os.listdir(folder.path)) == [".job", ".lock", "checkpoint.npz"]
    assert folder.finished() is None


def test_a_job_named_like_a_fingerprint_keeps_its_runs(tmp_path: Path) -> None:
    """Jobs `a` and `a/f1`: the run folder of the first is the job folder of the second."""
    below = RunFolder(tmp_path, "a/f1", "f2")
    _begin(below)
    _finish(below)
    above = RunFolder(tmp_path, "a", "f1")
    _begin(above)
    _begin(above)
    assert below.finished()


def test_another_jobs_folder_is_refused(tmp_path: Path) -> None:
    """On a file system that does not tell case apart, `Stack` and `stack` are one folder."""
    folder = RunFolder(tmp_path, "Stack", "f1")
    _begin(folder)
    _finish(folder)
    (tmp_path / "stack").symlink_to("Stack")
    with pytest.raises(RunError, match="belongs to job `Stack`"):
        _begin(RunFolder(tmp_path, "stack", "f1"))
    assert folder.finished()


def test_somebodys_files_are_left_alone(tmp_path: Path) -> None:
    folder = RunFolder(tmp_path, "a", "f1")
    folder.path.mkdir(parents=True)
    (folder.path / "thesis.tex").write_text("x")
    with pytest.raises(RunError, match=r"holds files that no run has left there, such as `thesis\.tex`"):
        _begin(folder)
    assert os.listdir(folder.path) == ["thesis.tex"]


def test_a_claim_that_was_cut_short_is_taken_up(tmp_path: Path) -> None:
    folder = RunFolder(tmp_path, "a", "f1")
    folder.path.mkdir(parents=True)
    (folder.path / "..job.1a2b3c4d").write_text("{")
    _begin(folder)
    assert sorted(os.listdir(folder.path)) == [".job", ".lock"]


def test_a_file_in_the_way_is_explained(tmp_path: Path) -> None:
    (tmp_path / "a").write_text("x")
    with pytest.raises(RunError, match="a file stands where a folder is needed"):
        _begin(RunFolder(tmp_path, "a", "f1"))


@pytest.mark.parametrize("job", ["", "/a", "a/", "a//b", "..", "a/../b", "./a", "a\\b", "a\0b", "a\nb"])
def test_unsafe_ids_are_refused(tmp_path: Path, job: str) -> None:
    with pytest.raises(ValueError, match="no job id"):
        RunFolder(tmp_path, job, "f1")


@pytest.mark.parametrize("fingerprint", ["", "..", "a/b"])
def test_unsafe_fingerprints_are_refused(tmp_path: Path, fingerprint: str) -> None:
    with pytest.raises(ValueError, match="no fingerprint"):
        RunFolder(tmp_path, "a", fingerprint)


def test_one_process_at_a_time(tmp_path: Path) -> None:
    """Two runs of one job at once would clear each other's files; flock(2) also tells two openings of one process."""
    folder = RunFolder(tmp_path, "a", "f1")
    with folder.held():
        with pytest.raises(RunError, match="another process is at work in"), RunFolder(tmp_path, "a", "f1").held():
            pass
        RunFolder(tmp_path, "a", "f2").path.mkdir()
    _begin(folder)  # free again


def test_damaged_results_are_unfinished(tmp_path: Path) -> None:
    folder = RunFolder(tmp_path, "a", "f1")
    _begin(folder)
    _finish(folder)
    (folder.path / "results.json").write_text('{"job":')
    assert folder.finished() is None
