"""`wavejob check`: all mistakes of all files, and a forecast; nothing is run."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from .conftest import JOB, Call


def test_a_good_file_is_described(call: Call, tree: Path) -> None:
    found = call("check", "job.yml")
    assert found.code == 0
    first, *lines = found.out.splitlines()
    assert first == "job"
    assert [line.split()[0] for line in lines if line] == ["grid", "step", "rows", "forecast"]
    assert "128 points from -20 to 20" in found.out
    assert "0.02, 100 times, order 4" in found.out
    assert found.err == "1 job file read: no mistakes\n"
    assert not (tree / "runs").exists()


def test_all_mistakes_of_all_files_are_reported(call: Call, tree: Path) -> None:
    (tree / "a.yml").write_text(JOB.replace("points", "pionts").replace("until", "untill"), encoding="utf-8")
    (tree / "b.yml").write_text(JOB.replace("sigma: 1", "sigma: -1"), encoding="utf-8")
    (tree / "_base.yml").write_text("no job", encoding="utf-8")
    found = call("check", ".")
    assert found.code == 2
    heads = [line for line in found.err.splitlines() if line.startswith(("a.yml", "b.yml"))]
    assert [head.split(": ")[0] for head in heads] == ["a.yml:2:31", "a.yml:4:10", "b.yml:3:36"]
    assert found.err.endswith("3 job files read: 3 mistakes\n")
    assert found.out.startswith("job\n")


def test_json_has_the_promised_form(call: Call, tree: Path) -> None:
    (tree / "a.yml").write_text(JOB.replace("sigma: 1", "sigma: -1"), encoding="utf-8")
    found = call("check", ".", "--format", "json")
    document = json.loads(found.out)
    assert (found.code, found.err) == (2, "")
    assert list(document) == ["format", "command", "problems", "jobs"]
    assert [list(problem) for problem in document["problems"]] == [
        ["path", "line", "column", "key", "severity", "message", "fix"]
    ]
    assert document["problems"][0]["path"] == "a.yml"
    assert document["problems"][0]["key"] == "packet.gaussian.sigma"
    (job,) = document["jobs"]
    assert list(job) == ["job", "fingerprint", "folder", "status", "verdict", "forecast"]
    assert (job["job"], job["status"], job["folder"], job["verdict"]) == ("job", "checked", None, None)
    assert job["forecast"]["seconds"] > 0
    assert job["forecast"]["memory"] > 128 * 16


@pytest.mark.parametrize(
    ("path", "said"),
    [
        ("nope.yml", "nope.yml: there is no such file or folder; check its name and folder"),
        ("jb.yml", "jb.yml: there is no such file or folder; did you mean `job.yml`?"),
        (
            "empty",
            "empty: there are no job files in it; they end in .yml or .yaml, and do not begin with `_` or `.`",
        ),
    ],
)
def test_paths_that_lead_nowhere(call: Call, tree: Path, path: str, said: str) -> None:
    (tree / "empty").mkdir()
    found = call("check", path, "-q")
    assert (found.code, found.out, found.err) == (2, "", said + "\n")


def test_a_name_with_a_zero_byte_is_a_mistake_too(call: Call) -> None:
    assert call("check", "a\0.yml").code == 2


def test_the_same_file_named_twice_is_read_once(call: Call, tree: Path) -> None:
    found = call("check", "job.yml", ".", tree / "job.yml")
    assert found.err == "1 job file read: no mistakes\n"


def test_more_memory_than_allowed_is_refused(call: Call) -> None:
    found = call("check", "job.yml", "--memory", "10 MB", "-q")
    assert found.code == 2
    assert "job.yml:2:" in found.err
    assert "--memory" in found.err


SHALLOW = "edges: {x: {absorb: 2}}"


def test_what_is_doubtful_is_said_and_strict_counts_it(call: Call, tree: Path) -> None:
    (tree / "job.yml").write_text(JOB.replace("edges: {x: wrap}", SHALLOW), encoding="utf-8")
    found = call("check", "job.yml")
    assert found.code == 0
    assert "job.yml:9:21: warning: edges.x.absorb: a layer of 1.875 is predicted to send back" in found.err
    assert call("check", "job.yml", "--strict").code == 1
    assert call("check", "job.yml", "-q").err == ""
