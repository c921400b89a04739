"""Every message to a user is made of these: where it is, what is wrong, what to do."""

from __future__ import annotations

from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any


@dataclass(frozen=True, order=True)
class Place:
    """A spot in a text file; line and column count from 1, columns in characters."""

    path: str
    line: int = 0
    column: int = 0

    def __str__(self) -> str:
        return f"{self.path}:{self.line}:{self.column}" if self.line else self.path


@dataclass(frozen=True)
class Problem:
    """One mistake (or, with severity "warning", one doubt) and its cure."""

    message: str  # what is wrong, with what was found between back-ticks
    fix: str = ""  # what is accepted, or what to write instead
    key: str = ""  # dotted path of the key in the job file
    place: Place | None = None
    source: str = ""  # the offending line as it stands in the file
    severity: str = "error"

    def headline(self) -> str:
        """`path:line:column: key: what is wrong; what is accepted` on one line."""
        parts = [str(self.place)] if self.place else []
        if self.severity != "error":
            parts.append(self.severity)
        if self.key:
            parts.append(self.key)
        said = f"{self.message}; {self.fix}" if self.fix else self.message
        return " ".join(": ".join([*parts, said]).splitlines())  # what the user wrote may have several

    def text(self) -> str:
        """The headline, then the offending line with a caret under the column."""
        if not (self.place and self.place.line and self.source):
            return self.headline()
        column = max(self.place.column - 1, 0)
        shown, at = _clip(self.source, column)
        pad = "".join("\t" if c == "\t" else " " for c in shown[:at])
        return f"{self.headline()}\n    {shown}\n    {pad}^"


def _clip(line: str, column: int, width: int = 110) -> tuple[str, int]:
    """The part of a long line around `column`, and the column within that part."""
    if len(line) <= width:
        return line, column
    start = max(0, min(column - width // 2, len(line) - width))
    return line[start : start + width], column - start


def nearest(word: str, words: Iterable[str]) -> str | None:
    """The one of `words` that a mistyped `word` most likely meant, however it is capitalised."""
    from difflib import get_close_matches

    spelt = {known.lower(): known for known in words}
    found = get_close_matches(word.lower(), spelt, 1, 0.6)
    return spelt[found[0]] if found else None


def shown(value: Any) -> str:
    """What the user wrote, between back-ticks and cut to a readable length."""
    if value is None or value == "":
        return "nothing"
    if isinstance(value, dict):
        return "a mapping"
    if isinstance(value, list):
        return "a list"
    text = {True: "yes", False: "no"}[value] if isinstance(value, bool) else " ".join(str(value).split())
    return f"`{text if len(text) <= 60 else text[:57] + '...'}`"


def in_order(problems: Iterable[Problem]) -> list[Problem]:
    """Problems sorted by place; those without a place last."""
    return sorted(problems, key=lambda p: (p.place is None, p.place or Place("")))


class WavejobError(Exception):
    """Base of all errors that are explained to the user without a traceback."""


class JobFileError(WavejobError):
    """All mistakes found in the input, in order of place. Survives pickling."""

    def __init__(self, problems: Iterable[Problem]) -> None:
        self.problems = in_order(problems)
        super().__init__(self.problems)

    def __str__(self) -> str:
        return "\n".join(p.text() for p in self.problems)


class RunError(WavejobError):
    """A run that had begun could not go on (disk, memory, non-finite values)."""

    def __init__(self, message: str, fix: str = "") -> None:
        self.message, self.fix = message, fix
        super().__init__(message, fix)

    def __str__(self) -> str:
        return f"{self.message}; {self.fix}" if self.fix else self.message
