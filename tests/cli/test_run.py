"""`wavejob run`: results on standard output, all else on standard error; one failure stops nobody else."""

from __future__ import annotations

import json
import re
from importlib import import_module
from pathlib import Path

import pytest

from wavejob.cli.progress import SPARSE, Lines
from wavejob.cli.stopping import Terminated
from wavejob.loading import parse
from wavejob.problems import RunError
from wavejob.simulate import Progress

from .conftest import JOB, Call

RUN = import_module("wavejob.run")  # `import wavejob.run` would give the function of that name
FAILS = JOB + "expect: [{result: through.total, above: 2}]\n"
UTC = re.compile(r"^\d{4}-\d\d-\d\dT\d\d:\d\d:\d\dZ ")


def test_results_go_to_standard_output_and_the_rest_to_the_other(call: Call, tree: Path) -> None:
    found = call("run", "job.yml")
    assert found.code == 0
    lines = found.out.splitlines()
    assert lines[0] == "job"
    assert re.search(r"^  norm\.final +1 +probability on the grid at the end$", found.out, re.MULTILINE)
    assert re.fullmatch(r"  (trusted|doubtful), in runs/job/[0-9a-f]{10}", lines[-2])
    assert all(UTC.match(line) for line in found.err.splitlines())
    (folder,) = (tree / "runs" / "job").iterdir()
    assert (folder / "manifest.json").is_file()


def test_what_is_there_already_is_not_computed_again(call: Call, tree: Path) -> None:
    first = call("run", "job.yml", "-q")
    manifest = next(tree.glob("runs/job/*/manifest.json"))
    written = manifest.stat().st_mtime_ns
    again = call("run", "job.yml")
    assert again.out == first.out
    assert "job: up to date" in again.err
    assert manifest.stat().st_mtime_ns == written
    assert call("run", "job.yml", "--again", "-q").out == first.out
    assert manifest.stat().st_mtime_ns > written


def test_quiet_says_nothing(call: Call) -> None:
    assert call("run", "job.yml", "-q").err == ""


def test_an_expectation_that_is_missed_exits_with_1(call: Call, tree: Path) -> None:
    (tree / "job.yml").write_text(FAILS, encoding="utf-8")
    found = call("run", "job.yml")
    assert found.code == 1
    assert "expected, missed: through.total is" in found.out
    assert "failed, in runs/job/" in found.out
    assert call("run", "job.yml").code == 1


def test_a_mistake_anywhere_starts_nothing(call: Call, tree: Path) -> None:
    (tree / "bad.yml").write_text(JOB.replace("points", "pionts"), encoding="utf-8")
    found = call("run", ".")
    assert (found.code, found.out) == (2, "")
    assert found.err.endswith("2 job files read: 1 mistake; nothing was started\n")
    assert not (tree / "runs").exists()


def test_the_urgent_job_runs_first_and_a_failure_stops_no_other(
    call: Call, tree: Path, monkeypatch: pytest.MonkeyPatch
) -> None:
    (tree / "urgent.yml").write_text(JOB + "priority: 5\n", encoding="utf-8")
    (tree / "another.yml").write_text(JOB, encoding="utf-8")
    through = RUN.run_job
    begun = []

    def run_job(job: object, *rest: object, **more: object) -> object:
        begun.append(job.id)  # type: ignore[attr-defined]
        if job.id == "urgent":  # type: ignore[attr-defined]
            raise RunError("the disk is full", "make room")
        return through(job, *rest, **more)

    monkeypatch.setattr(RUN, "run_job", run_job)
    found = call("run", ".", "--workers", "1", "--format", "json")
    assert begun == ["urgent", "another", "job"]
    assert found.code == 1
    jobs = json.loads(found.out)["jobs"]
    assert [(job["job"], job["status"]) for job in jobs] == [
        ("urgent", "failed"), ("another", "done"), ("job", "done"),
    ]  # fmt: skip
    assert "urgent: the disk is full; make room" in found.err
    assert found.err.endswith("1 failed\n")


