"""The results of one run as text."""

from __future__ import annotations

from typing import Any

from ..reader import Run
from .words import paragraph

WIDEST_NAME = 30


def result_table(title: str, folder: str, run: Run) -> str:
    """Figures with bars and meanings, expectations, checks that failed, verdict and folder."""
    document = run.document
    rows = [(name, _value(entry), _meaning(entry)) for name, entry in document["results"].items()]
    names = min(max((len(name) for name, _, _ in rows), default=0), WIDEST_NAME)
    values = max((len(value) for _, value, _ in rows), default=0)
    lines = [title]
    for name, value, meaning in rows:
        first = f"  {name:<{names}}  {value:<{values}}  "
        lines.append(paragraph(meaning, first, " " * (names + values + 6)).rstrip())
    for expectation in document["expectations"]:
        lines.append(paragraph(expectation["text"], f"  expected, {expectation['outcome']}: ", " " * 12))
    for check in document["checks"]:
        if not check["passed"]:
            lines.append(paragraph(_failure(check), "  check failed: ", " " * 12))
    lines.append(f"  {document['verdict']}, in {folder}")
    return "\n".join([*lines, ""])


def _value(entry: dict[str, Any]) -> str:
    """`0.1589 +- 0.0003 nm`; the error to two digits, the value to as many decimals."""
    value, error = entry["value"], entry["error"]
    if value is None:
        return "none"
    text = f"{value:.6g}" if error is None else _with_error(value, error)
    return f"{text} {entry['unit']}".rstrip()


def _with_error(value: float, error: float) -> str:
    if not error:
        return f"{value:.6g} +- 0"
    bar = f"{error:.1e}" if error < 1e-3 or error >= 1e4 else f"{error:.2g}"
    digits = max(1, len(f"{abs(value) / error:.0f}") + 1) if abs(value) >= error else 1
    return f"{value:.{min(digits, 12)}g} +- {bar}"


def _meaning(entry: dict[str, Any]) -> str:
    meaning, note = entry["meaning"], entry.get("note", "")
    return f"{meaning} ({note})" if note else str(meaning)


def _failure(check: dict[str, Any]) -> str:
    measured = [f"{check[key]:.2g}" if check[key] is not None else "unknown" for key in ("value", "limit")]
    said = f"{check['name']} is {measured[0]}, limit {measured[1]}"
    return f"{said}; {check['advice']}" if check["advice"] else said
