"""Words on the command line: each mistake is named with its cure, and exits with 2, as argparse has it."""

from __future__ import annotations

import pickle

import pytest

from wavejob import __version__
from wavejob.cli.arguments import COMMANDS, UsageError
from wavejob.cli.sizes import SizeError, duration, read_size, size

from .conftest import Call

MISTAKES = [
    (
        "",
        "wavejob: no command given; "
        "there are: check, run, compare, prune, explain, schema, new, doctor; see `wavejob --help`",
    ),
    ("chek job.yml", "wavejob: no command `chek`; did you mean `check`?"),
    (
        "report",
        "wavejob: `report` is not available yet; there are: check, run, compare, prune, explain, schema, new, doctor",
    ),
    ("check", "wavejob check: no job file given; name a job file or a folder of them"),
    ("check --memroy 3", "wavejob check: no option `--memroy`; did you mean `--memory`?"),
    ("check -x", "wavejob check: no option `-x`; see `wavejob check --help`"),
    ("check --memory", "wavejob check: `--memory` needs a value; write `--memory SIZE`"),
    (
        "check --memory 3 job.yml",
        "wavejob check: --memory: `3` has no unit; write a number and a unit, such as `8 GB` or `500 MiB`",
    ),
    (
        "check --memory 3XB job.yml",
        "wavejob check: --memory: `XB` is no unit of memory; there are: B, kB, MB, GB, TB, KiB, MiB, GiB, TiB",
    ),
    ("check --strict=yes job.yml", "wavejob check: `--strict` takes no value; write `--strict` alone"),
    ("check --format jsn job.yml", "wavejob check: --format: no `jsn`; did you mean `json`?"),
    (
        "run --workers none job.yml",
        "wavejob run: --workers: `none` is no number of workers; write a whole number from 1 to 1024",
    ),
    ("run --by 07:00 job.yml", "wavejob run: `--by` is not available yet; leave it out"),
    ("run --on dask:host job.yml", "wavejob run: `--on` is not available yet; leave it out"),
    (
        "schema job.yml",
        "wavejob schema: does not know what to do with `job.yml`; see `wavejob schema --help`",
    ),
    ("--tree", "wavejob: `--tree` needs a value; write `--tree DIR`"),
]


@pytest.mark.parametrize(("line", "said"), MISTAKES)
def test_a_mistake_is_named_with_its_cure(call: Call, line: str, said: str) -> None:
    found = call(*line.split())
    assert (found.code, found.out, found.err) == (2, "", said + "\n")


@pytest.mark.parametrize("line", ["--version", "check --version", "-q --version", "--version run"])
def test_version_stands_anywhere(call: Call, line: str) -> None:
    found = call(*line.split())
    assert (found.code, found.out, found.err) == (0, f"wavejob {__version__}\n", "")


@pytest.mark.parametrize("command", COMMANDS)
def test_every_command_has_help(call: Call, command: str) -> None:
    found = call(command, "--help")
    assert found.code == 0
    assert found.out.startswith(f"usage: wavejob {command}")
    assert "--tree DIR" in found.out


def test_help_lists_every_command(call: Call) -> None:
    out = call("--help").out
    assert [name for name in COMMANDS if f"\n  {name} " not in out] == []


@pytest.mark.parametrize("line", ["--tree . check job.yml", "check --tree . job.yml", "check job.yml --tree=."])
def test_options_for_all_commands_stand_before_or_after(call: Call, line: str) -> None:
    assert call(*line.split()).code == 0


def test_a_usage_error_survives_pickling() -> None:
    error = UsageError("wavejob run", "is wrong", "mend it")
    assert str(pickle.loads(pickle.dumps(error))) == str(error) == "wavejob run: is wrong; mend it"


@pytest.mark.parametrize(
    ("text", "count"),
    # decimal and binary prefixes: IEC 80000-13
    [("8 GB", 8 * 10**9), ("1.5GiB", 3 * 2**29), ("500 MB", 5 * 10**8), ("2 K", 2000), ("64 kib", 2**16)],
)
def test_sizes_are_read(text: str, count: int) -> None:
    assert read_size(text) == count


@pytest.mark.parametrize("text", ["", "8", "-1 GB", "nan GB", "GB", "1e3 GB", "8 gigs", "0 B", "9999999999999 TB"])
def test_what_is_no_size_is_refused(text: str) -> None:
    with pytest.raises(SizeError):
        read_size(text)


def test_sizes_and_times_in_words() -> None:
    assert [size(n) for n in (0, 999, 110637500, 2.4e9)] == ["0 B", "1000 B", "110 MB", "2.4 GB"]
    assert [duration(s) for s in (0.2, 6.84, 88, 1080, 9000, 3e5)] == [
        "less than 1 s", "6.8 s", "88 s", "18 min", "2.5 h", "3.5 days",
    ]  # fmt: skip
