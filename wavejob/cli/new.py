"""Write a commented job file to start from; a file that is there already stays as it is."""

from __future__ import annotations

from argparse import ArgumentParser, Namespace
from importlib.resources import files
from pathlib import Path

from ..problems import JobFileError, Place, Problem
from ..reading.tree import ENDINGS, shown
from . import terminal
from .arguments import UsageError

TEMPLATE = "first.yml"


def add_arguments(parser: ArgumentParser) -> None:
    parser.add_argument("file", nargs="?", type=Path, metavar="FILE", help="name of the file, ending in .yml")


def run(options: Namespace) -> int:
    path: Path | None = options.file
    if path is None:
        raise UsageError("wavejob new", "no file name given", "write `wavejob new first.yml`")
    if path.suffix not in ENDINGS:
        raise _refusal(path, "is no name of a job file", f"end it in .yml, as in `{path.name or 'first'}.yml`")
    try:
        with path.open("x", encoding="utf-8", newline="\n") as file:
            file.write(template())
    except FileExistsError:
        raise _refusal(path, "is there already", "choose another name") from None
    except (OSError, ValueError) as error:
        if not path.parent.is_dir():
            said = f"can't be written: there is no folder `{path.parent}`"
            raise _refusal(path, said, "make the folder first") from None
        said = str(error.strerror if isinstance(error, OSError) else error)
        raise _refusal(path, f"can't be written: {said}", "choose another folder") from None
    if not options.quiet:
        name = shown(path)
        terminal.say(
            f"{name} is written. Next:\n  wavejob check {name}\n  wavejob run {name}\n  wavejob explain potential"
        )
    return 0


def template() -> str:
    """The job file that `wavejob new` writes."""
    return files(__package__).joinpath(TEMPLATE).read_text(encoding="utf-8")


def _refusal(path: Path, message: str, fix: str) -> JobFileError:
    return JobFileError([Problem(message, fix, place=Place(shown(path)))])
