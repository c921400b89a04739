"""Every file of tests/bad_jobs is refused with exactly the text that stands beside it.

The texts are the specification: read them as a user would. After a deliberate change of wording, write them
anew with `python tests/test_bad_jobs.py`, and read the difference before it is committed. Files that begin
with `_` are what others are based on.
"""

from __future__ import annotations

import os
import subprocess
import sys
from pathlib import Path

import pytest

from wavejob.families import load_family
from wavejob.kinds import NOT_YET
from wavejob.loading import parse
from wavejob.plan import make_plan
from wavejob.problems import JobFileError, Problem
from wavejob.reading.tree import JobTree

FOLDER = Path(__file__).parent / "bad_jobs"
NAMES = sorted(path.stem for path in FOLDER.glob("[!_]*.yml"))
ALLOWED = 2 * 2**30  # bytes of memory

GOOD = """\
units: natural
grid:
  x: {from: -20, to: 20, points: 256}
packet:
  gaussian: {at: -5, sigma: 1, wavenumber: 2}
evolve:
  until: 4
"""


def refusal(name: str) -> str:
    """What is said about one of the files, with paths from the folder of the tests."""
    here = Path.cwd()
    os.chdir(FOLDER.parent)
    try:
        for job in load_family(FOLDER / f"{name}.yml", JobTree(FOLDER)).jobs:
            make_plan(job, memory=ALLOWED)
    except JobFileError as error:
        return f"{error}\n"
    finally:
        os.chdir(here)
    return "accepted\n"


def problems(text: str, folder: Path | None = None) -> list[Problem]:
    """What is wrong with a job text; empty where it can be planned."""
    try:
        make_plan(parse(text, folder=folder), memory=ALLOWED)
    except JobFileError as error:
        return error.problems
    return []


@pytest.mark.parametrize("name", NAMES)
def test_refused_with_the_expected_text(name: str) -> None:
    assert refusal(name) == (FOLDER / f"{name}.txt").read_text(encoding="utf-8")


def test_good_job_is_accepted() -> None:
    assert problems(GOOD) == []


def test_there_are_many() -> None:
    assert len(NAMES) >= 60
    assert sorted(path.stem for path in FOLDER.glob("*.txt")) == NAMES


@pytest.mark.parametrize("name", NAMES)
def test_each_message_is_one_line_with_a_cure(name: str) -> None:
    text = (FOLDER / f"{name}.txt").read_text(encoding="utf-8")
    for line in text.splitlines():
        if line.startswith("bad_jobs/"):
            assert "; " in line or "must be greater than" in line
            for foreign in ("pydantic", "yaml.", "numpy", "Traceback", "Value error", "Input should"):
                assert foreign not in line


def nested(pattern: tuple[str, ...]) -> str:
    """A job text in YAML's flow style that holds what a pattern of NOT_YET describes."""
    value = "{}"
    for part in reversed(pattern):
        value = f"[{value}]" if part == "*" else f"{{{part}: {value}}}"
    return GOOD.replace("units", "units", 1) + value[1:-1] + "\n"


@pytest.mark.parametrize("pattern", [p for p in NOT_YET if p[0] not in ("grid", "packet", "evolve")], ids=".".join)
def test_keys_that_are_not_available_yet_are_refused_by_name(pattern: tuple[str, ...]) -> None:
    if pattern[-1] == "axis":
        pattern = (*pattern[:-2], "kind", "axis")
    found = problems(nested(pattern))
    said = [p for p in found if p.message == f"`{pattern[-1]}` is not available yet"]
    assert len(said) == 1
    if pattern[0] not in ("particle", "expect") and not {"kind", "path"} & set(pattern):
        assert found == said  # and nothing else: no echoes


@pytest.mark.parametrize("name", ["many_mistakes", "utf16", "based_on_wrong_base", "packet_too_fast", "table_contents"])
def test_the_command_says_the_same(name: str) -> None:
    """`wavejob check`: messages on standard error, nothing on standard output, exit code 2."""
    command = [sys.executable, "-m", "wavejob", "check", "--tree", FOLDER.name, f"{FOLDER.name}/{name}.yml"]
    paths = os.pathsep.join([str(FOLDER.parent.parent), os.environ.get("PYTHONPATH", "")])
    done = subprocess.run(
        command,
        cwd=FOLDER.parent,
        env={**os.environ, "PYTHONPATH": paths, "PYTHONUTF8": "1"},
        capture_output=True,
        encoding="utf-8",
        check=False,
    )
    assert done.returncode == 2
    assert done.stdout == ""
    assert done.stderr.startswith((FOLDER / f"{name}.txt").read_text(encoding="utf-8"))


def rewrite() -> None:
    """Writes the expected texts as the program has them now."""
    for name in NAMES:
        text = refusal(name)
        if text == "accepted\n":
            raise SystemExit(f"{name} is accepted")
        (FOLDER / f"{name}.txt").write_text(text, encoding="utf-8")


if __name__ == "__main__":
    rewrite()
