"""Tables and figures for people and programs: series.csv, curves, results.csv, results.json.

CSV follows RFC 4180 with `\\n`, in UTF-8 without byte-order mark; the first line is the header. Numbers are
the shortest text that reads back to the same double. What is not a number stays an empty cell: pandas reads
it as missing, a spreadsheet leaves a gap in its chart (it would take `nan` for a word).
"""

from __future__ import annotations

import csv
import json
import math
from collections.abc import Iterable, Mapping, Sequence
from pathlib import Path
from typing import Any, Protocol

import numpy as np

from ..classical import Answer
from ..results import Array, Check, Column, Curve, Judgement, Result, Verdict
from .files import atomic

FORMAT = 1
TIME = Column("time", "time")
RESULT_HEADER = ("name", "value", "error", "unit", "scale", "meaning")


class Units(Protocol):
    """The file's units: the two things that outputs need of them."""

    def to_file(self, x: Any, dimension: str) -> Any: ...

    def label(self, dimension: str) -> str: ...


def write_series(
    path: Path,
    times: Array,
    columns: Sequence[Column],
    rows: Array,
    units: Units,
    errors: Mapping[str, Array] | None = None,
) -> None:
    """The time series: `times` of shape (rows,), `rows` of shape (rows, columns), both in scaled units.

    `errors` gives, by column name, the error of each row; it stands in a column `<name>.error`.
    """
    table = np.column_stack([times, np.asarray(rows).reshape(len(times), len(columns))])
    _write_table(path, (TIME, *columns), table, units, errors or {})


def write_curve(folder: Path, curve: Curve, units: Units, errors: Mapping[str, Array] | None = None) -> Path:
    """`<name>.csv` in `folder`; returns its path. `errors` as for `write_series`."""
    path = folder / f"{curve.name}.csv"
    _write_table(path, curve.columns, np.asarray(curve.rows), units, errors or {})
    return path


def write_results_csv(path: Path, results: Iterable[Result], units: Units) -> None:
    """One line a result, in the file's units."""
    with atomic(path) as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(RESULT_HEADER)
        for result in results:
            value, error, scale = (_text(_in_file(x, result, units)) for x in _figures(result))
            unit = units.label(result.dimension)
            writer.writerow((result.name, value, error, unit, scale, result.meaning))


def write_results_json(
    path: Path,
    *,
    job: str,
    fingerprint: str,
    verdict: Verdict,
    results: Sequence[Result],
    checks: Iterable[Check],
    judgements: Iterable[Judgement],
    units: Units,
    classical: Answer | Mapping[str, Any] | None = None,
    variant: Mapping[str, str] | None = None,
) -> None:
    """All figures of a run with what was judged about them; figures that can't be had are null.

    `variant` says, by key, what is varied and what it is in this run.
    """
    by_name = {result.name: _result(result, units) for result in results}
    if len(by_name) < len(results):
        raise ValueError("two results have one name")
    document: dict[str, Any] = {
        "format": FORMAT,
        "job": job,
        "fingerprint": fingerprint,
        **({"variant": dict(variant)} if variant else {}),
        "verdict": verdict,
        "results": by_name,
        "checks": [_check(check) for check in checks],
        "expectations": expectations(judgements),
    }
    if classical is not None:
        document["classical"] = _classical(classical, units) if isinstance(classical, Answer) else classical
    write_json(path, document)


def expectations(judgements: Iterable[Judgement]) -> list[dict[str, str]]:
    """What came of the expectations, as results.json has it."""
    return [{"result": j.result, "outcome": j.outcome, "text": j.text} for j in judgements]


