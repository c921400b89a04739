"""The catalogue of truth: every case at four accuracies, its results against outside values, in one table.

`python -m tests.truth.catalogue [--write FOLDER] [--command] [--only WORD]`. Coverage is the share of results whose
actual error lies within the error bar, sharpness the median of bar over actual error. Each outside value has one vote
at each accuracy; it counts where it is known to a tenth of the bar, and where the error is more than rounding.
"""

from __future__ import annotations

import argparse
import csv
import json
import math
import os
import subprocess
import sys
import tempfile
import time
from collections.abc import Iterable, Sequence
from concurrent.futures import ProcessPoolExecutor
from dataclasses import dataclass
from datetime import UTC, datetime
from pathlib import Path
from typing import Literal

import numpy as np

from tests.truth.cases import CASES
from tests.truth.cases.case import Case, Outside
from wavejob.evidence.assess import assess
from wavejob.grid import fast_size
from wavejob.loading import parse
from wavejob.plan import make_plan
from wavejob.simulate import Record

ACCURACIES = (1e-2, 1e-3, 1e-4, 1e-5)
KNOWN = 0.1  # of the bar, to which an outside value must be known
WANTED = {"coverage": 0.98, "three bars": 0.995, "algebraic": 20.0, "spectral": 100.0}
# Fixed points and steps, each finer than the one before: case, result, (points, steps) of the coarsest run.
SHRINKING = (
    ("barrier, tunnelling, in the middle", "right.final", 600, 1200),
    ("step below its top, in the middle", "near.final", 400, 1000),
    ("sech2 barrier, in the middle", "right.final", 400, 960),
    ("Morse oscillator", "position.x.final", 60, 480),
    ("skew oscillator", "width.x.final", 64, 400),
)
LEVELS = 3
COLUMNS = (
    "case",
    "accuracy",
    "result",
    "outside value",
    "ours",
    "bar",
    "actual error",
    "bar / error",
    "standing",
    "source",
)

Standing = Literal["counted", "rounding", "not known well enough", "no bar"]


@dataclass(frozen=True)
class Vote:
    """One result of one run against its outside value. `scale` is what its errors are measured by."""

    case: str
    error_kind: str
    harsh: str
    source: str
    accuracy: float
    result: str
    outside: float
    known: float
    ours: float
    bar: float
    rounding: float
    scale: float

    @property
    def error(self) -> float:
        return abs(self.ours - self.outside)

    @property
    def ratio(self) -> float:
        """Bar over actual error."""
        return self.bar / self.error if self.error > 0 else math.inf

    @property
    def standing(self) -> Standing:
        if not math.isfinite(self.bar):
            return "no bar"
        if max(self.bar, self.error) <= 10 * self.rounding + 1e-12 * max(self.scale, abs(self.outside)):
            return "rounding"
        return "counted" if self.known <= KNOWN * self.bar else "not known well enough"


def measured(record: Record, outside: Outside) -> tuple[float, float, float, float]:
    """A result, its bar, the part of it that is rounding, and its scale; of a curve at one place."""
    name, *place = outside.result.split()
    if not place:
        result = record.result(name)
        value = math.nan if result.value is None else result.value
        bar = math.inf if result.error is None else result.error
        return value, bar, result.error_parts.get("rounding", 0.0), result.scale or 1.0
    column, at = place[0], float(place[1])
    curve = next(c for c in record.curves if c.name == name)
    index = [c.name for c in curve.columns].index(column)
    row = int(np.argmin(np.abs(curve.rows[:, 0] - at)))
    bar = float((record.curve_errors or {})[name][column][row])
    return float(curve.rows[row, index]), bar, record.norm_drift, 1.0


def votes(case: Case, accuracy: float) -> list[Vote]:
    """The case run at one accuracy, within this process."""
    record = assess(make_plan(parse(case.job(accuracy)))).record
    return [vote(case, accuracy, o, *measured(record, o)) for o in case.outside()]


def vote(case: Case, accuracy: float, o: Outside, ours: float, bar: float, rounding: float, scale: float) -> Vote:
    return Vote(
        case.name,
        case.error,
        case.harsh,
        case.source,
        accuracy,
        o.result,
        float(o.value),
        o.known,
        ours,
        bar,
        rounding,
        scale,
    )


