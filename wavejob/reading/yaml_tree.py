"""YAML text to plain values that remember where they stood.

Scalars follow the core schema of YAML 1.2 (yaml.org/spec/1.2.2, section 10.3.2): `1e-3` is a number, `on` and
`no` are words. What makes files surprising (anchors, merge keys, tags, duplicate keys) is refused.
"""

from __future__ import annotations

import math
import re
from collections.abc import Iterator
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any, NoReturn

import yaml

from ..problems import JobFileError, Place, Problem
from .text_file import LINE_END, check_characters, read_text_file
from .yaml_syntax import GENERAL, sentence

KeyPath = tuple[str | int, ...]
Value = dict[str, Any] | list[Any] | str | int | float | bool | None

MAX_NODES = 20_000
MAX_DEPTH = 50
MAX_DIGITS = 100  # of a whole number: far more than any seed needs, far less than would be slow

# libyaml where PyYAML was built with it, for speed alone: what it refuses is read again by the Python parser,
# so that places and sentences do not depend on the machine.
FAST_LOADER = getattr(yaml, "CSafeLoader", None)

_PARSERS_DIFFER = re.compile(r"\t|[|>]\S*#|\?[\]},]")  # libyaml alone takes tabs in `{ }`, `|#` and `[a?]`
_ESCAPED = re.compile("[\x00-\x08\x0b-\x1f\x7f\ud800-\udfff]")  # may be written in double quotes only
_NULL = re.compile(r"~|null|Null|NULL|")
_TRUE, _FALSE = ("true", "True", "TRUE"), ("false", "False", "FALSE")
_INTEGER = re.compile(r"[-+]?[0-9]+|0o[0-7]+|0x[0-9a-fA-F]+")
_REAL = re.compile(r"[-+]?(\.[0-9]+|[0-9]+(\.[0-9]*)?)([eE][-+]?[0-9]+)?")
_NOT_FINITE = re.compile(r"[-+]?\.(inf|Inf|INF)|\.(nan|NaN|NAN)")


@dataclass(frozen=True)
class Document:
    """The content of one YAML file: plain values, and the place of each value and of each key."""

    value: Value
    places: dict[KeyPath, Place]
    key_places: dict[KeyPath, Place]  # of the key that is last in the path
    lines: list[str]
    path: str  # as shown to the user

    def place(self, path: KeyPath) -> Place:
        """Where the value at `path` stands, or else the nearest value that holds it."""
        for length in range(len(path), -1, -1):
            if path[:length] in self.places:
                return self.places[path[:length]]
        return Place(self.path)

    def source(self, place: Place) -> str:
        """The line of the file at `place`, as it stands there; empty for a place without a line."""
        return self.lines[place.line - 1] if 0 < place.line <= len(self.lines) else ""


def dotted(path: KeyPath) -> str:
    """A key path as it is written in messages: `potential[1].barrier.height`."""
    text = "".join(f"[{part}]" if isinstance(part, int) else f".{part}" for part in path)
    return text.removeprefix(".")


def read_document(path: Path, shown: str | None = None) -> Document:
    """The content of the file at `path`, called `shown` in messages.

    Raises JobFileError with all mistakes found.
    """
    name = str(path) if shown is None else shown
    return read_text(read_text_file(path, name), name)


def read_text(text: str, shown: str) -> Document:
    """The content of `text`, called `shown` in messages. Raises JobFileError with all mistakes found."""
    check_characters(text, shown)
    lines = LINE_END.split(text)
    if FAST_LOADER is not None and not _PARSERS_DIFFER.search(text):
        try:
            return _Reader(FAST_LOADER(text), lines, shown).document()
        except (yaml.YAMLError, JobFileError):
            pass  # mistakes are found by the Python parser below
    loader = yaml.SafeLoader(text)
    reader = _Reader(loader, lines, shown)
    try:
        return reader.document()
    except yaml.MarkedYAMLError as error:
        mark = error.problem_mark or loader.get_mark()
        known = sentence(error.problem or "", reader.line(mark), mark.column)
    except (ValueError, OverflowError):  # PyYAML lets these out for impossible escapes and versions
        mark, known = loader.get_mark(), GENERAL
    reader.add(known.message, known.fix, mark)
    raise JobFileError(reader.problems)


