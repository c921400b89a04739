"""JUnit XML as common readers take it (common practice); its characters are those of XML 1.0, section 2.2."""

from __future__ import annotations

import xml.etree.ElementTree as ET
from datetime import UTC, datetime
from pathlib import Path

import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavejob.outputs.junit import Assertion, Case, write_junit
from wavejob.problems import RunError

STARTED = datetime(2026, 6, 1, 12, 0, 0, tzinfo=UTC)
MET = Assertion("expect T.total", "met", "T.total is 0.5", failed=False)
MISSED = Assertion("expect R.total", "missed", "R.total is 0.5", failed=True)
UNDECIDED = Assertion("expect norm.final", "undecided", "norm.final is 1", failed=True)


def written(path: Path, *cases: Case) -> ET.Element:
    write_junit(path / "jobs.xml", cases, STARTED)
    return ET.parse(path / "jobs.xml").getroot()


def test_every_job_is_a_case_with_named_assertions(tmp_path: Path) -> None:
    top = written(
        tmp_path,
        Case("stack/deep/good", "stack/deep/good.yml", 1.25, (MET,)),
        Case("bad", "bad.yml", 2.5, (MET, MISSED, UNDECIDED)),
        Case("broken", "broken.yml", 0.25, error="the disk is full\nmake room"),
        Case("later", "later.yml", skipped="not started"),
    )
    counts = {"tests": "4", "failures": "1", "errors": "1", "skipped": "1", "assertions": "4", "time": "4.000"}
    assert top.tag == "testsuites"
    assert top.attrib == {"name": "wavejob", **counts}
    (suite,) = top
    assert suite.attrib == {"name": "wavejob", "timestamp": "2026-06-01T12:00:00.000Z", **counts}
    good, bad, broken, later = suite
    assert good.attrib == {
        "classname": "stack.deep", "name": "good", "file": "stack/deep/good.yml", "time": "1.250", "assertions": "1",
    }  # fmt: skip
    assert [child.tag for child in good] == ["properties"]
    assert [p.attrib for p in good[0]] == [{"name": "expect T.total", "value": "met: T.total is 0.5"}]
    failure = bad.find("failure")
    assert failure is not None
    assert failure.attrib["message"] == "expect R.total, missed: R.total is 0.5 (and 1 more)"
    assert (failure.text or "").splitlines() == [
        "expect R.total, missed: R.total is 0.5", "expect norm.final, undecided: norm.final is 1",
    ]  # fmt: skip
    error = broken.find("error")
    assert error is not None
    assert (error.attrib["message"], error.text) == ("the disk is full", "the disk is full\nmake room")
    assert [(child.tag, child.attrib) for child in later] == [("skipped", {"message": "not started"})]


@given(st.text(st.characters()))
def test_any_text_can_be_read_back(tmp_path_factory: pytest.TempPathFactory, text: str) -> None:
    folder = tmp_path_factory.mktemp("junit")
    case = Case(f"a/{text}", text, assertions=(Assertion(text, "missed", text, failed=True),))
    (failure,) = written(folder, case).iter("failure")
    kept = "".join(
        c for c in text if c in "\t\n\r" or " " <= c <= "\ud7ff" or "\ue000" <= c <= "\ufffd" or c > "\uffff"
    )
    if kept == text:  # line ends are read as XML has it
        said = f"{text}, missed: {text}".replace("\r\n", "\n").replace("\r", "\n")
        assert failure.text == said


def test_colours_of_terminals_are_left_out(tmp_path: Path) -> None:
    (error,) = written(tmp_path, Case("a", "a.yml", error="\x1b[1;31mred\x1b[0m \x00end")).iter("error")
    assert (error.attrib["message"], error.text) == ("red end", "red end")


def test_a_file_that_cannot_be_written_is_told(tmp_path: Path) -> None:
    with pytest.raises(RunError, match=r"could not write .*jobs\.xml"):
        write_junit(tmp_path / "nowhere" / "jobs.xml", [], STARTED)
