"""Old runs: which may go and what stays (the rules are those of the page `prune`)."""

from __future__ import annotations

import os
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from tests.stored_runs import NOW, runs_of, stored
from wavejob.outputs.folder import LOCK, OWNER, RunFolder
from wavejob.outputs.pruning import outdated, remove
from wavejob.outputs.run_tree import claimed_runs
from wavejob.problems import RunError


@pytest.fixture
def runs(tmp_path: Path) -> Path:
    return runs_of(tmp_path)


def may_go(runs: Path, keep: int = 1, now: datetime | None = None) -> list[str]:
    old = outdated(claimed_runs(runs, runs), keep, now or datetime.now(UTC))
    return [entry.run.path.relative_to(runs).as_posix() for entry in old]


def aged(folder: Path, days: float) -> None:
    """Makes everything in `folder` look written to `days` ago."""
    then = (datetime.now(UTC) - timedelta(days=days)).timestamp()
    for entry in (*folder.iterdir(), folder):
        os.utime(entry, (then, then))


@pytest.mark.parametrize(("keep", "gone"), [(1, ["a/f2", "a/f1"]), (2, ["a/f2"]), (3, []), (9, [])])
def test_the_newest_of_each_job_stay(runs: Path, keep: int, gone: list[str]) -> None:
    for fingerprint, days in (("f1", 5), ("f2", 50), ("f3", 0.5)):
        stored(runs, "a", fingerprint, days=days)
    stored(runs, "a/b", "f1", days=99)
    assert may_go(runs, keep) == gone


def test_a_run_goes_with_all_that_is_in_it(runs: Path) -> None:
    old = stored(runs, "stack/a", "f1", days=9)
    (old / "notes").mkdir()
    (old / "notes" / "mine.txt").write_text("x", encoding="utf-8")
    new = stored(runs, "stack/a", "f2")
    (entry,) = outdated(claimed_runs(runs, runs), 1, NOW)
    assert entry.size == sum(file.stat().st_size for file in old.rglob("*") if file.is_file())
    assert remove(runs, entry)
    assert not old.exists()
    assert (new / "results.json").is_file()


def test_empty_folders_of_jobs_go_and_the_marked_one_stays(runs: Path) -> None:
    folder = stored(runs, "stack/a", "f1", finished=False)
    aged(folder, 2)
    (entry,) = outdated(claimed_runs(runs, runs), 1, datetime.now(UTC))
    assert remove(runs, entry)
    assert sorted(path.name for path in runs.iterdir()) == [".gitignore", ".wavejob-runs"]


@pytest.mark.parametrize(("days", "gone"), [(0, []), (0.9, []), (1.1, ["a/f1"])])
def test_an_unfinished_run_goes_after_a_day(runs: Path, days: float, gone: list[str]) -> None:
    aged(stored(runs, "a", "f1", finished=False), days)
    assert may_go(runs, keep=9) == gone


def test_one_file_written_to_of_late_keeps_an_unfinished_run(runs: Path) -> None:
    folder = stored(runs, "a", "f1", finished=False)
    aged(folder, 5)
    (folder / "run.log").write_text("still at it", encoding="utf-8")
    os.utime(folder, (0, 0))
    assert may_go(runs) == []


def test_a_run_at_work_stays_however_long_it_takes(runs: Path) -> None:
    folder = stored(runs, "a", "f1", finished=False)
    aged(folder, 9)
    with RunFolder(runs, "a", "f1").held():
        assert may_go(runs) == []
    assert may_go(runs) == ["a/f1"]


def test_a_finished_run_that_is_held_stays(runs: Path) -> None:
    folder = stored(runs, "a", "f1", days=5)
    stored(runs, "a", "f2")
    (entry,) = outdated(claimed_runs(runs, runs), 1, NOW)
    with RunFolder(runs, "a", "f1").held():
        assert not remove(runs, entry)
    assert (folder / "results.json").is_file()
    assert remove(runs, entry)
    assert not folder.exists()


