"""`wavejob new`: a file that passes `check`, and never one that was there before."""

from __future__ import annotations

from pathlib import Path

import pytest

from .conftest import Call


def test_a_new_file_passes_check_without_a_doubt(call: Call, tree: Path) -> None:
    found = call("new", "start.yml")
    assert (found.code, found.out) == (0, "")
    assert "wavejob run start.yml" in found.err
    checked = call("check", "start.yml", "--strict")
    assert (checked.code, checked.err) == (0, "1 job file read: no mistakes\n")
    comments = [line for line in (tree / "start.yml").read_text(encoding="utf-8").splitlines() if "#" in line]
    assert len(comments) > 8


@pytest.mark.parametrize(
    ("words", "said"),
    [
        (["job.yml"], "job.yml: is there already; choose another name"),
        (["none/a.yml"], "none/a.yml: can't be written: there is no folder `none`; make the folder first"),
        (["a.txt"], "a.txt: is no name of a job file; end it in .yml, as in `a.txt.yml`"),
        ([], "wavejob new: no file name given; write `wavejob new first.yml`"),
    ],
)
def test_what_cannot_be_written(call: Call, tree: Path, words: list[str], said: str) -> None:
    before = (tree / "job.yml").read_bytes()
    found = call("new", *words)
    assert (found.code, found.out, found.err) == (2, "", said + "\n")
    assert (tree / "job.yml").read_bytes() == before


def test_the_new_file_runs_and_is_trusted(call: Call) -> None:
    call("new", "start.yml", "-q")
    found = call("run", "start.yml", "--no-film", "-q", "--strict")
    assert (found.code, found.err) == (0, "")
    assert "trusted, in runs/start/" in found.out
