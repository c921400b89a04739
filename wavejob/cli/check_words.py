"""The checks that a run makes of itself, with their reasons, as they stand in the code that makes them."""

from __future__ import annotations

import ast
from collections.abc import Iterator
from functools import cache
from pathlib import Path

PACKAGE = Path(__file__).parents[1]
REASON = 4  # place of the reason among the arguments of a check


@cache
def checks(word: str = "") -> dict[str, str]:
    """Name -> reason, of all checks or of those whose text has a string with `word` at its start or end.

    What a name says of the job at hand, such as the name of a detector, is left out.
    """
    found: dict[str, str] = {}
    for path in sorted(PACKAGE.rglob("*.py")):
        text = path.read_text(encoding="utf-8")
        folded = text.lower()
        mentioned = not word or f'"{word}' in folded or f'{word}"' in folded
        if mentioned and "Check(" in text and path != Path(__file__):
            found |= dict(_in_module(ast.parse(text)))
    return found


def _in_module(tree: ast.AST) -> Iterator[tuple[str, str]]:
    for node in ast.walk(tree):
        if not (isinstance(node, ast.Call) and isinstance(node.func, ast.Name) and node.func.id == "Check"):
            continue
        if len(node.args) > REASON and (name := _literal(node.args[0])):
            yield name.strip(" :."), _literal(node.args[REASON], "...")


def _literal(node: ast.expr, gap: str = "") -> str:
    """The text of a string or of the fixed parts of a formatted one; "" for anything else."""
    if isinstance(node, ast.Constant) and isinstance(node.value, str):
        return node.value
    if isinstance(node, ast.JoinedStr):
        return "".join(_literal(part, gap) or gap for part in node.values)
    return ""
