"""Pages of the reference text, laid out for the width at hand."""

from __future__ import annotations

import re
from collections.abc import Iterator
from itertools import groupby

from . import terminal
from .words import columns, paragraph


def laid_out(page: str) -> str:
    """The page fitted to the terminal; as it stands where it goes to a file or a pipe."""
    if terminal.width() is None:
        return page.rstrip()
    lines = [line for kind, block in _blocks(page) for line in _fitted(kind, block)]
    return "\n".join(lines).strip()


def _blocks(page: str) -> Iterator[tuple[str, list[str]]]:
    """Runs of lines of one kind: "title", "row", "code", "item", "text", or "" for empty ones."""
    for (kind, _), block in groupby(_kinds(page), key=lambda line: line[:2]):
        yield kind, [line for _, _, line in block]


def _kinds(page: str) -> Iterator[tuple[str, int, str]]:
    """Kind of each line, number of the item it belongs to, and the line."""
    kind, item = "", 0
    for line in page.splitlines():
        if line.startswith("- "):
            kind, item = "item", item + 1
        elif not (kind == "item" and line.startswith("  ")):
            marks = {"": "", "#": "title", "|": "row", " ": "code"}
            kind = marks.get(line[:1], "text")
        yield kind, item, line


def _fitted(kind: str, block: list[str]) -> list[str]:
    joined = " ".join(line.strip() for line in block)
    if kind == "title":
        return [line.lstrip("# ") for line in block]
    if kind == "item":
        return [paragraph(joined.removeprefix("- "), "- ", "  ")]
    if kind == "text":
        return [paragraph(joined)]
    if kind == "row":
        rows = [[cell.strip() for cell in line.strip("|").split(" | ")] for line in block]
        return columns([(first, "; ".join(rest)) for first, *rest in rows if not re.fullmatch("-+:?", first)], "")
    return block
