"""From words on the command line to a command and its options; every mistake in our own words."""

from __future__ import annotations

import re
import shutil
from argparse import SUPPRESS, Action, ArgumentParser, ArgumentTypeError, HelpFormatter, Namespace
from collections.abc import Callable
from dataclasses import dataclass
from importlib import import_module
from pathlib import Path
from typing import Any, NoReturn

from ..problems import JobFileError, Place, Problem, nearest
from ..version import __version__

COMMANDS = {
    "check": "read job files, report every mistake, forecast time and memory",
    "run": "run job files or whole folders",
    "compare": "say which results of two runs, trees or a baseline differ by more than their bars",
    "prune": "remove old runs",
    "explain": "describe a key, kind, observable, unit or check, with an example",
    "schema": "print the JSON Schema of the job file, for editors",
    "new": "write a commented job file to start from",
    "doctor": "look at this machine: versions, cores, memory, cache, encoder, speed",
}
LATER = ("report",)
EVERYWHERE = "-q, -v, --tree, --version and --help may stand before or after the command."


@dataclass(frozen=True)
class Chosen:
    """A command with its options."""

    run: Callable[[Namespace], int]
    options: Namespace


class UsageError(JobFileError):
    """A mistake on the command line."""

    def __init__(self, where: str, message: str, fix: str = "") -> None:
        self.where, self.message, self.fix = where, message, fix
        super().__init__([Problem(message, fix, place=Place(where))])
        self.args = (where, message, fix)  # what pickling hands to this constructor


class Parser(ArgumentParser):
    """An argument parser that explains mistakes as everything else here does."""

    def __init__(self, name: str, about: str) -> None:
        super().__init__(
            prog=f"wavejob {name}".strip(),
            description=about,
            allow_abbrev=False,
            add_help=False,
            formatter_class=_formatter,
        )
        self.color = False

    def error(self, message: str) -> NoReturn:
        found = re.fullmatch(r"argument (?P<name>[^:]+): (?P<said>.*)", message, re.DOTALL)
        if found is None:
            raise UsageError(self.prog, message)
        name, said = found["name"].rpartition("/")[2], found["said"]
        if said.startswith("expected"):
            raise UsageError(self.prog, f"`{name}` needs a value", self._shown(name))
        if said.startswith("ignored explicit argument"):
            raise UsageError(self.prog, f"`{name}` takes no value", f"write `{name}` alone")
        raise UsageError(self.prog, f"{name}: {said}")

    def _shown(self, name: str) -> str:
        action = self._option_string_actions.get(name)
        return f"write `{name} {action.metavar or 'VALUE'}`" if action else ""

    def options(self, words: list[str]) -> Namespace:
        """The options in `words`. Raises UsageError."""
        options, strange = self.parse_known_args(words)
        if strange:
            word = strange[0].partition("=")[0]
            if not word.startswith("-"):
                raise UsageError(self.prog, f"does not know what to do with `{word}`", f"see `{self.prog} --help`")
            near = nearest(word, self._option_string_actions) if word.startswith("--") else None
            fix = f"did you mean `{near}`?" if near else f"see `{self.prog} --help`"
            raise UsageError(self.prog, f"no option `{word}`", fix)
        return options


class NotYet(Action):
    """An option that is promised and not built."""

    def __call__(self, parser: ArgumentParser, *_: Any) -> NoReturn:
        raise UsageError(parser.prog, f"`{self.option_strings[0]}` is not available yet", "leave it out")