def read_results(
    document: Mapping[str, Any], figures: Mapping[str, Column], units: Units
) -> tuple[list[Result], list[Check]]:
    """What `write_results_json` wrote, in scaled units again; `figures` gives the dimension of each result."""
    results = []
    for name, stored in document["results"].items():
        dimension = figures[name].dimension
        unit = 1 / units.to_file(1.0, dimension)

        def scaled(x: float | None, unit: float = unit) -> float | None:
            return None if x is None else x * unit

        converging = stored["error_status"] != "not_converging"  # else null there, but judged with what it was
        parts = {part: value * unit for part, value in stored["error_parts"].items() if value is not None}
        results.append(
            Result(
                name,
                scaled(stored["value"]),
                dimension,
                scaled(stored["scale"]),
                stored["meaning"],
                scaled(stored["error"]) if converging or not parts else sum(parts.values()),
                stored["error_status"],
                parts,
                stored.get("note", ""),
            )
        )
    return results, [Check(**check) for check in document["checks"]]


def write_json(path: Path, document: Mapping[str, Any]) -> None:
    """`document` as strict JSON (no NaN), two spaces deep."""
    text = json.dumps(document, indent=2, ensure_ascii=False, allow_nan=False)
    with atomic(path) as file:
        file.write(text + "\n")


def heading(name: str, unit: str) -> str:
    """`name [unit]`, or the name alone where there is no unit."""
    return f"{name} [{unit}]" if unit else name


def _write_table(path: Path, columns: Sequence[Column], rows: Array, units: Units, errors: Mapping[str, Array]) -> None:
    header: list[str] = []
    table: list[list[float]] = []
    for column, values in zip(columns, rows.T, strict=True):
        unit = units.label(column.dimension)
        header.append(heading(column.name, unit))
        table.append(units.to_file(values, column.dimension).tolist())
        if column.name in errors:
            header.append(heading(f"{column.name}.error", unit))
            table.append(units.to_file(np.asarray(errors[column.name]), column.dimension).tolist())
    with atomic(path) as file:
        writer = csv.writer(file, lineterminator="\n")
        writer.writerow(header)
        writer.writerows([_text(value) for value in row] for row in zip(*table, strict=True))


def _text(value: float | None) -> str:
    return "" if value is None or math.isnan(value) else repr(float(value))


def _figures(result: Result) -> tuple[float | None, float | None, float | None]:
    """Value, error (none unless it was estimated) and scale, in scaled units."""
    return result.value, result.error if result.error_status == "estimated" else None, result.scale


def _in_file(x: float | None, result: Result, units: Units) -> float | None:
    return None if x is None else float(units.to_file(x, result.dimension))


def _finite(x: float | None) -> float | None:
    return float(x) if x is not None and math.isfinite(x) else None


def _result(result: Result, units: Units) -> dict[str, Any]:
    value, error, scale = (_finite(_in_file(x, result, units)) for x in _figures(result))
    parts = {name: _finite(_in_file(part, result, units)) for name, part in result.error_parts.items()}
    note = result.note
    if value is None and not note:
        note = "not computed" if result.value is None else f"came out as {result.value}"
    return {
        "value": value,
        "error": error,
        "scale": scale,
        "unit": units.label(result.dimension),
        "error_status": result.error_status,
        "error_parts": parts,
        "meaning": result.meaning,
        **({"note": note} if note else {}),
    }


def _classical(answer: Answer, units: Units) -> dict[str, Any]:
    def time(t: float | None) -> float | None:
        return None if t is None else float(units.to_file(t, "time"))

    return {
        "sentence": answer.sentence,
        "trajectories": answer.trajectories,
        "largest_gap": _finite(answer.largest_gap),
        "gap_time": time(answer.gap_time),
        "gap_opens": time(answer.opens),
        "time_unit": units.label("time"),
        "enough": list(answer.enough),
        "not_enough": list(answer.not_enough),
        "undecided": list(answer.undecided),
    }


def _check(check: Check) -> dict[str, Any]:
    return {
        "name": check.name,
        "passed": bool(check.passed),
        "value": _finite(check.value),
        "limit": _finite(check.limit),
        "reason": check.reason,
        "advice": check.advice,
    }
