"""What the program is joined to: closed pipes, full disks, poor encodings, signals; what it must not load."""

from __future__ import annotations

import os
import pty
import signal
import subprocess
import sys
import time
from pathlib import Path

import pytest

from .conftest import JOB, Call

LATE = ("pyfftw", "matplotlib", "rich", "h5netcdf", "h5py", "numba", "xarray", "pandas", "psutil")
LONG = JOB.replace("until: 2", "until: 2e5").replace("record: 0.1", "record: 100")


@pytest.mark.parametrize(
    "words", [["--help"], ["--version"], ["check", "job.yml"], ["explain", "points"], ["explain"], ["schema"]]
)
def test_what_is_not_needed_is_not_loaded(environment: dict[str, str], words: list[str]) -> None:
    """Start-up time is theirs: pyfftw alone takes longer than all the rest together."""
    shown = "print(*sys.modules, file=sys.stderr)"
    script = f"import sys; from wavejob.cli import main; code = main({words}); {shown}; sys.exit(code)"
    done = subprocess.run([sys.executable, "-c", script], capture_output=True, text=True, env=environment, check=True)
    loaded = done.stderr.split()
    assert [name for name in loaded if name.split(".")[0] in LATE] == []
    parts = {name for name in loaded if name.startswith("scipy.") and name.count(".") == 1}
    assert not {"scipy.fft", "scipy.linalg", "scipy.sparse", "scipy.interpolate", "scipy.special"} & parts


def test_help_loads_no_numpy(environment: dict[str, str]) -> None:
    script = "import sys; from wavejob.cli import main; main(['--help']); sys.exit('numpy' in sys.modules)"
    assert (
        subprocess.run([sys.executable, "-c", script], capture_output=True, env=environment, check=False).returncode
        == 0
    )


def test_a_reader_that_goes_away_ends_the_output_only(tree: Path, environment: dict[str, str]) -> None:
    reading, writing = os.pipe()
    os.close(reading)
    with os.fdopen(writing, "wb") as pipe:
        done = subprocess.run(
            [sys.executable, "-m", "wavejob", "run", "job.yml", "-q"],
            stdout=pipe,
            stderr=subprocess.PIPE,
            env=environment,
            check=False,
        )
    assert (done.returncode, done.stderr) == (0, b"")
    assert list(tree.glob("runs/job/*/manifest.json"))


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="no such device")
def test_a_full_disk_is_told(environment: dict[str, str]) -> None:
    with open("/dev/full", "wb") as full:
        done = subprocess.run(
            [sys.executable, "-m", "wavejob", "explain"],
            stdout=full,
            stderr=subprocess.PIPE,
            env=environment,
            check=False,
        )
    assert done.returncode == 1
    assert done.stderr == b"could not write to standard output: No space left on device; send it elsewhere\n"


@pytest.mark.parametrize("closed", ["1>&-", "2>&-", "1>&- 2>&-"])
def test_closed_streams_change_no_exit_code(environment: dict[str, str], closed: str) -> None:
    line = f"{sys.executable} -m wavejob check nope.yml {closed}"
    assert subprocess.run(line, shell=True, env=environment, check=False, capture_output=True).returncode == 2


def test_letters_beyond_the_encoding_are_escaped(process: Call, tree: Path) -> None:
    (tree / "job.yml").write_text(JOB + "job: na\u00efve \u03c8\n", encoding="utf-8")
    found = process("check", "job.yml", PYTHONIOENCODING="ascii")
    assert found.code == 0
    assert found.out.startswith("job: na\\xefve \\u03c8\n")
    found = process("check", "job.yml", LC_ALL="C", PYTHONUTF8="0", PYTHONCOERCECLOCALE="0")
    assert found.code == 0


def test_a_name_that_is_no_text_is_a_mistake(environment: dict[str, str]) -> None:
    done = subprocess.run(
        [sys.executable.encode(), b"-m", b"wavejob", b"check", b"b\xe9.yml"],
        capture_output=True,
        env=environment | {"PYTHONIOENCODING": "ascii"},
        check=False,
    )
    assert done.returncode == 2
    assert b"Traceback" not in done.stderr


@pytest.mark.parametrize(("number", "code"), [(signal.SIGINT, 130), (signal.SIGTERM, 143)])
def test_signals_end_a_run_politely(tree: Path, environment: dict[str, str], number: int, code: int) -> None:
    """The codes are those that shells give, 128 and the number of the signal."""
    (tree / "job.yml").write_text(LONG, encoding="utf-8")
    command = [sys.executable, "-m", "wavejob", "run", "job.yml"]
    with subprocess.Popen(command, stderr=subprocess.PIPE, text=True, env=environment) as running:
        assert running.stderr is not None
        running.stderr.readline()  # it has started
        for _ in range(200):
            if list(tree.glob("runs/job/*/run.log")):
                break
            time.sleep(0.1)
        running.send_signal(number)
        rest = running.stderr.read()
    assert running.returncode == code
    assert rest == "stopped: 0 jobs of 1 finished and kept; job was cut short and starts anew next time\n"
    assert not list(tree.glob("runs/job/*/manifest.json"))


@pytest.mark.parametrize(("terminal", "colour"), [("xterm", True), ("xterm", False), ("dumb", True)])
def test_a_terminal_gets_a_bar_where_it_can_draw_one(
    tree: Path, environment: dict[str, str], terminal: str, colour: bool
) -> None:
    """NO_COLOR takes colour away and nothing else (no-color.org); a dumb terminal gets plain lines."""
    (tree / "job.yml").write_text(LONG.replace("until: 2e5", "until: 400"), encoding="utf-8")
    settings = environment | {"TERM": terminal, "COLUMNS": "80", "LINES": "24"} | ({} if colour else {"NO_COLOR": "1"})
    master, slave = pty.openpty()
    with subprocess.Popen(
        [sys.executable, "-m", "wavejob", "run", "job.yml"], stdout=slave, stderr=slave, env=settings
    ) as running:
        os.close(slave)
        seen = b""
        while True:
            try:
                piece = os.read(master, 65536)
            except OSError:  # the other end is closed
                break
            if not piece:
                break
            seen += piece
    os.close(master)
    text = seen.decode()
    assert running.returncode == 0
    assert ("\u2501" in text) == (terminal != "dumb")
    assert ("\x1b[38;" in text or "\x1b[3" in text.replace("\x1b[3A", "")) == (terminal != "dumb" and colour)
    assert "norm.final" in text
