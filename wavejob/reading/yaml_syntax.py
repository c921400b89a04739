"""Our own sentences for what a YAML parser may stumble over."""

from __future__ import annotations

from typing import NamedTuple


class Sentence(NamedTuple):
    """What is wrong, and what to write instead."""

    message: str
    fix: str


TAB = Sentence("a tab is used for indentation", "indent with spaces")
GENERAL = Sentence(
    "the text is not well-formed YAML from here on",
    "check indentation, colons, quotes and brackets on this line and the one before",
)

# The left column is a part of the message of PyYAML's pure Python parser (scanner.py and parser.py of
# PyYAML 6.0), which names only a few kinds of mistake. The user never sees it. First match counts.
_KNOWN: tuple[tuple[str, Sentence], ...] = (
    (
        "mapping values are not allowed here",
        Sentence(
            "a second `: ` on one line, or a line that is indented too far",
            "put each key on its own line, at the same indentation as its neighbours, and text that holds "
            "`: ` in quotes",
        ),
    ),
    (
        "could not find expected ':'",
        Sentence("this line is neither `key: value` nor `- item`", "write a colon and a space after the key"),
    ),
    (
        "sequence entries are not allowed here",
        Sentence("a list item `- ` may not begin here", "begin each list item on a line of its own"),
    ),
    (
        "mapping keys are not allowed here",
        Sentence("a key may not begin here", "begin each key on a line of its own"),
    ),
    (
        "expected <block end>",
        Sentence(
            "this line does not belong to the block above it",
            "give all keys or items of one block the same indentation, and do not mix `key:` with `- item`",
        ),
    ),
    (
        "expected ',' or ']'",
        Sentence("a list in `[ ]` is not closed, or lacks a comma", "write `[a, b, c]`"),
    ),
    (
        "expected ',' or '}'",
        Sentence("a map in `{ }` is not closed, or lacks a comma", "write `{key: value, key: value}`"),
    ),
    (
        "found unexpected end of stream",
        Sentence("a quoted text is not closed", "add the closing quote"),
    ),
    (
        "found unexpected document separator",
        Sentence("a quoted text is not closed before the next `---` or `...`", "add the closing quote"),
    ),
    (
        "found unknown escape character",
        Sentence(
            "a backslash in a text in double quotes begins no known escape",
            "write `\\\\` for a backslash, or use single quotes",
        ),
    ),
    (
        "escape sequence of",
        Sentence(
            "an escape in double quotes lacks its hexadecimal digits",
            "write `\\x` with 2, `\\u` with 4 or `\\U` with 8 of them",
        ),
    ),
    (
        "expected the node content",
        Sentence("a value is missing here", "write a value, or put it in quotes"),
    ),
    (
        "indentation indicator",
        Sentence("the sign after `|` or `>` is not known", "write `|` or `>` alone, with the text below it"),
    ),
    (
        "expected a comment or a line break",
        Sentence("something stands where the line should end", "begin the text on the next line"),
    ),
    (
        "expected '<document start>'",
        Sentence(
            "something stands after the end of the content",
            "keep one map of keys in the file, all of its top keys in the first column",
        ),
    ),
    (
        "undefined tag handle",
        Sentence("tags (`!name`) are not read", "leave the tag out, or put the text in quotes"),
    ),
    (
        "cannot start any token",
        Sentence("a value may not begin with this sign", "put the text in quotes"),
    ),
)


def sentence(parser_message: str, line: str, column: int) -> Sentence:
    """Our sentence for a parser's message about column `column` (from 0) of `line`."""
    indentation = line[: len(line) - len(line.lstrip(" \t"))]
    if "\t" in indentation and column <= len(indentation):
        return TAB
    return next((ours for part, ours in _KNOWN if part in parser_message), GENERAL)
