"""A comparison as text and as JSON."""

from __future__ import annotations

import math
from collections.abc import Mapping, Sequence
from typing import Any

from ..evidence.comparison import Comparison, Measured, Outcome
from .results import figure_text
from .sizes import counted
from .words import paragraph

# The more telling first: that of a job is the first that one of its results has.
OUTCOMES: tuple[Outcome, ...] = ("differs", "vanished", "appeared", "undecided", "same")
ONE_SIDED = ("appeared", "vanished")


def block(job: str, outcome: Outcome, results: Sequence[Comparison]) -> str:
    """What became of a job: a line for each result that is not the same; one for a job on one side only."""
    told = [result for result in results if result.outcome != "same"]
    if outcome in ONE_SIDED and all(result.outcome == outcome for result in results):
        return f"{job}: {outcome}, with {counted(len(results), 'result')}"
    names = max(len(result.result) for result in told)
    outcomes = max(len(result.outcome) for result in told)
    lines = [
        paragraph(
            _sentence(result),
            f"  {result.result:<{names}}  {result.outcome:<{outcomes}}  ",
            " " * (names + outcomes + 6),
        )
        for result in told
    ]
    return "\n".join([job, *lines])


def most_telling(results: Sequence[Comparison]) -> Outcome:
    """The most telling outcome among the results of a job."""
    found = {result.outcome for result in results}
    return next((outcome for outcome in OUTCOMES if outcome in found), "same")


def tally(counts: Mapping[Outcome, int]) -> str:
    """`12 results same, 1 differs`."""
    parts = [f"{counts[outcome]} {outcome}" for outcome in reversed(OUTCOMES) if counts.get(outcome)]
    return ", ".join(parts) or "no results"


def entry(job: str, result: Comparison) -> dict[str, Any]:
    """One result for `--format json`."""
    return {
        "job": job,
        "result": result.result,
        "outcome": result.outcome,
        "before": _figure(result.before),
        "after": _figure(result.after),
        "difference": _finite(result.difference),
        "allowed": _finite(result.allowed),
        "reason": result.reason,
    }


def _sentence(result: Comparison) -> str:
    if result.before is None or result.after is None:
        return _text(result.before or result.after)
    said = f"{_text(result.before)} -> {_text(result.after)}"
    if result.difference is None:
        return f"{said}: {result.reason}"
    said += f", changed by {result.difference:.2g}"
    return f"{said}; {result.reason}" if result.allowed is None else f"{said}, bars allow {result.allowed:.2g}"


def _text(figure: Measured | None) -> str:
    return figure_text(figure.value, figure.error, figure.unit) if figure else ""


def _figure(figure: Measured | None) -> dict[str, Any] | None:
    if figure is None:
        return None
    return {"value": _finite(figure.value), "error": _finite(figure.error), "unit": figure.unit}


def _finite(x: float | None) -> float | None:
    return x if x is not None and math.isfinite(x) else None