def test_an_error_of_our_own_is_one_line_and_a_file(call: Call, tree: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def run_job(*_: object, **__: object) -> None:
        raise ZeroDivisionError("oh")

    monkeypatch.setattr(RUN, "run_job", run_job)
    found = call("run", "job.yml", "-q")
    (log,) = (tree / ".cache").glob("error-*.log")
    assert found.code == 1
    assert found.err.count("\n") == 1
    assert "ZeroDivisionError: oh" in found.err
    assert str(log) in found.err
    assert "Traceback" in log.read_text(encoding="utf-8")
    assert "Traceback" in call("run", "job.yml", "-v").err


@pytest.mark.parametrize(("stop", "code"), [(KeyboardInterrupt, 130), (Terminated, 143)])
def test_when_stopped_it_says_what_is_kept(
    call: Call, tree: Path, monkeypatch: pytest.MonkeyPatch, stop: type[BaseException], code: int
) -> None:
    """Exit codes as shells give them: 128 and the number of the signal."""
    (tree / "first.yml").write_text(JOB + "priority: 1\n", encoding="utf-8")
    through = RUN.run_job

    def run_job(job: object, *rest: object, **more: object) -> object:
        if job.id == "job":  # type: ignore[attr-defined]
            raise stop
        return through(job, *rest, **more)

    monkeypatch.setattr(RUN, "run_job", run_job)
    found = call("run", ".", "-q", "--workers", "1")
    assert found.code == code
    assert found.err == "stopped: 1 job of 2 finished and kept; job was cut short and starts anew next time\n"
    assert found.out.startswith("first\n")


def test_runs_go_where_they_are_wanted(call: Call, tree: Path) -> None:
    assert call("run", "job.yml", "--runs", "elsewhere", "-q").code == 0
    assert list(tree.glob("elsewhere/job/*/manifest.json"))
    assert not (tree / "runs").exists()
    found = call("run", "job.yml", "--runs", "job.yml", "-q")
    assert (found.code, found.err) == (
        2, "job.yml: is no folder, but runs need one; choose one with --runs DIR\n",
    )  # fmt: skip


def test_two_trees_that_would_share_a_folder_are_refused(call: Call, tree: Path) -> None:
    for name in ("a", "b"):
        (tree / name).mkdir()
        (tree / name / "same.yml").write_text(JOB, encoding="utf-8")
    found = call("run", "a", "b", "--runs", "kept", "-q")
    assert found.code == 2
    assert found.err.startswith("b/same.yml: has the same job id as `a/same.yml`: `same`;")


def test_strict_counts_doubts(call: Call, tree: Path) -> None:
    (tree / "job.yml").write_text(JOB.replace("edges: {x: wrap}", "edges: {x: {absorb: 2}}"), encoding="utf-8")
    assert call("run", "job.yml", "-q").code == 0
    assert call("run", "job.yml", "-q", "--strict").code == 1


def test_a_log_gets_a_line_a_minute(capsys: pytest.CaptureFixture[str]) -> None:
    now = [0.0]
    lines = Lines(parse(JOB), clock=lambda: now[0])
    for step in range(1, 101):
        now[0] += SPARSE / 40
        lines.step(Progress(step, 100, 0.02 * step, 1.0, (("through", 0.25),)))
    said = capsys.readouterr().err.splitlines()
    assert [UTC.sub("", line) for line in said] == [
        "job: 40%, t = 0.8, norm 1, through 0.25, 1.5 min left",
        "job: 80%, t = 1.6, norm 1, through 0.25, 30 s left",
    ]


def test_what_quick_left_out_is_made_by_a_full_run(call: Call, tree: Path) -> None:
    text = JOB.replace("error_bars: none\n", "").replace("film: none", "film: {every: 1}")
    (tree / "job.yml").write_text(text, encoding="utf-8")

    def made() -> tuple[list[str], bool, bool]:
        folder = next(tree.glob("runs/job/*"))
        left_out = json.loads((folder / "manifest.json").read_text())["partial"]
        result = json.loads((folder / "results.json").read_text())["results"]["norm.final"]
        return left_out, result["error"] is not None, (folder / "film.mp4").is_file()

    assert call("run", "job.yml", "--quick", "--no-film", "-q").code == 0
    assert made() == (["error_bars", "film"], False, False)
    assert call("run", "job.yml", "--no-film", "-q").code == 0
    assert made() == (["film"], True, False)
    assert call("run", "job.yml", "-q").code == 0
    assert made() == ([], True, True)
    (tree / "job.yml").write_text(text + "job: Another title\n", encoding="utf-8")
    assert call("run", "job.yml", "--quick", "-q").code == 0  # draws again, and keeps what there was
    assert made() == ([], True, True)


def test_an_expectation_in_a_base_is_judged_again(call: Call, tree: Path) -> None:
    (tree / "_base.yml").write_text(JOB, encoding="utf-8")
    (tree / "job.yml").write_text("based_on: _base.yml\n", encoding="utf-8")
    assert call("run", "job.yml", "-q").code == 0
    (tree / "_base.yml").write_text(FAILS, encoding="utf-8")
    found = call("run", "job.yml")
    assert (found.code, "job: up to date" in found.err) == (1, True)
    assert "expected, missed: through.total is" in found.out
    folder = next(tree.glob("runs/job/*"))
    listed = json.loads((folder / "manifest.json").read_text())["outputs"]["results.json"]
    assert listed["bytes"] == (folder / "results.json").stat().st_size


def test_damaged_results_are_made_anew(call: Call, tree: Path) -> None:
    first = call("run", "job.yml", "-q")
    results = next(tree.glob("runs/job/*/results.json"))
    results.write_text('{"job":', encoding="utf-8")
    assert call("run", "job.yml", "-q").out == first.out
    results.unlink()
    assert call("run", "job.yml", "-q").out == first.out


def test_other_error_bars_are_another_run(call: Call, tree: Path) -> None:
    """The fingerprint is of all that decides the figures, and an error belongs to a figure."""
    call("run", "job.yml", "-q")
    (tree / "job.yml").write_text(JOB.replace("error_bars: none", "error_bars: {grid: no}"), encoding="utf-8")
    call("run", "job.yml", "-q")
    assert len(list(tree.glob("runs/job/*"))) == 2


def test_a_missing_encoder_is_missed_before_the_work(call: Call, tree: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    (tree / "job.yml").write_text(JOB.replace("film: none", "film: {every: 1}"), encoding="utf-8")
    call("run", "job.yml", "-q", "--no-film")
    monkeypatch.setenv("IMAGEIO_FFMPEG_EXE", "/nowhere/ffmpeg")
    found = call("run", "job.yml", "-q")
    assert found.code == 1
    assert "the video encoder `/nowhere/ffmpeg` is missing; `pip install imageio-ffmpeg`" in found.err
    assert next(tree.glob("runs/job/*/manifest.json")).is_file()  # what was there stands


VARIED = JOB + "vary: [{packet.gaussian.wavenumber: [1, 2]}]\nexpect: [{result: through.total, above: 0}]\n"


def test_variants_are_shown_side_by_side(call: Call, tree: Path) -> None:
    (tree / "job.yml").write_text(VARIED, encoding="utf-8")
    found = call("run", "job.yml", "--workers", "1")
    lines = found.out.splitlines()
    assert found.code == 0
    assert lines[1].split() == ["packet.gaussian.wavenumber", "through.total", "verdict"]
    assert [line.split()[0] for line in lines[2:4]] == ["1", "2"]
    assert re.fullmatch(
        r"  2 variants: 2 (trusted|doubtful), in runs/job: variants.csv, variants_through.total.png", lines[4]
    )
    assert "job (packet.gaussian.wavenumber = 2): done, " in found.err
    assert (tree / "runs" / "job" / "variants.csv").is_file()
    checked = call("check", "job.yml", "--format", "json")
    assert [job["variant"] for job in json.loads(checked.out)["jobs"]] == [
        {"packet.gaussian.wavenumber": "1"}, {"packet.gaussian.wavenumber": "2"},
    ]  # fmt: skip


def test_workers_do_the_same_as_one_process(call: Call, tree: Path) -> None:
    """Values of variants that ran at once are, to the bit, those of variants that ran one after another."""
    (tree / "job.yml").write_text(VARIED.replace("step:", "reproducible: yes, step:"), encoding="utf-8")
    (tree / "other.yml").write_text(JOB, encoding="utf-8")
    at_once = call("run", ".", "--workers", "2", "--runs", "a")
    assert at_once.code == 0
    assert call("run", ".", "--workers", "1", "--runs", "b", "-q").code == 0
    tables = [(tree / name / "job" / "variants.csv").read_text(encoding="utf-8") for name in "ab"]
    assert tables[0] == tables[1]
    status = json.loads((tree / "a" / "status.json").read_text(encoding="utf-8"))
    assert (status["state"], status["jobs"], status["done"]) == ("finished", 3, 3)
    assert at_once.err.count(": done, ") == 3
    again = call("run", ".", "--workers", "2", "--runs", "a")
    assert again.err.count(": up to date, ") == 3


def test_a_worker_that_fails_is_told_with_its_reason(call: Call, tree: Path) -> None:
    (tree / "other.yml").write_text(JOB, encoding="utf-8")
    assert call("run", "other.yml", "-q").code == 0
    (folder,) = (tree / "runs" / "other").iterdir()
    (folder / ".job").write_text('{"job": "another", "fingerprint": "0"}', encoding="utf-8")
    (folder / "manifest.json").unlink()
    found = call("run", ".", "--workers", "2")
    assert found.code == 1
    assert "other: `" in found.err
    assert "belongs to job `another`" in found.err
    assert found.out.startswith("job\n")
    status = json.loads((tree / "runs" / "status.json").read_text(encoding="utf-8"))
    assert [one["job"] for one in status["failed"]] == ["other"]


def test_bad_files_are_skipped_where_that_is_asked_for(call: Call, tree: Path) -> None:
    (tree / "bad.yml").write_text(JOB.replace("points", "pionts"), encoding="utf-8")
    (tree / "far.yml").write_text(JOB.replace("wavenumber: 1", "wavenumber: 10.5"), encoding="utf-8")
    found = call("run", ".", "--skip-bad")
    assert found.code == 1
    assert "unknown key `pionts`" in found.err
    assert found.out.startswith("job\n")
    assert [path.name for path in (tree / "runs").iterdir() if path.is_dir()] == ["job"]
