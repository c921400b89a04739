"""`wavejob compare`: runs, trees and baselines; the exit code tells a pipeline."""

from __future__ import annotations

import json
from pathlib import Path

import pytest

from tests.stored_runs import figure, runs_of, stored

from .conftest import Call

T = {"T.total": figure(0.1589, 0.0003), "norm.final": figure(1.0)}
T_NEAR = {"T.total": figure(0.1593, 0.0002), "norm.final": figure(1.0)}
T_FAR = {"T.total": figure(0.1602, 0.0003), "norm.final": figure(1.0)}
T_BARE = {"T.total": figure(0.1593), "norm.final": figure(1.0)}


@pytest.fixture
def runs(tree: Path) -> Path:
    return runs_of(tree)


@pytest.fixture
def others(tree: Path) -> Path:
    return runs_of(tree / "other")


def test_nothing_differs(call: Call, runs: Path, others: Path) -> None:
    stored(runs, "stack/a", "f1", T)
    stored(others, "stack/a", "f2", T_NEAR)
    found = call("compare", ".", "other")
    assert (found.code, found.out, found.err) == (0, "", "1 job compared: 2 same\n")


def test_a_difference_is_shown_with_what_the_bars_allow(call: Call, runs: Path, others: Path) -> None:
    stored(runs, "stack/a", "f1", T)
    stored(others, "stack/a", "f1", T_FAR)
    found = call("compare", "runs", "other/runs")
    assert found.code == 1
    assert found.out == (
        "stack/a\n  T.total  differs  0.1589 +- 0.0003 -> 0.1602 +- 0.0003, changed by 0.0013, bars allow 0.0006\n"
    )
    assert found.err == "1 job compared: 1 same, 1 differs\n"


def test_the_newest_finished_run_of_each_job_counts(call: Call, runs: Path, others: Path) -> None:
    stored(runs, "a", "f9", T_FAR, days=3)
    stored(runs, "a", "f1", T, days=1)
    stored(runs, "a", "f5", T_FAR, finished=False)
    stored(others, "a", "f1", T)
    assert call("compare", ".", "other").code == 0


def test_variants_are_compared_each_with_its_like(call: Call, runs: Path, others: Path) -> None:
    for name, results, fingerprint in (("2 nm", T, "f1"), ("3 nm", T_FAR, "f2"), ("9 nm", T, "f3")):
        stored(runs, "a", fingerprint, results, variant={"b2": name})
    (runs / "a" / "variants.csv").write_text("b2 [nm],T.total,fingerprint\n2,0.1,f1\n3,0.1,f2\n", encoding="utf-8")
    for name, results, fingerprint in (("2 nm", T_NEAR, "f1"), ("3 nm", T, "f2")):
        stored(others, "a", fingerprint, results, variant={"b2": name})
    found = call("compare", ".", "other")
    assert found.out.startswith("a (b2 = 3 nm)\n  T.total  differs")
    assert found.err == "2 jobs compared: 3 same, 1 differs\n"
    assert call("compare", "runs/a/f1", "runs/a/f3").out == ""  # named by itself, an earlier variant counts


def test_jobs_and_results_that_only_one_side_has(call: Call, runs: Path, others: Path) -> None:
    stored(runs, "gone", "f1", T)
    stored(runs, "kept", "f1", {"norm.final": figure(1.0), "old": figure(2.0, 0.1, "nm")})
    stored(others, "kept", "f1", {"norm.final": figure(1.0), "fresh": figure(3.0)})
    stored(others, "added", "f1", {})
    found = call("compare", ".", "other")
    assert found.code == 1
    assert found.out.splitlines() == [
        "added: appeared, with 0 results",
        "gone: vanished, with 2 results",
        "kept",
        "  old    vanished  2 +- 0.1 nm",
        "  fresh  appeared  3",
    ]
    assert found.err == "3 jobs compared: 1 same, 1 appeared, 3 vanished\n"


