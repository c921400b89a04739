"""run.log has UTC times (ISO 8601), and its file is closed when the run ends."""

from __future__ import annotations

import logging
import re
from datetime import UTC, datetime, timedelta
from pathlib import Path

import pytest

from wavejob.outputs.log import run_log
from wavejob.problems import RunError


def test_lines_carry_utc_times(tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("TZ", "Asia/Kolkata")
    with run_log(tmp_path / "run.log") as log:
        log.info("begun")
        logging.getLogger("wavejob.evolve").warning("µ")
    first, second = (tmp_path / "run.log").read_text(encoding="utf-8").splitlines()
    time, level, message = first.split(" ", 2)
    assert re.fullmatch(r"\d{4}-\d\d-\d\dT\d\d:\d\d:\d\d\.\d{3}Z", time)
    assert abs(datetime.fromisoformat(time) - datetime.now(UTC)) < timedelta(minutes=1)
    assert (level, message) == ("INFO", "begun")
    assert second.endswith("WARNING µ")


def test_the_file_is_closed_also_after_an_error(tmp_path: Path) -> None:
    logger = logging.getLogger("wavejob")
    before = (logger.level, list(logger.handlers))
    with pytest.raises(ZeroDivisionError), run_log(tmp_path / "run.log"):  # noqa: PT012 the handler is needed
        handler = logger.handlers[-1]
        raise ZeroDivisionError
    assert (logger.level, logger.handlers) == before
    assert isinstance(handler, logging.FileHandler)
    assert handler.stream is None


def test_a_resumed_run_goes_on_in_the_same_log(tmp_path: Path) -> None:
    for word in ("first", "second"):
        with run_log(tmp_path / "run.log") as log:
            log.info(word)
    lines = (tmp_path / "run.log").read_text().splitlines()
    assert [line.split()[-1] for line in lines] == ["first", "second"]


def test_a_full_disk_stops_the_run() -> None:
    """`/dev/full` refuses every write with "no space left" (Linux, full(4))."""
    with pytest.raises(RunError, match="could not write `/dev/full`: the disk is full"):  # noqa: SIM117
        with run_log(Path("/dev/full")) as log:
            log.info("x")


def test_no_folder_is_explained(tmp_path: Path) -> None:
    with pytest.raises(RunError, match="its folder is gone"), run_log(tmp_path / "gone" / "run.log"):
        pass
