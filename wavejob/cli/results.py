"""The results of one run as text."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

from ..reader import Run
from .words import paragraph

CLASSICAL = "classical."


def result_table(title: str, folder: str, run: Run) -> str:
    """Figures with bars and meanings, expectations, checks that failed, verdict and folder."""
    document = run.document
    results: dict[str, dict[str, Any]] = document["results"]
    ours = [_row(name, entry) for name, entry in results.items() if not name.startswith(CLASSICAL)]
    theirs = [_row(name, entry, results) for name, entry in results.items() if name.startswith(CLASSICAL)]
    lines = [title, *_rows(ours), *_rows(theirs)]
    for expectation in document["expectations"]:
        lines.append(paragraph(expectation["text"], f"  expected, {expectation['outcome']}: ", " " * 12))
    for check in document["checks"]:
        if not check["passed"]:
            lines.append(paragraph(check_failure(check), "  check failed: ", " " * 12))
    lines.append(f"  {document['verdict']}, in {folder}")
    return "\n".join([*lines, ""])


def _row(name: str, entry: dict[str, Any], others: Mapping[str, Any] | None = None) -> tuple[str, str, str]:
    """Name, value, meaning; a figure that repeats one of `others` for F = m a needs no meaning."""
    repeats = others is not None and name.removeprefix(CLASSICAL) in others
    return name, _value(entry), entry.get("note", "") if repeats else _meaning(entry)


def _rows(rows: Sequence[tuple[str, str, str]]) -> list[str]:
    names = max((len(name) for name, _, _ in rows), default=0)
    values = max((len(value) for _, value, _ in rows), default=0)
    rest = " " * (names + values + 6)
    return [paragraph(said, f"  {name:<{names}}  {value:<{values}}  ", rest).rstrip() for name, value, said in rows]


def _value(entry: dict[str, Any]) -> str:
    return figure_text(entry["value"], entry["error"], entry["unit"])


def figure_text(value: float | None, error: float | None, unit: str) -> str:
    """`0.1589 +- 0.0003 nm`; the error to two digits, the value to as many decimals."""
    if value is None:
        return "none"
    text = f"{value:.6g}" if error is None else _with_error(value, error)
    return f"{text} {unit}".rstrip()


def _with_error(value: float, error: float) -> str:
    """The error to two digits and the value to the same decimal place, at most twelve digits of it."""
    if error == 0:
        return f"{value:.6g} +- 0"
    last = math.floor(math.log10(error)) - 1
    digits = math.floor(math.log10(abs(value))) - last + 1 if value else 1
    return f"{value:.{min(max(digits, 1), 12)}g} +- {error:.2g}"


def _meaning(entry: dict[str, Any]) -> str:
    meaning, note = entry["meaning"], entry.get("note", "")
    return f"{meaning} ({note})" if note else str(meaning)


def check_failure(check: dict[str, Any]) -> str:
    measured = [f"{check[key]:.2g}" if check[key] is not None else "unknown" for key in ("value", "limit")]
    said = f"{check['name']} is {measured[0]}, limit {measured[1]}"
    return f"{said}; {check['advice']}" if check["advice"] else said
