"""Files are whole or absent, whatever happens while they are written (common practice)."""

from __future__ import annotations

import errno
import os
import resource
import signal
import stat
import subprocess
import sys
import textwrap
from pathlib import Path

import pytest

from wavejob.outputs.files import atomic, atomic_path, unwritable
from wavejob.problems import RunError


def test_text_is_utf8_with_plain_line_ends(tmp_path: Path) -> None:
    with atomic(tmp_path / "a.csv") as file:
        file.write("µ\nx\n")
    assert (tmp_path / "a.csv").read_bytes() == "µ\nx\n".encode()


@pytest.mark.parametrize("error", [KeyboardInterrupt, ValueError, MemoryError])
def test_an_error_leaves_the_old_file_and_nothing_else(tmp_path: Path, error: type[BaseException]) -> None:
    target = tmp_path / "a.bin"
    target.write_bytes(b"old")
    with pytest.raises(error), atomic(target, "wb") as file:  # noqa: PT012 the write is part of it
        file.write(b"half of the new")
        raise error
    assert target.read_bytes() == b"old"
    assert os.listdir(tmp_path) == ["a.bin"]


def test_target_is_not_there_before_the_end(tmp_path: Path) -> None:
    with atomic(tmp_path / "a.csv") as file:
        file.write("x\n")
        file.flush()
        assert not (tmp_path / "a.csv").exists()
    assert os.listdir(tmp_path) == ["a.csv"]


@pytest.mark.parametrize(("umask", "mode"), [(0o022, 0o644), (0o002, 0o664), (0o077, 0o600)])
def test_permissions_follow_the_umask(tmp_path: Path, umask: int, mode: int) -> None:
    before = os.umask(umask)
    try:
        with atomic(tmp_path / "a.csv") as file:
            file.write("x\n")
    finally:
        os.umask(before)
    assert stat.S_IMODE((tmp_path / "a.csv").stat().st_mode) == mode


def test_temporary_name_keeps_the_ending_and_is_hidden(tmp_path: Path) -> None:
    with atomic_path(tmp_path / "film.mp4") as temporary:
        temporary.write_bytes(b"film")
        assert (temporary.parent, temporary.suffix, temporary.name[0]) == (tmp_path, ".mp4", ".")
    assert (tmp_path / "film.mp4").read_bytes() == b"film"


def test_killed_writer_leaves_the_old_file(tmp_path: Path) -> None:
    target = tmp_path / "a.csv"
    target.write_text("old\n")
    script = textwrap.dedent(f"""
        import os, signal
        from pathlib import Path
        from wavejob.outputs.files import atomic
        with atomic(Path({str(target)!r})) as file:
            file.write("new")
            file.flush()
            os.kill(os.getpid(), signal.SIGKILL)
    """)
    done = subprocess.run([sys.executable, "-c", script], check=False, cwd=Path(__file__).parents[2])
    assert done.returncode == -signal.SIGKILL
    assert target.read_text() == "old\n"


def test_a_file_that_grows_too_large_is_explained(tmp_path: Path) -> None:
    """The kernel itself refuses here (RLIMIT_FSIZE), in the middle of the write."""
    before = resource.getrlimit(resource.RLIMIT_FSIZE)
    handler = signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
    resource.setrlimit(resource.RLIMIT_FSIZE, (10_000, before[1]))
    try:
        with pytest.raises(RunError) as caught, atomic(tmp_path / "fields.nc", "wb") as file:
            file.write(bytes(100_000))
    finally:
        resource.setrlimit(resource.RLIMIT_FSIZE, before)
        signal.signal(signal.SIGXFSZ, handler)
    assert str(caught.value) == (
        f"could not write `{tmp_path}/fields.nc`: the file would be larger than allowed here; "
        "raise the limit, or store fewer snapshots"
    )
    assert os.listdir(tmp_path) == []


def test_a_full_disk_is_explained() -> None:
    """`/dev/full` refuses every write with "no space left" (Linux, full(4))."""
    with (
        pytest.raises(OSError, match="No space left") as caught,
        open("/dev/full", "wb", buffering=0) as file,
    ):
        file.write(b"x")
    said = str(unwritable(Path("runs/a/series.csv"), caught.value))
    assert said == (
        "could not write `runs/a/series.csv`: the disk is full; "
        "make room, for instance with `wavejob prune`, or choose another disk with --runs DIR"
    )


@pytest.mark.parametrize(
    ("number", "words"),
    [
        (errno.ENOSPC, "the disk is full"),
        (errno.EDQUOT, "quota"),
        (errno.EROFS, "read-only"),
        (errno.EACCES, "may not write"),
        (errno.EIO, "reports an error"),
    ],
)
def test_errors_while_syncing_are_explained(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, number: int, words: str
) -> None:
    def refuse(handle: int) -> None:
        raise OSError(number, os.strerror(number))

    monkeypatch.setattr(os, "fsync", refuse)
    with pytest.raises(RunError, match=words), atomic(tmp_path / "a.csv") as file:
        file.write("x\n")
    assert os.listdir(tmp_path) == []


@pytest.mark.parametrize(
    ("name", "words"),
    [
        ("a" * 300, "the name is too long"),
        ("gone/a.csv", "its folder is gone"),
        ("file/a.csv", "a file stands"),
    ],
)
def test_impossible_names_are_explained(tmp_path: Path, name: str, words: str) -> None:
    (tmp_path / "file").write_text("")
    with pytest.raises(RunError, match=words), atomic(tmp_path / name):
        pass


def test_an_error_about_another_file_stays_itself(tmp_path: Path) -> None:
    with pytest.raises(FileNotFoundError), atomic(tmp_path / "a.csv"):
        (tmp_path / "other").read_text()
    assert os.listdir(tmp_path) == []