def read(words: list[str]) -> Chosen | str:
    """The command that `words` ask for, or the text of the help or version asked for. Raises UsageError."""
    at = _command_place(words)
    if at is None:
        parser = Parser("", "")
        add_everywhere(parser)
        options = parser.options(words)
        if options.version:
            return f"wavejob {__version__}"
        if options.help:
            return overview()
        raise UsageError("wavejob", "no command given", f"there are: {', '.join(COMMANDS)}; see `wavejob --help`")
    name, rest = words[at], words[:at] + words[at + 1 :]
    if name in LATER:
        raise UsageError("wavejob", f"`{name}` is not available yet", f"there are: {', '.join(COMMANDS)}")
    if name not in COMMANDS:
        near = nearest(name, COMMANDS)
        raise UsageError(
            "wavejob",
            f"no command `{name}`",
            f"did you mean `{near}`?" if near else f"there are: {', '.join(COMMANDS)}",
        )
    module = import_module(f".{name}", __package__)
    parser = Parser(name, module.__doc__ or "")
    parser.set_defaults(command=name)
    module.add_arguments(parser)
    add_everywhere(parser)
    if {"-h", "--help"} & set(rest):
        return parser.format_help().rstrip()
    options = parser.options(rest)
    return f"wavejob {__version__}" if options.version else Chosen(module.run, options)


def _command_place(words: list[str]) -> int | None:
    """Where in `words` the command stands: the first that is no option and no option's value."""
    values = {index + 1 for index, word in enumerate(words) if word == "--tree"}
    return next((i for i, word in enumerate(words) if not word.startswith("-") and i not in values), None)


def overview() -> str:
    """The help of `wavejob` alone."""
    listed = [f"  {name:<10}{about}" for name, about in COMMANDS.items()]
    return "\n".join(
        [
            "usage: wavejob COMMAND ...",
            "",
            "Quantum wave packets from job files. Start with `wavejob new first.yml`.",
            "",
            *listed,
            "",
            "`wavejob COMMAND --help` tells more about each.",
            EVERYWHERE,
        ]
    )


def add_everywhere(parser: ArgumentParser) -> None:
    """The options that every command takes."""
    group = parser.add_argument_group("everywhere")
    group.add_argument("-q", "--quiet", action="store_true", help="say nothing but errors")
    group.add_argument("-v", "--verbose", action="store_true", help="say more, with tracebacks of internal errors")
    group.add_argument("--tree", type=Path, metavar="DIR", help="the job tree, instead of the nearest folder with .git")
    group.add_argument("--version", action="store_true", help="print the version")
    group.add_argument("-h", "--help", action="store_true", help="print this")


def add_paths(parser: ArgumentParser) -> None:
    parser.add_argument("paths", nargs="*", metavar="PATH", help="a job file, or a folder that stands for all below it")


def add_reading(parser: ArgumentParser) -> None:
    """What all commands take that read jobs."""
    parser.add_argument("--memory", type=_size, metavar="SIZE", help="refuse jobs that need more, such as `8 GB`")
    parser.add_argument(
        "--limit", type=_duration, metavar="TIME", help="refuse jobs forecast to take longer, such as `2h`"
    )
    parser.add_argument("--trust-paths", action="store_true", help="let files name others outside the job tree")
    parser.add_argument("--strict", action="store_true", help="exit with 1 for a warning or a doubtful verdict too")
    add_format(parser)


def add_format(parser: ArgumentParser) -> None:
    parser.add_argument(
        "--format", type=_one_of("text", "json"), default="text", metavar="text|json", help="text if left out"
    )


def add_not_yet(parser: ArgumentParser, *names: str) -> None:
    """Options of the contract that are refused by name."""
    for name in names:
        parser.add_argument(name, action=NotYet, nargs="?", help=SUPPRESS)


def _one_of(*words: str) -> Callable[[str], str]:
    def read(word: str) -> str:
        if word in words:
            return word
        near = nearest(word, words)
        listed = " or ".join(f"`{known}`" for known in words)
        raise ArgumentTypeError(f"no `{word}`; " + (f"did you mean `{near}`?" if near else f"write {listed}"))

    return read


def _size(text: str) -> int:
    from .sizes import SizeError, read_size

    try:
        return read_size(text)
    except SizeError as error:
        raise ArgumentTypeError(str(error)) from None


def _duration(text: str) -> float:
    from .sizes import SizeError, read_duration

    try:
        return read_duration(text)
    except SizeError as error:
        raise ArgumentTypeError(str(error)) from None


def _formatter(prog: str) -> HelpFormatter:
    """Help no wider than 100 columns, with room for the longest option."""
    return HelpFormatter(prog, max_help_position=26, width=min(shutil.get_terminal_size().columns, 100))
