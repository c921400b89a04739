"""For pipelines: JUnit XML of a batch, annotations, and the hook that checks jobs before a commit."""

from __future__ import annotations

import json
import re
import subprocess
import sys
import xml.etree.ElementTree as ET
from importlib import import_module
from pathlib import Path

import pytest
import yaml

from wavejob.cli.annotations import annotation
from wavejob.cli.stopping import Terminated
from wavejob.problems import Place, Problem, RunError

from .conftest import JOB, ROOT, Call

RUN = import_module("wavejob.run")
MISSED = JOB + 'expect:\n  - {result: norm.final, above: 0.5}\n  - {result: through.total, above: 2, source: "100 %"}\n'
DOUBTFUL = JOB.replace("edges: {x: wrap}", "edges: {x: {absorb: 2}}")


def cases(file: Path) -> dict[str, tuple[str, str]]:
    """By name of the case: the kind of its end, and the message."""
    found = {}
    for case in ET.parse(file).iter("testcase"):
        ends = [child for child in case if child.tag != "properties"]
        assert len(ends) <= 1
        found[case.attrib["name"]] = (ends[0].tag, ends[0].attrib["message"]) if ends else ("passed", "")
    return found


def test_failures_are_told_from_errors(call: Call, tree: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tree / "missed.yml").write_text(MISSED, encoding="utf-8")
    (tree / "broken.yml").write_text(JOB, encoding="utf-8")
    (tree / "bug.yml").write_text(JOB, encoding="utf-8")
    through = RUN.run_job

    def run_job(job: object, *rest: object, **more: object) -> object:
        wrong = {"broken": RunError("the disk is full", "make room"), "bug": ZeroDivisionError("oh")}
        if job.id in wrong:  # type: ignore[attr-defined]
            raise wrong[job.id]  # type: ignore[attr-defined]
        return through(job, *rest, **more)

    monkeypatch.setattr(RUN, "run_job", run_job)
    assert call("run", ".", "-q", "--junit", "jobs.xml", "--workers", "1").code == 1
    found = cases(tree / "jobs.xml")
    assert list(found) == ["broken", "bug", "job", "missed"]
    assert found["broken"] == ("error", "the disk is full; make room")
    assert found["bug"] == ("error", "an error inside wavejob (ZeroDivisionError: oh)")
    assert found["job"] == ("passed", "")
    assert found["missed"][0] == "failure"
    assert found["missed"][1].startswith("expect through.total, missed: through.total is ")
    (case,) = [case for case in ET.parse(tree / "jobs.xml").iter("testcase") if case.attrib["name"] == "missed"]
    named = {one.attrib["name"]: one.attrib["value"] for one in case.iter("property")}
    assert {"expect norm.final", "expect through.total", "check norm", "check packet resolved"} <= set(named)
    assert named["expect norm.final"].startswith("met: ")
    assert named["check norm"].startswith("passed: ")
    assert float(case.attrib["time"]) > 0


def test_a_job_that_is_up_to_date_is_a_case_too(call: Call, tree: Path) -> None:
    (tree / "job.yml").write_text(MISSED, encoding="utf-8")
    call("run", "job.yml", "-q", "--junit", "one.xml")
    call("run", "job.yml", "-q", "--junit", "two.xml")
    assert cases(tree / "one.xml") == cases(tree / "two.xml")


def test_a_failed_check_is_a_failure_with_strict(call: Call, tree: Path) -> None:
    (tree / "job.yml").write_text(DOUBTFUL, encoding="utf-8")
    assert call("run", "job.yml", "-q", "--junit", "jobs.xml").code == 0
    assert cases(tree / "jobs.xml")["job"] == ("passed", "")
    assert call("run", "job.yml", "-q", "--junit", "jobs.xml", "--strict").code == 1
    kind, said = cases(tree / "jobs.xml")["job"]
    assert kind == "failure"
    assert said.startswith("check absorber reflection x.")


def test_a_mistake_is_an_error_and_the_rest_is_skipped(call: Call, tree: Path) -> None:
    (tree / "bad.yml").write_text(JOB.replace("points", "pionts").replace("until", "untill"), encoding="utf-8")
    assert call("run", ".", "-q", "--junit", "jobs.xml").code == 2
    found = cases(tree / "jobs.xml")
    assert found["job"] == ("skipped", "nothing was started")
    assert found["bad.yml"][0] == "error"
    assert found["bad.yml"][1].startswith("bad.yml:2:31: grid.x.pionts: unknown key")


@pytest.mark.parametrize("stop", [KeyboardInterrupt, Terminated])
def test_a_batch_that_was_stopped_tells_what_it_did(
    call: Call, tree: Path, monkeypatch: pytest.MonkeyPatch, stop: type[BaseException]
) -> None:
    for name, priority in (("first", 2), ("second", 1)):
        (tree / f"{name}.yml").write_text(JOB + f"priority: {priority}\n", encoding="utf-8")
    through = RUN.run_job

    def run_job(job: object, *rest: object, **more: object) -> object:
        if job.id == "second":  # type: ignore[attr-defined]
            raise stop
        return through(job, *rest, **more)

    monkeypatch.setattr(RUN, "run_job", run_job)
    assert call("run", ".", "-q", "--junit", "jobs.xml", "--workers", "1").code in (130, 143)
    assert cases(tree / "jobs.xml") == {
        "first": ("passed", ""), "second": ("skipped", "stopped"), "job": ("skipped", "not started"),
    }  # fmt: skip