def shrinking(case: Case, result: str, points: int, steps: int) -> list[tuple[int, int, Vote]]:
    """The case with LEVELS fixed settings, each with 1.4 times the points and half the step of the one before."""
    wanted = next(o for o in case.outside() if o.result == result)
    found = []
    for level in range(LEVELS):
        finer = fast_size(round(points * 2 ** (level / 2)))
        record = assess(make_plan(parse(case.fixed(finer, steps * 2**level)))).record
        found.append((finer, steps * 2**level, vote(case, math.nan, wanted, *measured(record, wanted))))
    return found


def command_votes(cases: Sequence[Case], folder: Path) -> list[Vote]:
    """All cases at all accuracies through `wavejob run` on a folder of job files."""
    named = {}
    for number, case in enumerate(cases):
        for accuracy in (a for a in ACCURACIES if a >= case.finest):
            path = folder / f"{number:02d}_{accuracy:.0e}.yml"
            path.write_text(case.job(accuracy), encoding="utf-8")
            named[path.stem] = case, accuracy
    done = subprocess.run(
        [sys.executable, "-m", "wavejob", "run", str(folder), "--runs", str(folder / "runs")], check=False
    )
    if done.returncode > 1:
        raise SystemExit(f"wavejob run ended with {done.returncode}")
    found = []
    for stem, (case, accuracy) in named.items():
        written = next((folder / "runs" / stem).glob("*/results.json"))
        results = json.loads(written.read_text(encoding="utf-8"))["results"]
        for o in case.outside():
            found.append(vote(case, accuracy, o, *_read(written.parent, results, o)))
    return found


def _read(folder: Path, results: dict[str, dict[str, object]], o: Outside) -> tuple[float, float, float, float]:
    """The same as `measured`, from the files of a run."""
    name, *place = o.result.split()
    if not place:
        result = results[name]
        value, bar = (math.nan if x is None else float(str(x)) for x in (result["value"], result["error"]))
        parts = result["error_parts"]
        rounding = float(parts.get("rounding", 0.0)) if isinstance(parts, dict) else 0.0
        return value, bar, rounding, float(str(result["scale"]))
    column, at = place[0], float(place[1])
    with (folder / f"{name}.csv").open(encoding="utf-8", newline="") as file:
        rows = list(csv.DictReader(file))
    first = next(iter(rows[0]))
    row = min(rows, key=lambda r: abs(float(r[first]) - at))
    return float(row[column]), float(row[f"{column}.error"]), 0.0, 1.0


def share(values: Iterable[bool]) -> float:
    """Share of True; 1 where there is nothing."""
    listed = list(values)
    return sum(listed) / len(listed) if listed else 1.0


def figures(found: Sequence[Vote]) -> dict[str, float]:
    """Coverage and sharpness of the votes that count."""
    counted = [v for v in found if v.standing == "counted"]
    by_kind = {kind: [v.ratio for v in counted if v.error_kind == kind] for kind in ("algebraic", "spectral")}
    return {
        "values": len(counted),
        "coverage": share(v.error <= v.bar for v in counted),
        "three bars": share(v.error <= 3 * v.bar for v in counted),
        **{kind: float(np.median(ratios)) if ratios else math.nan for kind, ratios in by_kind.items()},
    }


def summary(found: Sequence[Vote]) -> str:
    """The table of coverage and sharpness, as Markdown."""
    groups = [("all", list(found))]
    groups += [(f"accuracy {a:g}", [v for v in found if v.accuracy == a]) for a in ACCURACIES]
    groups += [(h, [v for v in found if v.harsh == h]) for h in ("short layer", "tight box", "early stop")]
    lines = [
        "| | values | within the bar | within three bars | bar / error, algebraic | bar / error, spectral |",
        "| --- | --- | --- | --- | --- | --- |",
        f"| wanted | | {WANTED['coverage']:.1%} | {WANTED['three bars']:.1%} | at most {WANTED['algebraic']:g} "
        f"| at most {WANTED['spectral']:g} |",
    ]
    for name, group in groups:
        f = figures(group)
        sharp = [f"{f[kind]:.1f}" if math.isfinite(f[kind]) else "–" for kind in ("algebraic", "spectral")]
        lines.append(
            f"| {name} | {f['values']:.0f} | {f['coverage']:.1%} | {f['three bars']:.1%} | {sharp[0]} | {sharp[1]} |"
        )
    apart = {s: sum(v.standing == s for v in found) for s in ("rounding", "not known well enough", "no bar")}
    within = share(v.error <= max(v.bar, 1e-11 * max(v.scale, 1.0)) for v in found if v.standing == "rounding")
    return "\n".join(lines) + (
        f"\n\nNot counted: {apart['rounding']} at the rounding floor ({within:.1%} of them within the bar or 1e-11), "
        f"{apart['not known well enough']} whose outside value is not known to a tenth of the bar, "
        f"{apart['no bar']} without a bar.\n"
    )


