"""What a run yields: results, columns, curves, checks. Values stay in scaled units until written."""

from __future__ import annotations

from dataclasses import dataclass, field
from typing import Literal

import numpy as np

Array = np.ndarray


@dataclass(frozen=True)
class Column:
    """One column of a table: its name, the dimension of its values, what it means."""

    name: str
    dimension: str = "number"
    meaning: str = ""


@dataclass(frozen=True)
class Result:
    """One figure. `value` is None where it cannot be had; `note` then says why."""

    name: str
    value: float | None
    dimension: str = "number"
    scale: float | None = 1.0
    meaning: str = ""
    error: float | None = None
    error_status: Literal["estimated", "not_converging", "off"] = "off"
    error_parts: dict[str, float] = field(default_factory=dict)
    note: str = ""


@dataclass(frozen=True)
class Curve:
    """A table of its own, written as `<name>.csv`; `rows` has shape (rows, columns), nan where there is no value.

    `errors` is what the method itself adds to the error bars: column name -> shape (rows,).
    """

    name: str
    columns: tuple[Column, ...]
    rows: Array
    errors: dict[str, Array] = field(default_factory=dict)


@dataclass(frozen=True)
class Check:
    """What a run judged about itself; `advice` names the key to change and a value that would pass."""

    name: str
    passed: bool
    value: float | None
    limit: float | None
    reason: str = ""  # why this limit
    advice: str = ""


@dataclass(frozen=True)
class Judgement:
    """One expectation of the job file, judged."""

    result: str
    outcome: Literal["met", "missed", "undecided"]
    text: str


@dataclass(frozen=True)
class Accuracy:
    """The error wanted: `absolute` times the scale of a result, or `relative` times its value where that is more."""

    absolute: float
    relative: float = 0.0

    def limit(self, result: Result) -> float:
        """The largest error accepted for a result."""
        return max(self.absolute * (result.scale or 1.0), self.relative * abs(result.value or 0.0))

    @property
    def first(self) -> float:
        """What to begin with, where values are not known yet."""
        return max(self.absolute, self.relative / 10)

    def __str__(self) -> str:
        return f"{self.relative:g} of the value, down to {self.absolute:g}" if self.relative else f"{self.absolute:g}"


Verdict = Literal["trusted", "doubtful", "failed"]