def test_a_finished_run_is_judged_by_its_manifest(runs: Path) -> None:
    """A manifest that cannot be read is no sign of an unfinished run, nor of an old one."""
    folder = stored(runs, "a", "f1")
    stored(runs, "a", "f2")
    (folder / "manifest.json").write_text("{", encoding="utf-8")
    aged(folder, 9)
    assert may_go(runs) == []


def test_current_variants_stay_together(runs: Path) -> None:
    for number in range(5):
        stored(runs, "a", f"f{number}", days=number)
    (runs / "a" / "variants.csv").write_text("b2 [nm],fingerprint\n1,f2\n2,f3\n3,f4\n", encoding="utf-8")
    assert may_go(runs, keep=1) == ["a/f1"]


def test_what_is_no_run_at_its_place_stays(runs: Path) -> None:
    for fingerprint in ("f1", "f2", "f3", "f4"):
        stored(runs, "a", fingerprint, days=5)
    (runs / "a" / "f1" / OWNER).unlink()
    (runs / "a" / "f2").rename(runs / "a" / "kept by me")
    (runs / "a" / "f3" / OWNER).write_text('{"job": "../a", "fingerprint": "f3"}', encoding="utf-8")
    (runs / "a" / "f4" / OWNER).write_text("[]", encoding="utf-8")
    stored(runs, "a", "f9")
    assert may_go(runs) == []


def test_links_and_other_folders_of_runs_are_not_entered(runs: Path, tmp_path: Path) -> None:
    elsewhere = runs_of(tmp_path / "other")
    stored(elsewhere, "a", "f1", days=5)
    stored(elsewhere, "a", "f2")
    (runs / "link").symlink_to(elsewhere)
    elsewhere.rename(runs / "moved")
    assert may_go(runs) == []


def test_a_linked_file_goes_and_its_target_stays(runs: Path, tmp_path: Path) -> None:
    precious = tmp_path / "precious"
    precious.mkdir()
    (precious / "data").write_text("x", encoding="utf-8")
    old = stored(runs, "a", "f1", days=5)
    (old / "link").symlink_to(precious)
    stored(runs, "a", "f2")
    (entry,) = outdated(claimed_runs(runs, runs), 1, NOW)
    assert remove(runs, entry)
    assert (precious / "data").read_text(encoding="utf-8") == "x"


def test_runs_of_a_job_below_stay(runs: Path) -> None:
    old = stored(runs, "a", "f1", days=5)
    below = stored(runs, "a/f1", "f5")
    stored(runs, "a", "f2")
    (entry,) = outdated(claimed_runs(runs, runs), 1, NOW)
    assert remove(runs, entry)
    assert [path.name for path in old.iterdir()] == ["f5"]
    assert (below / "manifest.json").is_file()


def test_a_run_that_was_begun_again_stays(runs: Path) -> None:
    folder = stored(runs, "a", "f1", days=5)
    stored(runs, "a", "f2")
    (entry,) = outdated(claimed_runs(runs, runs), 1, NOW)
    stored(runs, "a", "f1", finished=False)
    assert not remove(runs, entry)
    assert (folder / "results.json").is_file()


def test_a_run_that_is_gone_already_is_no_failure(runs: Path) -> None:
    folder = stored(runs, "a", "f1", days=5)
    stored(runs, "a", "f2")
    (entry,) = outdated(claimed_runs(runs, runs), 1, NOW)
    assert remove(runs, entry)
    assert not folder.exists()
    assert not remove(runs, entry)


def test_a_removal_cut_short_leaves_an_unfinished_run(runs: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    folder = stored(runs, "a", "f1", days=5)
    stored(runs, "a", "f2")
    (entry,) = outdated(claimed_runs(runs, runs), 1, NOW)
    unlink = Path.unlink

    def refuse(path: Path, missing_ok: bool = False) -> None:
        if path.name == "results.json":
            raise PermissionError(13, "Permission denied", str(path))
        unlink(path, missing_ok=missing_ok)

    monkeypatch.setattr(Path, "unlink", refuse)
    with pytest.raises(RunError, match=r"could not remove .*: Permission denied; check its permissions"):
        remove(runs, entry)
    assert sorted(path.name for path in folder.iterdir()) == [OWNER, LOCK, "results.json"]
