"""variants.csv and the pictures of a varied job."""

from __future__ import annotations

import csv
import math
from pathlib import Path

import numpy as np
import pytest
from PIL import Image

from wavejob import api
from wavejob.families import Family, parse_family
from wavejob.outputs.run_tree import VARIANTS
from wavejob.outputs.varied import Axis, Outcome, draw_varied
from wavejob.variants import Sweep

JOB = """\
units: {length: nm, time: fs, energy: meV}
particle: electron
grid: {x: {from: -60 nm, to: 60 nm, points: 400}}
packet: {gaussian: {at: 0 nm, sigma: 4 nm, velocity: 0.5 nm/fs}}
evolve: {until: 20 fs, step: 0.2 fs}
observables: [position]
classical: none
error_bars: none
film: none
edges: {x: wrap}
"""


@pytest.fixture(scope="module")
def swept(tmp_path_factory: pytest.TempPathFactory) -> tuple[Family, Path]:
    """A free packet at three velocities for 20 fs."""
    text = JOB + "vary: [{packet.gaussian.velocity: {from: 0.25 nm/fs, to: 0.75 nm/fs, points: 3}}]\n"
    text += "expect: [{result: position.x.final, above: 7 nm}]\n"
    runs = tmp_path_factory.mktemp("runs")
    family = parse_family(text)
    assert [one.verdict for one in api.run_family(family, runs)] == ["failed", "trusted", "trusted"]
    return family, runs


def rows(folder: Path) -> list[list[str]]:
    with (folder / VARIANTS).open(encoding="utf-8", newline="") as file:
        return list(csv.reader(file))


def test_the_table_has_a_row_a_variant_with_what_ehrenfest_says(swept: tuple[Family, Path]) -> None:
    """The mean place of a free packet moves with its mean velocity (Ehrenfest 1927)."""
    family, runs = swept
    header, *table = rows(runs / "job")
    assert header[0] == "packet.gaussian.velocity [nm/fs]"
    assert header[-2:] == ["verdict", "fingerprint"]
    place = header.index("position.x.final [nm]")
    assert [row[0] for row in table] == ["0.25", "0.5", "0.75"]
    assert [float(row[place]) for row in table] == pytest.approx([5.0, 10.0, 15.0], rel=1e-6)
    assert [row[-2:] for row in table] == [
        [verdict, job.fingerprint] for verdict, job in zip(["failed", "trusted", "trusted"], family.jobs, strict=True)
    ]


def test_each_expected_result_has_a_picture(swept: tuple[Family, Path]) -> None:
    _, runs = swept
    (path,) = (runs / "job").glob("*.png")
    assert path.name == "variants_position.x.final.png"
    with Image.open(path) as picture:
        assert picture.size == (1200, 760)


def test_every_folder_says_which_variant_it_is(swept: tuple[Family, Path]) -> None:
    family, runs = swept
    run = api.open_run(runs / "job" / family.jobs[1].fingerprint)
    said = {"packet.gaussian.velocity": "0.5 nm/fs"}
    assert run.document["variant"] == run.manifest["variant"] == said


def test_what_did_not_run_has_empty_cells(swept: tuple[Family, Path], tmp_path: Path) -> None:
    family, runs = swept
    sweep = Sweep(family, runs)
    sweep.note(1)
    sweep.runs = tmp_path
    (tmp_path / "job").mkdir()
    sweep.write()
    table = rows(tmp_path / "job")[1:]
    assert all(cell == "" for cell in table[0][1:-1])
    assert table[1][-2] == "trusted"
    assert np.isnan(sweep.figure("position.x.final", "value")).tolist() == [True, False, True]


def test_colours_of_a_map_follow_the_values(tmp_path: Path) -> None:
    """Highest and lowest value take the ends of the scale; a variant without the result is grey."""
    values = np.array([[0.0, 1.0], [2.0, math.nan]])
    axes = [Axis("a", "nm", np.array([1.0, 2.0])), Axis("b", None, np.array([0.0, 1.0]), ("up", "down"))]
    draw_varied(tmp_path / "map.png", "A map", axes, Outcome("T", "", None, values, np.full((2, 2), math.nan)))
    with Image.open(tmp_path / "map.png") as picture:
        at = {(a, b): picture.getpixel((150 + 205 + 410 * a, 120 + 397 - 265 * b))[:3] for a in (0, 1) for b in (0, 1)}  # type: ignore[index]
    ends = {(0, 0): (0, 34, 78), (1, 0): (254, 232, 56)}  # of cividis (Nunez, Anderton and Renslow 2018)
    for spot, colour in ends.items():
        assert max(abs(a - b) for a, b in zip(at[spot], colour, strict=True)) <= 1
    assert at[1, 1] == (222, 219, 211)


@pytest.mark.parametrize("count", [1, 2, 100])
def test_points_are_drawn_whatever_their_number_and_value(tmp_path: Path, count: int) -> None:
    for values in (np.zeros(count), np.full(count, 1e-9), np.linspace(-1, 1e6, count)):
        outcome = Outcome("T", "what it means", "meV", values, np.abs(values) / 10)
        draw_varied(tmp_path / "points.png", "Points", [Axis("a", None, np.arange(count, dtype=float))], outcome)
        words = tuple(f"word {n}" for n in range(count))
        axis = Axis("a", None, np.arange(count, dtype=float), words)
        draw_varied(tmp_path / "words.png", "Words", [axis], outcome)
