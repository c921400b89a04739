"""`wavejob prune`: lists, and removes only with --yes."""

from __future__ import annotations

import json
import re
from pathlib import Path

import pytest

from tests.stored_runs import runs_of, stored
from wavejob.cli import prune
from wavejob.problems import RunError

from .conftest import Call


@pytest.fixture
def runs(tree: Path) -> Path:
    """Four runs of job `stack/a`, of which f1 is the oldest, and one of `b`."""
    runs = runs_of(tree)
    for number in range(1, 5):
        stored(runs, "stack/a", f"f{number}", days=10 - number)
    stored(runs, "b", "f1", days=99)
    return runs


def left(runs: Path) -> list[str]:
    return sorted(path.parent.relative_to(runs).as_posix() for path in runs.rglob("manifest.json"))


def test_it_lists_and_removes_nothing(call: Call, runs: Path) -> None:
    before = left(runs)
    found = call("prune")
    assert found.code == 0
    assert re.fullmatch(
        r"runs/stack/a/f1  \d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ  \d+ B  would be removed \(3 newer\)\n", found.out
    )
    assert re.fullmatch(r"1 of 5 runs would be removed, \d+ B; give --yes to remove\n", found.err)
    assert left(runs) == before


def test_yes_removes(call: Call, runs: Path) -> None:
    found = call("prune", "--keep", "1", "--yes")
    assert found.code == 0
    assert [line.split()[0] for line in found.out.splitlines()] == [
        "runs/stack/a/f1", "runs/stack/a/f2", "runs/stack/a/f3",
    ]  # fmt: skip
    assert re.fullmatch(r"3 of 5 runs removed, [\d.]+ k?B\n", found.err)
    assert left(runs) == ["b/f1", "stack/a/f4"]
    again = call("prune", "--keep", "1", "--yes")
    assert (again.code, again.out, again.err) == (0, "", "0 of 2 runs removed, 0 B\n")


@pytest.mark.parametrize(
    ("folder", "count"), [(".", 3), ("runs", 3), ("runs/stack", 3), ("runs/stack/a", 3), ("runs/b", 0), ("sub", 3)]
)
def test_a_tree_or_a_part_of_its_runs(call: Call, tree: Path, runs: Path, folder: str, count: int) -> None:
    (tree / ".git").mkdir()
    (tree / "sub").mkdir()
    found = call("prune", folder, "--keep", "1", "-q")
    assert (found.code, found.err) == (0, "")
    assert len(found.out.splitlines()) == count


def test_runs_behind_a_link_are_found(call: Call, tree: Path, runs: Path) -> None:
    runs.rename(tree / "disk")
    (tree / "runs").symlink_to(tree / "disk")
    assert len(call("prune", "--keep", "1").out.splitlines()) == 3
    assert call("prune", "--keep", "1", "--yes").code == 0
    assert left(tree / "disk") == ["b/f1", "stack/a/f4"]


def test_json_has_an_entry_for_each_run(call: Call, runs: Path) -> None:
    found = call("prune", "--yes", "--format", "json", "-q")
    document = json.loads(found.out)
    (entry,) = document["jobs"]
    assert list(document) == ["format", "command", "problems", "jobs"]
    assert entry["bytes"] > 100
    assert re.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ", entry["touched"])
    assert entry | {"bytes": 0, "touched": ""} == {
        "job": "stack/a", "fingerprint": "f1", "folder": "runs/stack/a/f1", "status": "removed", "verdict": None,
        "forecast": None, "reason": "3 newer", "touched": "", "bytes": 0,
    }  # fmt: skip


def test_a_run_that_resists_stops_no_other(call: Call, runs: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    remove = prune.remove

    def refused(kept: Path, old: prune.Outdated) -> bool:
        if old.run.fingerprint == "f1":
            raise RunError("could not remove it", "check its permissions")
        return remove(kept, old)

    monkeypatch.setattr(prune, "remove", refused)
    found = call("prune", "--keep", "1", "--yes")
    assert found.code == 1
    assert found.err.startswith("could not remove it; check its permissions\n2 of 5 runs removed, ")
    assert left(runs) == ["b/f1", "stack/a/f1", "stack/a/f4"]


@pytest.mark.parametrize("number", ["0", "-1", "1.5", "three", "", "9" * 5000])
def test_a_number_of_runs_is_wanted(call: Call, runs: Path, number: str) -> None:
    found = call("prune", f"--keep={number}", "--yes")
    assert found.code == 2
    assert found.err == f"wavejob prune: --keep: `{number}` is no number of runs; write a whole number from 1\n"
    assert len(left(runs)) == 5


@pytest.mark.parametrize(
    ("folder", "said"),
    [
        (".", ".: keeps no runs; name a job tree that was run, or the folder given to --runs"),
        ("job.yml", "job.yml: is no folder; name a job tree, or a folder of runs"),
        ("nope", "nope: there is no such file or folder; check its name and folder"),
    ],
)
def test_where_no_runs_are_kept(call: Call, tree: Path, folder: str, said: str) -> None:
    stored(tree / "runs", "a", "f1", days=9)  # not marked
    stored(tree / "runs", "a", "f2")
    found = call("prune", folder, "--keep", "1", "--yes")
    assert (found.code, found.out, found.err) == (2, "", said + "\n")


def test_runs_that_were_made_are_removed_whole(call: Call, tree: Path) -> None:
    """What runs leave, not what a test lays there."""
    job = (tree / "job.yml").read_text(encoding="utf-8")
    call("run", "job.yml", "-q")
    (old,) = tree.glob("runs/job/*")
    (tree / "job.yml").write_text(job.replace("until: 2", "until: 3"), encoding="utf-8")
    call("run", "job.yml", "-q")
    assert call("prune", "--keep", "1", "--yes").code == 0
    assert not old.exists()
    assert len(list(tree.glob("runs/job/*"))) == 1