def test_undecided_counts_with_strict_only(call: Call, runs: Path, others: Path) -> None:
    stored(runs, "a", "f1", T)
    stored(others, "a", "f1", T_BARE)
    found = call("compare", ".", "other")
    assert found.code == 0
    assert found.out.endswith("0.1593, changed by 0.0004; no error bar after\n")
    assert call("compare", ".", "other", "--strict", "-q").code == 1


@pytest.mark.parametrize(("a", "b"), [("runs/a", "runs/b"), ("runs/a/f1", "runs/b"), ("runs/a/f1", "runs/b/f1")])
def test_two_jobs_named_by_themselves_are_compared(call: Call, runs: Path, a: str, b: str) -> None:
    stored(runs, "a", "f1", T)
    stored(runs, "b", "f1", T_FAR)
    found = call("compare", a, b)
    assert found.code == 1
    assert found.out.startswith("a -> b\n  T.total  differs")


def test_two_runs_of_one_job(call: Call, runs: Path) -> None:
    stored(runs, "a", "f1", T)
    stored(runs, "a", "f2", T_FAR)
    assert call("compare", "runs/a/f1", "runs/a/f2").out.startswith("a\n  T.total  differs")


@pytest.mark.parametrize(("a", "b"), [("runs/a", "other"), ("other", "runs/a")])
def test_one_job_by_itself_narrows_the_other_side(call: Call, runs: Path, others: Path, a: str, b: str) -> None:
    stored(runs, "a", "f1", T)
    stored(others, "a", "f1", T)
    stored(others, "b", "f1", T)
    assert call("compare", a, b).err == "1 job compared: 2 same\n"


def test_json_has_the_promised_form(call: Call, runs: Path, others: Path) -> None:
    stored(runs, "a", "f1", T)
    folder = stored(others, "a", "f2", T_FAR, verdict="doubtful")
    found = call("compare", ".", "other", "--format", "json", "-q")
    assert (found.code, found.err) == (1, "")
    document = json.loads(found.out)
    assert list(document) == ["format", "command", "problems", "jobs", "results"]
    assert document["jobs"] == [
        {
            "job": "a", "fingerprint": "f2", "folder": folder.relative_to(Path.cwd()).as_posix(),
            "status": "differs", "verdict": "doubtful", "forecast": None,
        }
    ]  # fmt: skip
    first = document["results"][0]
    assert first["difference"] == pytest.approx(0.0013)
    assert first["allowed"] == pytest.approx(0.0006)
    assert first | {"difference": 0, "allowed": 0} == {
        "job": "a", "result": "T.total", "outcome": "differs", "difference": 0, "allowed": 0, "reason": "",
        "before": {"value": 0.1589, "error": 0.0003, "unit": ""},
        "after": {"value": 0.1602, "error": 0.0003, "unit": ""},
    }  # fmt: skip


def test_a_baseline_is_written_and_compared_with(call: Call, tree: Path, runs: Path) -> None:
    stored(runs, "b", "f1", T, verdict="doubtful")
    stored(runs, "a", "f1", T)
    found = call("compare", ".", "--write-baseline", "baseline.json")
    assert (found.code, found.out) == (0, "")
    assert found.err == "baseline.json: 4 results of 2 jobs\nwarning: not trusted: b\n"
    assert list(json.loads((tree / "baseline.json").read_text(encoding="utf-8"))["jobs"]) == ["a", "b"]
    assert call("compare", "baseline.json", ".").code == 0
    stored(runs, "a", "f2", T_FAR, days=-1)
    assert call("compare", "baseline.json", ".").code == 1
    assert call("compare", ".", "--write-baseline", "baseline.json").code == 0
    assert call("compare", "baseline.json", ".").code == 0


def test_a_baseline_says_the_same_for_the_same_figures(call: Call, tree: Path, runs: Path, others: Path) -> None:
    stored(runs, "a", "f1", T, days=5)
    stored(others, "a", "f1", T)
    call("compare", ".", "--write-baseline", "one.json")
    call("compare", "other", "--write-baseline", "two.json", "--format", "json")
    assert (tree / "one.json").read_bytes() == (tree / "two.json").read_bytes()


MADE = "make one with `wavejob compare DIR --write-baseline FILE`"


