"""JUnit XML of a batch, as code hosts read it: a case for each job, a failure or an error where it did not do well.

There is no standard but what readers agree on: `testsuites/testsuite/testcase`, with `failure` for what was found
to be wrong, `error` for what could not be found out, `skipped` for what was not tried, and named `property`s.
"""

from __future__ import annotations

import re
import xml.etree.ElementTree as ET
from collections.abc import Sequence
from dataclasses import dataclass
from datetime import datetime
from pathlib import Path

from .files import atomic
from .log import utc

# All that XML 1.0 (section 2.2) has no way to write, not even as a reference.
NO_CHARACTER = re.compile("[^\t\n\r\u0020-\ud7ff\ue000-\ufffd\U00010000-\U0010ffff]")
ESCAPES = re.compile("\x1b\\[[0-?]*[ -/]*[@-~]")  # colours and the like, ECMA-48 control sequences
SUITE = "wavejob"


@dataclass(frozen=True)
class Assertion:
    """One expectation or check of a job; `outcome` in a word, and the whole judgement as `text`."""

    name: str
    outcome: str
    text: str
    failed: bool


@dataclass(frozen=True)
class Case:
    """A job: what it asserts, or why it could not (`error`) or was not (`skipped`) carried out; or a wrong file."""

    name: str
    file: str
    seconds: float = 0.0
    assertions: tuple[Assertion, ...] = ()
    error: str = ""
    skipped: str = ""

    @property
    def failures(self) -> list[Assertion]:
        return [assertion for assertion in self.assertions if assertion.failed]


def write_junit(path: Path, cases: Sequence[Case], started: datetime) -> None:
    """Writes `path` with a case for each of `cases`. Raises RunError where it can't be written."""
    counts = {
        "tests": str(len(cases)),
        "failures": str(sum(bool(case.failures) for case in cases)),
        "errors": str(sum(bool(case.error) for case in cases)),
        "skipped": str(sum(bool(case.skipped) for case in cases)),
        "assertions": str(sum(len(case.assertions) for case in cases)),
        "time": f"{sum(case.seconds for case in cases):.3f}",
    }
    top = ET.Element("testsuites", {"name": SUITE, **counts})
    suite = ET.SubElement(top, "testsuite", {"name": SUITE, "timestamp": utc(started), **counts})
    for case in cases:
        _add(suite, case)
    ET.indent(top)
    with atomic(path, "wb") as file:
        ET.ElementTree(top).write(file, encoding="utf-8", xml_declaration=True)
        file.write(b"\n")


def _add(suite: ET.Element, case: Case) -> None:
    folder, _, name = case.name.rpartition("/")
    element = ET.SubElement(
        suite,
        "testcase",
        classname=_clean(folder.replace("/", ".") or SUITE),
        name=_clean(name),
        file=_clean(case.file),
        time=f"{case.seconds:.3f}",
        assertions=str(len(case.assertions)),
    )
    if case.assertions:
        properties = ET.SubElement(element, "properties")
        for one in case.assertions:
            ET.SubElement(properties, "property", name=_clean(one.name), value=_clean(f"{one.outcome}: {one.text}"))
    if case.error:
        _told(element, "error", case.error.splitlines()[0], case.error)
    elif case.skipped:
        ET.SubElement(element, "skipped", message=_clean(case.skipped))
    elif case.failures:
        listed = [f"{one.name}, {one.outcome}: {one.text}" for one in case.failures]
        more = f" (and {len(listed) - 1} more)" if len(listed) > 1 else ""
        _told(element, "failure", listed[0] + more, "\n".join(listed))


def _told(element: ET.Element, kind: str, message: str, text: str) -> None:
    ET.SubElement(element, kind, message=_clean(message), type=kind).text = _clean(text)


def _clean(text: str) -> str:
    """`text` without control sequences and characters that no XML may hold."""
    return NO_CHARACTER.sub("", ESCAPES.sub("", text))
