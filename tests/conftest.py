"""What holds for every test: in continuous integration nothing is skipped."""

from __future__ import annotations

import os
from collections.abc import Generator
from typing import TypeVar

import pytest

IN_CI = os.environ.get("CI", "").lower() in ("1", "true", "yes")
Report = TypeVar("Report", pytest.TestReport, pytest.CollectReport)


def failed_if_skipped(report: Report) -> Report:
    """The report, with a skip turned into a failure; expected failures stay what they are."""
    if IN_CI and report.skipped and not hasattr(report, "wasxfail"):
        report.outcome = "failed"
        report.longrepr = f"skipped, but nothing may be skipped here: {report.longrepr}"
    return report


@pytest.hookimpl(wrapper=True)
def pytest_runtest_makereport() -> Generator[None, pytest.TestReport, pytest.TestReport]:
    return failed_if_skipped((yield))


@pytest.hookimpl(wrapper=True)
def pytest_make_collect_report() -> Generator[None, pytest.CollectReport, pytest.CollectReport]:
    return failed_if_skipped((yield))