@pytest.mark.parametrize(
    ("text", "said"),
    [
        ("nonsense", "Invalid JSON: expected ident at line 1 column 2"),
        ("[" * 5000, "Invalid JSON: recursion limit exceeded at line 1 column 202"),
        ("[]", "Input should be an object"),
        ('{"format": 1}', "jobs: Field required"),
        (
            '{"format": 1, "jobs": {"a": {"fingerprint": "f", "verdict": "trusted", "results": '
            '{"T": {"value": NaN, "error": null, "unit": ""}}}}}',
            "jobs.a.results.T.value: Input should be a finite number",
        ),
        (
            '{"format": 1, "jobs": {"a": {"fingerprint": "f", "verdict": "trusted", "results": '
            '{"T": {"value": 1, "error": -1, "unit": ""}}}}}',
            "jobs.a.results.T.error: Input should be greater than or equal to 0",
        ),
    ],
)  # fmt: skip
def test_a_wrong_baseline_is_a_mistake(call: Call, tree: Path, runs: Path, text: str, said: str) -> None:
    stored(runs, "a", "f1", T)
    (tree / "b.json").write_text(text, encoding="utf-8")
    found = call("compare", "b.json", ".")
    assert (found.code, found.out, found.err) == (2, "", f"b.json: is no baseline ({said}); {MADE}\n")


def test_a_newer_baseline_is_refused(call: Call, tree: Path, runs: Path) -> None:
    stored(runs, "a", "f1", T)
    (tree / "b.json").write_text('{"format": 2, "jobs": {}}', encoding="utf-8")
    assert call("compare", "b.json", ".").err == "b.json: has format 2, newer than 1; use a newer wavejob\n"


def test_another_file_is_not_written_over(call: Call, tree: Path, runs: Path) -> None:
    stored(runs, "a", "f1", T)
    (tree / "data.json").write_text("{}", encoding="utf-8")
    assert call("compare", ".", "--write-baseline", "data.json").code == 2
    assert (tree / "data.json").read_text(encoding="utf-8") == "{}"


@pytest.mark.parametrize(
    ("line", "said"),
    [
        ("", "wavejob compare: takes two names, and got nothing; name two runs, run trees or baseline files"),
        ("a", "wavejob compare: takes two names, and got 1 name; name two runs, run trees or baseline files"),
        (
            "nope .",
            "nope: there is no such file or folder; name two runs, run trees or baseline files\n"
            ".: holds no finished run; name a folder below `runs/`, or a job tree that was run",
        ),
        ("a\0b a\0b", "a\0b: there is no such file or folder; name two runs, run trees or baseline files"),
        ("a b --write-baseline b.json", "wavejob compare: `--write-baseline` takes the figures of one name; "
         "name one run or run tree"),
        (". --write-baseline job.yml", "wavejob compare: `job.yml` does not end in .json; write e.g. `baseline.json`"),
        (". --write-baseline no/b.json", "wavejob compare: there is no folder `no`; make it first"),
    ],
)  # fmt: skip
def test_mistakes_in_what_is_named(call: Call, line: str, said: str) -> None:
    found = call("compare", *line.split(" ") if line else [])
    assert (found.code, found.out, sorted(found.err.splitlines())) == (2, "", sorted(said.splitlines()))


def test_damaged_figures_are_told(call: Call, runs: Path) -> None:
    folder = stored(runs, "a", "f1", T)
    (folder / "results.json").write_text('{"results": 3}', encoding="utf-8")
    found = call("compare", "runs/a", "runs/a")
    assert found.code == 2
    assert found.err == (
        "runs/a/f1/results.json: holds no figures (fingerprint: Field required); run its job again with --again\n"
    )


def test_a_run_compared_with_itself_is_the_same(call: Call) -> None:
    """What a run leaves, not what a test lays there: bars are off in this job, and equal values are the same."""
    assert call("run", "job.yml", "-q").code == 0
    found = call("compare", ".", "runs/job")
    assert (found.code, found.out) == (0, "")
    assert found.err == "1 job compared: 6 same\n"