def shrunk(found: Sequence[tuple[int, int, Vote]]) -> str:
    """How bars shrink with step and spacing, as Markdown."""
    head = "| case | result | points | steps | bar | actual error |\n| --- | --- | --- | --- | --- | --- |\n"
    return head + "\n".join(
        f"| {v.case} | {v.result} | {points} | {steps} | {v.bar:.1e} | {v.error:.1e} |" for points, steps, v in found
    )


def row(v: Vote) -> tuple[str, ...]:
    return (
        v.case,
        f"{v.accuracy:.0e}",
        v.result,
        f"{v.outside:.10g}",
        f"{v.ours:.10g}",
        f"{v.bar:.1e}",
        f"{v.error:.1e}",
        f"{v.ratio:.2g}",
        v.standing,
        v.source,
    )


def table(found: Sequence[Vote]) -> str:
    """All votes as text; the source stands in the file that is written."""
    rows = [COLUMNS[:-1], *(row(v)[:-1] for v in found)]
    widths = [max(len(r[i]) for r in rows) for i in range(len(rows[0]))]
    return "\n".join("  ".join(cell.ljust(w) for cell, w in zip(r, widths, strict=True)).rstrip() for r in rows)


def write(found: Sequence[Vote], finer: Sequence[tuple[int, int, Vote]], folder: Path) -> None:
    """catalogue.csv with every vote, summary.md with what it comes to."""
    with (folder / "catalogue.csv").open("w", encoding="utf-8", newline="") as file:
        csv.writer(file, lineterminator="\n").writerows([COLUMNS, *map(row, found)])
    jobs, values = len({v.case for v in found}), len({(v.case, v.result) for v in found})
    harsh = share(v.harsh != "" for v in found)
    (folder / "summary.md").write_text(
        f"# Error bars against the truth\n\n{values} outside values in {jobs} jobs, each at accuracies "
        f"{', '.join(f'{a:g}' for a in ACCURACIES)} (a few slow ones not at the last); "
        f"{harsh:.0%} with short layers, tight boxes or early stops. "
        f"{datetime.now(UTC):%Y-%m-%d}, `python -m tests.truth.catalogue --write tests/truth`; every value, with its "
        f"source, stands in `catalogue.csv`.\n\n{summary(found)}\n"
        f"Bars shrink as step and spacing do:\n\n{shrunk(finer)}\n",
        encoding="utf-8",
    )


def _work(task: tuple[int, float]) -> list[Vote]:
    case, accuracy = CASES[task[0]], task[1]
    begun = time.process_time()
    found = votes(case, accuracy)
    print(f"{case.name}, {accuracy:g}: {time.process_time() - begun:.1f} s", file=sys.stderr, flush=True)
    return found


def main() -> None:
    parser = argparse.ArgumentParser(description="Error bars against the truth.")
    parser.add_argument("--write", type=Path, metavar="FOLDER", help="write catalogue.csv and summary.md there")
    parser.add_argument("--command", action="store_true", help="through `wavejob run` on a folder of job files")
    parser.add_argument("--only", default="", metavar="WORD", help="cases whose name holds it")
    parser.add_argument("--down-to", type=float, default=1e-5, metavar="ACCURACY", help="leave finer ones out")
    asked = parser.parse_args()
    accuracies = [a for a in ACCURACIES if a >= asked.down_to]
    chosen = [number for number, case in enumerate(CASES) if asked.only in case.name]
    if asked.command:
        with tempfile.TemporaryDirectory() as folder:
            found = command_votes([CASES[n] for n in chosen], Path(folder))
    else:
        os.environ["OMP_NUM_THREADS"] = "1"
        with ProcessPoolExecutor(len(os.sched_getaffinity(0))) as pool:
            tasks = [(n, a) for n in chosen for a in accuracies if a >= CASES[n].finest]
            found = [v for some in pool.map(_work, tasks) for v in some]
    print(table(found))
    print("\nmisses:")
    print(table([v for v in found if v.standing == "counted" and not v.error <= v.bar]))
    print(f"\n{summary(found)}")
    named = {case.name: case for case in CASES}
    finer = [level for name, *settings in SHRINKING for level in shrinking(named[name], *settings)]
    print(shrunk(finer))
    if asked.write:
        write(found, finer, asked.write)


if __name__ == "__main__":
    main()