class _Full(Exception):
    """The document is too large or too deep to go on; the problem is noted."""


@dataclass
class _Reader:
    """Builds values from parser events, and goes on after each mistake that allows it."""

    loader: Any
    lines: list[str]
    shown: str
    problems: list[Problem] = field(default_factory=list)
    places: dict[KeyPath, Place] = field(default_factory=dict)
    key_places: dict[KeyPath, Place] = field(default_factory=dict)
    nodes: int = 0

    def document(self) -> Document:
        """The one document of the stream."""
        events = self._events()
        value: Value = None
        try:
            for event in events:
                if isinstance(event, yaml.DocumentStartEvent):
                    value = self._first(event, events) if not self.nodes else self._another(event)
        except _Full:
            pass
        finally:
            self.loader.dispose()
        if not self.problems and value is None:
            self.problems.append(Problem("the file is empty", "write a job in it", place=Place(self.shown)))
        if self.problems:
            raise JobFileError(self.problems)
        return Document(value, self.places, self.key_places, self.lines, self.shown)

    def line(self, mark: Any) -> str:
        """The source line at a parser's mark."""
        return self.lines[mark.line] if mark.line < len(self.lines) else ""

    def add(self, message: str, fix: str, mark: Any, path: KeyPath | None = None) -> None:
        """Note a problem at a parser's mark."""
        self.problems.append(Problem(message, fix, dotted(path or ()), self._place(mark), self.line(mark)))

    def _place(self, mark: Any) -> Place:
        return Place(self.shown, mark.line + 1, mark.column + 1)

    def _events(self) -> Iterator[Any]:
        while self.loader.check_event():
            yield self.loader.get_event()

    def _first(self, event: Any, events: Iterator[Any]) -> Value:
        if event.tags or event.version not in (None, (1, 2)):
            self.add("`%` directives are not read", "leave this line out", event.start_mark)
        return self._node(next(events), events, (), 0)

    def _another(self, event: Any) -> NoReturn:
        self.add("a second document begins here", "keep one job in a file; leave `---` out", event.start_mark)
        raise _Full

    def _node(self, event: Any, events: Iterator[Any], path: KeyPath | None, depth: int) -> Value:
        """The value that begins with `event`; without a path it is read for its mistakes alone."""
        self.nodes += 1
        if self.nodes > MAX_NODES:
            self._stop(f"the file holds more than {MAX_NODES} values", "keep data in files of their own", event)
        if depth > MAX_DEPTH:
            self._stop(f"values are nested more than {MAX_DEPTH} deep", "close the brackets earlier", event)
        if path is not None:
            self.places[path] = self._place(event.start_mark)
        if isinstance(event, yaml.AliasEvent):
            said = f"aliases (`*{_short(str(event.anchor))}`) are not read"
            self.add(said, "write the value out, or use `based_on`", event.start_mark, path)
            return None
        self._plain(event, path)
        if isinstance(event, yaml.MappingStartEvent):
            return self._map(events, path, depth)
        if isinstance(event, yaml.SequenceStartEvent):
            return self._list(events, path, depth)
        return self._scalar(event, path)

    def _plain(self, event: Any, path: KeyPath | None) -> None:
        """Note an anchor or a tag, which a plain value has not."""
        if event.anchor is not None:
            said = f"anchors (`&{_short(str(event.anchor))}`) are not read"
            self.add(said, "leave the anchor out", event.start_mark, path)
        if event.tag is not None:
            said = f"tags (`{_short(event.tag.replace('tag:yaml.org,2002:', '!!'))}`) are not read"
            self.add(said, "leave the tag out, or put the text in quotes", event.start_mark, path)

    def _list(self, events: Iterator[Any], path: KeyPath | None, depth: int) -> list[Any]:
        items: list[Any] = []
        while not isinstance(event := next(events), yaml.SequenceEndEvent):
            items.append(self._node(event, events, _below(path, len(items)), depth + 1))
        return items

    def _map(self, events: Iterator[Any], path: KeyPath | None, depth: int) -> dict[str, Any]:
        entries: dict[str, Any] = {}
        first_lines: dict[str, int] = {}
        while not isinstance(event := next(events), yaml.MappingEndEvent):
            mark = event.start_mark
            key = self._key(event, events, path, depth)
            if key is not None and key in first_lines:
                said = f"the key `{_short(key)}` was given before, on line {first_lines[key]}"
                self.add(said, "keep one of the two", mark, _below(path, key))
                key = None
            if key is None:
                self._node(next(events), events, None, depth + 1)
                continue
            first_lines[key] = mark.line + 1
            inner = _below(path, key)
            if inner is not None:
                self.key_places[inner] = self._place(mark)
            event = next(events)
            entries[key] = self._node(event, events, inner, depth + 1)
            if inner is not None and entries[key] is None and event.start_mark.index == event.end_mark.index:
                self.places[inner] = self._place(mark)  # of a value left out, the parsers give different marks
        return entries

    def _key(self, event: Any, events: Iterator[Any], path: KeyPath | None, depth: int) -> str | None:
        """The text of a key, or None where it can't be one, which is then noted."""
        before = len(self.problems)
        if isinstance(event, yaml.ScalarEvent) and event.value == "<<" and event.implicit[0]:
            self.add(
                "merge keys (`<<`) are not read",
                "write the keys out, or use `based_on`",
                event.start_mark,
                path,
            )
            return None
        key = self._node(event, events, None, depth + 1)
        if len(self.problems) > before:
            return None
        if isinstance(key, str):
            return key
        if isinstance(key, dict | list):
            fix = "write a name before the colon, and text that begins with `{` or `[` in quotes"
            self.add("a list or map can't be a key", fix, event.start_mark, path)
        elif key is None:
            self.add("a key is missing before the colon", "write a name there", event.start_mark, path)
        else:
            said = f"the key `{_short(event.value)}` is not text"
            self.add(said, "use a name, or put it in quotes", event.start_mark, path)
        return None

    def _scalar(self, event: Any, path: KeyPath | None) -> Value:
        text: str = event.value
        bad = _ESCAPED.search(text)
        if bad:
            said = f"an escape stands for the character U+{ord(bad.group()):04X}"
            self.add(said, "leave it out", event.start_mark, path)
        if bad or not event.implicit[0]:
            return text
        if _NULL.fullmatch(text):
            return None
        if text in _TRUE or text in _FALSE:
            return text in _TRUE
        if _INTEGER.fullmatch(text) and len(text) <= MAX_DIGITS:
            return int(text, {"0o": 8, "0x": 16}.get(text[:2], 10))
        if _REAL.fullmatch(text) and math.isfinite(float(text)):
            return float(text)
        if _NOT_FINITE.fullmatch(text):
            self.add(f"`{text}` is not a finite number", "write a finite number", event.start_mark, path)
        elif _INTEGER.fullmatch(text) or _REAL.fullmatch(text):
            self.add(f"the number `{_short(text)}` is out of range", "write a smaller one", event.start_mark, path)
        return text

    def _stop(self, message: str, fix: str, event: Any) -> NoReturn:
        self.add(message, fix, event.start_mark)
        raise _Full


def _below(path: KeyPath | None, part: str | int) -> KeyPath | None:
    return None if path is None else (*path, part)


def _short(text: str) -> str:
    return text if len(text) <= 40 else f"{text[:37]}..."
