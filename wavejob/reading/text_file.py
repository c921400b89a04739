"""A file of text as it stands on disk, or a sentence why it can't be read."""

from __future__ import annotations

import re
import stat
from pathlib import Path

from ..problems import JobFileError, Place, Problem

MAX_BYTES = 1 << 20

LINE_END = re.compile(r"\r\n|\r|\n")
# Beside control characters: U+0085, U+2028 and U+2029 end a line for a YAML parser but for few editors.
_UNWANTED = re.compile("[\x00-\x08\x0b\x0c\x0e-\x1f\x7f-\x9f\u2028\u2029\ud800-\udfff\ufeff\ufffe\uffff]")


def read_text_file(path: Path, shown: str) -> str:
    """The text of the UTF-8 file at `path`, called `shown` in messages. Raises JobFileError."""
    return _decode(_read_bytes(path, shown), shown)


def check_characters(text: str, shown: str) -> None:
    """Refuse characters that cannot be seen. Raises JobFileError."""
    unwanted = _UNWANTED.search(text)
    if unwanted:
        place = _place_of(text, unwanted.start(), shown)
        message = f"the unseen character U+{ord(unwanted.group()):04X} stands here"
        source = LINE_END.split(text)[place.line - 1]
        raise JobFileError([Problem(message, "delete it", place=place, source=source)])


def _read_bytes(path: Path, shown: str) -> bytes:
    try:
        mode = path.stat().st_mode
        if stat.S_ISDIR(mode):
            raise _refusal("this is a folder, not a file", "name a file in it", shown)
        if not stat.S_ISREG(mode):
            raise _refusal("this is not an ordinary file", "name a file on disk", shown)
        with path.open("rb") as file:
            data = file.read(MAX_BYTES + 1)
    except PermissionError:
        raise _refusal("the file may not be read", "change its permissions", shown) from None
    except (FileNotFoundError, NotADirectoryError, ValueError):  # ValueError: a NUL in the name
        raise _refusal("there is no such file", "check the path", shown) from None
    except OSError as error:
        said = f"the file can't be read ({error.strerror})"
        raise _refusal(said, "check the path and the disk", shown) from None
    if len(data) > MAX_BYTES:
        fix = "keep data in files of their own, and name those in the job"
        raise _refusal(f"the file is larger than {MAX_BYTES >> 20} MiB", fix, shown)
    return data


def _refusal(message: str, fix: str, shown: str) -> JobFileError:
    return JobFileError([Problem(message, fix, place=Place(shown))])


def _decode(data: bytes, shown: str) -> str:
    if data.startswith((b"\xff\xfe", b"\xfe\xff")):
        raise _refusal("the file is UTF-16 text", "save it as UTF-8", shown)
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        before = error.object[: error.start].decode("utf-8")  # a byte order mark is off already
        message = f"the byte 0x{error.object[error.start]:02x} is not UTF-8 text"
        place = _place_of(before, len(before), shown)
        raise JobFileError([Problem(message, "save the file as UTF-8", place=place)]) from None
    if "\0" in text:
        message = "the file holds a NUL byte, so it is no text file"
        place = _place_of(text, text.index("\0"), shown)
        raise JobFileError([Problem(message, "name a text file", place=place)])
    return text


def _place_of(text: str, index: int, shown: str) -> Place:
    lines = LINE_END.split(text[:index])
    return Place(shown, len(lines), len(lines[-1]) + 1)
