"""What the variants of a job yielded, side by side: `variants.csv`, and a picture of each result that is expected."""

from __future__ import annotations

import csv
from dataclasses import dataclass, field
from pathlib import Path
from typing import Any

import numpy as np

from .families import Family
from .outputs.files import atomic
from .outputs.folder import RunFolder
from .outputs.run_tree import VARIANTS
from .outputs.tables import heading
from .reader import Run
from .reading.quantities import Units

Array = np.ndarray


@dataclass(frozen=True)
class Scale:
    """One varied key over all variants: numbers in the file's `unit` (None: plain), or words."""

    name: str
    unit: str | None
    cells: tuple[str, ...]  # one a variant, as it stands in the table
    numbers: Array | None  # (variants,)


@dataclass
class Sweep:
    """A family and what is known of its runs so far; `note` is told of each variant that ended."""

    family: Family
    runs: Path
    documents: dict[int, dict[str, Any]] = field(default_factory=dict)

    @property
    def folder(self) -> Path:
        return self.runs.joinpath(*self.family.id.split("/"))

    def note(self, index: int) -> None:
        """Reads the results of variant `index`, if its run is finished."""
        job = self.family.jobs[index]
        folder = RunFolder(self.runs, job.id, job.fingerprint)
        self.documents.pop(index, None)
        if folder.finished() is not None:
            self.documents[index] = Run(folder.path).document

    def note_all(self) -> None:
        for index in range(len(self.family.jobs)):
            self.note(index)

    def scales(self) -> list[Scale]:
        """What is varied."""
        return [_scale(self.family, place) for place in range(len(self.family.walks.keys))]

    def results(self) -> dict[str, dict[str, Any]]:
        """Every result that any variant has, as the first of them has it."""
        found: dict[str, dict[str, Any]] = {}
        for index in sorted(self.documents):
            for name, entry in self.documents[index]["results"].items():
                found.setdefault(name, entry)
        return found

    def figure(self, name: str, part: str) -> Array:
        """`value` or `error` of a result in every variant, shape (variants,), nan where there is none."""
        entries = [self.documents.get(index, {}).get("results", {}) for index in range(len(self.family.jobs))]
        cells = [entry.get(name, {}).get(part) for entry in entries]
        return np.array([np.nan if cell is None else cell for cell in cells], dtype=float)

    def write(self) -> None:
        """Writes variants.csv anew: one row a variant. Raises RunError where it cannot be written."""
        scales, results = self.scales(), self.results()
        header = [heading(scale.name, scale.unit or "") for scale in scales]
        for name, entry in results.items():
            header += [heading(name, entry["unit"]), heading(f"{name}.error", entry["unit"])]
        with atomic(self.folder / VARIANTS) as file:
            writer = csv.writer(file, lineterminator="\n")
            writer.writerow([*header, "verdict", "fingerprint"])
            for index, job in enumerate(self.family.jobs):
                document = self.documents.get(index, {"results": {}, "verdict": ""})
                cells = [scale.cells[index] for scale in scales]
                for name in results:
                    entry = document["results"].get(name, {})
                    cells += [_cell(entry.get("value")), _cell(entry.get("error"))]
                writer.writerow([*cells, document["verdict"], job.fingerprint])

    def draw(self) -> list[Path]:
        """A picture of each expected result: a curve where one walk is varied, a map where two are."""
        from .outputs.varied import Outcome, draw_varied  # here, because it loads matplotlib

        walks, results = self.family.walks.walks, self.results()
        if len(walks) not in (1, 2):
            return []
        shape = tuple(walk.steps for walk in walks)
        axes = [self._axis(place) for place in range(len(walks))]
        drawn = []
        for name in self.family.expected:
            values = self.figure(name, "value").reshape(shape)
            if name not in results or not np.isfinite(values).any():
                continue
            entry, number = results[name], self.family.jobs[0].figures[name].dimension == "number"
            errors = self.figure(name, "error").reshape(shape)
            unit = None if number else entry["unit"]
            path = self.folder / f"variants_{name}.png"
            draw_varied(path, self.family.title, axes, Outcome(name, entry["meaning"], unit, values, errors))
            drawn.append(path)
        return drawn

    def _axis(self, place: int) -> Any:
        """The axis of one walk: its first key stands for those that walk in step with it."""
        from .outputs.varied import Axis

        walks = self.family.walks.walks
        scale = self.scales()[sum(len(walk.keys) for walk in walks[:place])]
        inner = int(np.prod([walk.steps for walk in walks[place + 1 :]]))
        steps = [step * inner for step in range(walks[place].steps)]
        if scale.numbers is not None:
            return Axis(scale.name, scale.unit, scale.numbers[steps])
        return Axis(scale.name, None, np.arange(len(steps), dtype=float), tuple(scale.cells[step] for step in steps))


def _scale(family: Family, place: int) -> Scale:
    varied = [job.variant[place] for job in family.jobs]
    units: Units = family.jobs[0].units
    kinds = {one.dimension for one in varied} - {"number"} or {"number"}
    if len(kinds) > 1 or any(one.value is None for one in varied):
        return Scale(varied[0].key, None, tuple(one.text for one in varied), None)
    (kind,) = kinds
    numbers = [float(f"{units.to_file(one.value, kind):.12g}") for one in varied if one.value is not None]
    unit = None if kind == "number" else units.label(kind)
    return Scale(varied[0].key, unit, tuple(repr(number) for number in numbers), np.array(numbers))


def _cell(value: float | None) -> str:
    return "" if value is None else repr(float(value))
