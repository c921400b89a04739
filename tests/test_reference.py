"""The reference pages: complete, and in step with what a run writes."""

from __future__ import annotations

import json
import re
from pathlib import Path

import pytest

from wavejob import checks, job, plan, reference, timetable, wigner
from wavejob.cli import prune
from wavejob.evidence import assess, bars, companions, comparison
from wavejob.loading import parse
from wavejob.outputs.folder import OWNER
from wavejob.reading import merging
from wavejob.run import run_job

PAGES = Path(reference.__file__).parent

# All that shows: a sharp edge, a layer, open ends at the other side, a curve, a level, integrals over time.
JOB = """
units: natural
grid: {x: {from: -60, to: 60, points: 480}}
potential: [{barrier: {from: -0.5, to: 0.5, height: 0.6}}]
edges: {x: {absorb: 15}}
packet: {gaussian: {at: -20, sigma: 4, wavenumber: 1}}
evolve: {until: 40, accuracy: 1e-2}
observables:
  - norm
  - autocorrelation
  - dwell: {name: inner, from: -1, to: 1}
  - crossing: {name: out, x: 8, toward: +x}
film: none
"""


@pytest.fixture(scope="module")
def folder(tmp_path_factory: pytest.TempPathFactory) -> Path:
    return run_job(parse(JOB), tmp_path_factory.mktemp("runs")).folder


def test_every_page_has_a_place_in_the_order() -> None:
    assert sorted(reference.TOPICS) == sorted(path.stem for path in PAGES.glob("*.md"))


@pytest.mark.parametrize("name", reference.TOPICS)
def test_a_page_begins_with_its_title(name: str) -> None:
    assert re.match(r"# \S.*\n\n", reference.text(name))
    assert reference.topics()[name] in reference.text(name)


def test_an_unknown_page_is_a_mistake_of_the_caller() -> None:
    with pytest.raises(KeyError):
        reference.text("../version")


@pytest.mark.parametrize("name", reference.TOPICS)
def test_pages_point_to_pages_that_are_there(name: str) -> None:
    for word in re.findall(r"wavejob\s+explain ([a-z]+-[a-z-]+)", reference.text(name)):
        assert word in reference.TOPICS


def test_every_file_of_a_run_is_described(folder: Path) -> None:
    page = reference.text("run-folder")
    left = [file.name for file in folder.iterdir() if f"`{file.name}`" not in page]
    assert left == ["autocorrelation.csv"]  # stands there as `<name>.csv`
    assert f"`{OWNER}`" in page


def test_every_check_of_a_run_is_described(folder: Path) -> None:
    page = reference.text("verdict")
    checks = json.loads((folder / "results.json").read_text(encoding="utf-8"))["checks"]
    names = [re.sub("inner|out$", "NAME", check["name"]) for check in checks]
    assert {"norm", "NAME: run length", "absorber reflection x.low"} < set(names)
    assert [name for name in names if f"`{name}`" not in page] == []


def test_every_part_of_an_error_is_described(folder: Path) -> None:
    page = reference.text("error-bars")
    results = json.loads((folder / "results.json").read_text(encoding="utf-8"))["results"]
    parts = {part for result in results.values() for part in result["error_parts"]}
    assert {"rounding", "recording", "run length"} < parts
    assert [part for part in parts if f"`{part}`" not in page] == []


@pytest.mark.parametrize(
    ("page", "said", "value"),
    [
        ("error-bars", r"factor (\S+) for smooth", bars.SMOOTH),
        ("error-bars", r"smooth potentials, (\S+) where there are sharp edges", bars.SHARP),
        ("error-bars", r"finer and the factor (\S+)\. ", bars.FINER),
        ("error-bars", r"and (\S+) of the points", round(companions.COARSER_POINTS, 1)),
        ("error-bars", r"more than (\S+) of the accuracy", assess.EDGE_SHARE),
        ("error-bars", r"a grid (\S+) % longer", 100 * companions.EXTENSION),
        ("grid-ends", r"judged against\s(\S+);", checks.REFLECTION_LIMIT),
        ("grid-ends", r"more than (\S+) is in the outermost", checks.EDGE_LIMIT),
        ("verdict", r"more than (\S+) of the packet is beyond 0.8", checks.HEAD_ROOM_LIMIT),
        ("verdict", r"beyond (\S+) of the largest that the points", checks.RESOLVED),
        ("bases", r"(\d+) files below", merging.LONGEST_CHAIN),
        ("choices", r"`evolve.accuracy` \| (\S+) \|", job.DEFAULT_ACCURACY),
        ("choices", r"about (\d+) rows", timetable.ROWS),
        ("choices", r"about (\d+) frames", plan.FRAMES),
        ("compare", r"agree to (\S+) of themselves", comparison.ROUNDING),
        ("prune", r"newest first: (\d+) if left out", prune.KEPT),
        ("classical-companion", r"spread of (\d+) groups", wigner.GROUPS),
    ],
)
def test_numbers_are_those_of_the_code(page: str, said: str, value: float) -> None:
    (number,) = re.findall(said, reference.text(page))
    assert float(number) == pytest.approx(value)