@pytest.mark.parametrize(
    ("file", "said"),
    [
        ("job.yml", "--junit: `job.yml` does not end in .xml; write e.g. `--junit jobs.xml`"),
        ("no/jobs.xml", "--junit: there is no folder `no`; make it first"),
        ("folder.xml", "--junit: `folder.xml` can't be written; choose another file"),
    ],
)
def test_a_file_that_will_not_do_is_refused_before_anything_runs(call: Call, tree: Path, file: str, said: str) -> None:
    (tree / "folder.xml").mkdir()
    found = call("run", "job.yml", "--junit", file)
    assert (found.code, found.out, found.err) == (2, "", f"wavejob run: {said}\n")
    assert (tree / "job.yml").read_text(encoding="utf-8") == JOB
    assert not (tree / "runs").exists()


def test_an_annotation_is_escaped_as_hosts_read_it() -> None:
    """Workflow commands: %, CR and LF in the message, and : and , in fields too (from memory of their reader)."""
    problem = Problem("50 %\nmore, or: less", "mend it", "a.b", Place("odd,name:1.yml", 3, 7))
    assert annotation(problem) == (
        "::error file=odd%2Cname%3A1.yml,line=3,col=7::a.b: 50 %25%0Amore, or: less; mend it"
    )
    assert annotation(Problem("is odd", severity="warning")) == "::warning::is odd"


def test_paths_count_from_the_top_of_the_checkout(tree: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("GITHUB_WORKSPACE", str(tree.parent))
    assert annotation(Problem("x", place=Place("a.yml", 1))) == f"::error file={tree.name}/a.yml,line=1::x"
    assert annotation(Problem("x", place=Place("/etc/a.yml", 1))) == "::error file=/etc/a.yml,line=1::x"


@pytest.fixture
def asked(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("GITHUB_ACTIONS", "true")
    monkeypatch.delenv("GITHUB_WORKSPACE", raising=False)


def annotations(text: str) -> list[str]:
    return [line for line in text.splitlines() if line.startswith("::")]


@pytest.mark.usefixtures("asked")
@pytest.mark.parametrize("command", ["check", "run"])
@pytest.mark.parametrize("form", ["text", "json"])
def test_mistakes_are_annotated(call: Call, tree: Path, command: str, form: str) -> None:
    (tree / "job.yml").write_text(JOB.replace("points", "pionts"), encoding="utf-8")
    found = call(command, "job.yml", "--format", form)
    assert annotations(found.err) == [
        "::error file=job.yml,line=2,col=31::grid.x.pionts: unknown key `pionts`; did you mean `points`?"
    ]
    if form == "json":
        json.loads(found.out)


@pytest.mark.usefixtures("asked")
def test_doubts_are_warnings_that_quiet_leaves_out(call: Call, tree: Path) -> None:
    (tree / "job.yml").write_text(DOUBTFUL, encoding="utf-8")
    (line, *_) = annotations(call("check", "job.yml").err)
    assert line.startswith("::warning file=job.yml,line=9,col=21::edges.x.absorb: a layer of 1.875 ")
    assert annotations(call("check", "job.yml", "-q").err) == []
    assert "::warning file=job.yml,line=1::absorber reflection x.low is " in call("run", "job.yml").err


@pytest.mark.usefixtures("asked")
def test_expectations_that_are_missed_are_annotated_where_they_stand(call: Call, tree: Path) -> None:
    (tree / "job.yml").write_text(MISSED, encoding="utf-8")
    (line,) = annotations(call("run", "job.yml", "-q").err)
    assert re.fullmatch(
        r"::error file=job\.yml,line=12,col=5::expect\[1\]: missed: through\.total is .*, wanted above 2 \(100 %25\)",
        line,
    )


@pytest.mark.usefixtures("asked")
def test_a_job_that_failed_is_annotated(call: Call, monkeypatch: pytest.MonkeyPatch) -> None:
    def run_job(*_: object, **__: object) -> None:
        raise RunError("the disk is full", "make room")

    monkeypatch.setattr(RUN, "run_job", run_job)
    found = call("run", "job.yml", "-q")
    assert annotations(found.err) == ["::error file=job.yml,line=1::the disk is full; make room"]


def test_without_being_asked_nothing_is_annotated(call: Call, tree: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.delenv("GITHUB_ACTIONS", raising=False)
    (tree / "job.yml").write_text(MISSED, encoding="utf-8")
    assert annotations(call("run", "job.yml").err) == []


def test_the_hook_checks_the_folder_of_jobs(tree: Path, environment: dict[str, str]) -> None:
    (hook,) = yaml.safe_load((ROOT / ".pre-commit-hooks.yaml").read_text(encoding="utf-8"))
    assert (hook["id"], hook["language"], hook["pass_filenames"]) == ("wavejob-check", "python", False)
    chosen = ["jobs/a.yml", "jobs/deep/_base.yaml", "jobs/a.csv", "other/a.yml"]
    assert [path for path in chosen if re.search(hook["files"], path)] == chosen[:2]
    program, *words = hook["entry"].split()
    assert program == "wavejob"
    (tree / "jobs").mkdir()
    command = [sys.executable, "-m", program, *words, *hook["args"]]
    for text, code in ((JOB, 0), (JOB.replace("points", "pionts"), 2)):
        (tree / "jobs" / "a.yml").write_text(text, encoding="utf-8")
        done = subprocess.run(command, cwd=tree, env=environment, capture_output=True, check=False, timeout=120)
        assert done.returncode == code
