"""Good job files, changed at random: what comes out is read or refused, without traceback, before long."""

from __future__ import annotations

import time
from copy import deepcopy
from pathlib import Path
from typing import Any

import pytest
import yaml
from hypothesis import HealthCheck, given, settings
from hypothesis import strategies as st

from wavejob.loading import parse
from wavejob.plan import make_plan
from wavejob.problems import JobFileError

FOLDER = Path(__file__).parent / "bad_jobs"
ALLOWED = 130 * 2**20  # bytes: grids are refused beyond some 8000 points, which keeps planning quick
PATIENCE = 20.0  # seconds of processor time; a usual job takes a hundredth

GOOD = (
    """\
units: {length: nm, time: fs, energy: meV}
job: Two barriers
tags: [tunnelling]
let: {b2: 3 nm, V0: 300 meV}
particle: {mass: 0.067 electron_mass, charge: -1 e}
grid:
  x: {from: -200 nm, to: 200 nm, points: 256}
potential:
  - barrier: {from: -6 nm, to: -3 nm, height: V0}
  - barrier: {from: 3 nm, to: 3 nm + b2, height: 0.5*V0}
    name: second
    in_time: {ramp: {by: 1, start: 0 fs, stop: 50 fs, shape: smooth}}
  - field: {strength: 2 V/um, toward: +x}
edges: {x: {low: {absorb: 60 nm}, high: wrap}}
packet:
  gaussian: {at: -50 nm, sigma: 10 nm, energy: 20 meV, toward: +x}
evolve:
  until: 50 fs
  step: 0.5 fs
  record: 5 fs
  stop_when: {norm: {below: 1e-4}}
observables:
  - norm
  - inside: {name: well, from: -3 nm, to: 3 nm}
  - crossing: {name: transmitted, x: 60 nm, toward: +x}
  - density: {every: 10 fs}
film: {every: 5 fs, fps: 25, view: {x: {from: -100 nm, to: 100 nm}}}
snapshots: {every: 50 fs}
expect:
  - {result: transmitted.total, equals: 0.1589, tolerance: 0.002, source: from memory}
  - {result: transmitted.mean_time, within: [0 fs, 1 ps]}
""",
    """\
units: natural
grid:
  x: {from: -12, to: 12, spacing: 0.2}
potential:
  - formula: {value: V0*(x - s*t)**2/2, V0: 1, s: 0.1}
    path: {x: {sine: {amplitude: 1, frequency: 0.1}}}
  - table: {file: tables/smooth.csv}
  - morse: {at: 0, depth: 1, range: 3}
  - polynomial: {at: 0, coefficients: [0, 0, 0.5, 0, 0.01]}
    in_time: {formula: {value: 1 + a*sin(t), a: 0.1}}
edges: {x: wall}
packet:
  sum:
    - gaussian: {at: -2, sigma: 0.7, wavenumber: 1}
    - weight: 0.5
      phase: 1.2
      gaussian: {at: 2, sigma: 0.7}
evolve: {until: 2, accuracy: 1e-3}
observables: [energy, {overlap: {name: back, with: start}}, {autocorrelation: {name: A}}]
film: none
""",
)

SCALARS: list[Any] = [
    *[None, True, False, 0, -1, 1, 5, 1e-3, 1e40, 1e-300, 1e308, -0.0, 10**30, "", " ", "yes", "none", "inf"],
    *[
        "nan",
        "5 nm",
        "-3 fs",
        "2 meV",
        "1 e",
        "9**9**9",
        "1,5 nm",
        "1e400",
        "x",
        "t",
        "b2",
        "V0",
        "2*b2 + V0",
    ],
    *["5 1/nm", "1/0", "../../../etc/passwd", "/dev/zero", "tables", "tables/gap.csv", "~", "a\nb", "+x"],
    *[
        "x**x**x",
        "1/(x-1)",
        "log(t)",
        "exp(exp(x))",
        "(" * 60,
        "wall",
        "wrap",
        "norm",
        "\u22125 nm",
        "\u0665",
    ],
    *["1_000", "electron", "natural", [], {}, [[]], {"x": {}}, [1, 2], ["norm", "norm"], {"gaussian": {}}],
    {"absorb": 3},
]
KEYS = [
    *["from", "to", "points", "spacing", "at", "sigma", "energy", "wavenumber", "step", "accuracy", "record"],
    *["until", "name", "x", "y", "channel", "value", "file", "kind", "barrier", "every", "absorb", "units"],
    *["format", "based_on", "5", "", " ", "\u00e9", "k" * 300],
]
MARKS = [
    "\n",
    "\t",
    "{",
    "[",
    "&a ",
    "*a",
    "!!python/name:os",
    "<<: ",
    "- ",
    ": ",
    "'",
    '"',
    "#",
    "1e999",
    "0x10",
]
MARKS += ["---\n", "\r\n", "\ufeff"]


def paths(value: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """The paths of all values below the top."""
    inner = value.items() if isinstance(value, dict) else enumerate(value) if isinstance(value, list) else ()
    found = [path] if path else []
    for key, item in inner:
        found += paths(item, (*path, key))
    return found


def holder(value: Any, path: tuple[Any, ...]) -> Any:
    for part in path[:-1]:
        value = value[part]
    return value


@st.composite
def mutated_values(draw: st.DrawFn) -> str:
    """A good job with values replaced, dropped, moved, doubled or put under other keys."""
    job = yaml.safe_load(draw(st.sampled_from(GOOD)))
    for _ in range(draw(st.integers(1, 3))):
        places = paths(job)
        if not places:
            break
        place = draw(st.sampled_from(places))
        around, last = holder(job, place), place[-1]
        what = draw(st.sampled_from(["replace", "drop", "swap", "rename", "double"]))
        if what == "replace":
            around[last] = deepcopy(draw(st.sampled_from(SCALARS)))
        elif what == "drop":
            del around[last]
        elif what == "swap":
            other = draw(st.sampled_from(places))
            around[last] = deepcopy(holder(job, other)[other[-1]])
        elif what == "rename" and isinstance(around, dict):
            around[draw(st.sampled_from(KEYS))] = around.pop(last)
        elif what == "double" and isinstance(around, list):
            around.append(deepcopy(around[last]))
    return yaml.dump(job, Dumper=NoAliases, sort_keys=False, allow_unicode=True)


class NoAliases(yaml.SafeDumper):
    """Writes doubled values out."""

    def ignore_aliases(self, data: Any) -> bool:
        return True


@st.composite
def mutated_texts(draw: st.DrawFn) -> str:
    """A good job with pieces of its text cut out, doubled, or replaced by arbitrary characters."""
    text = draw(st.sampled_from(GOOD))
    for _ in range(draw(st.integers(1, 4))):
        start = draw(st.integers(0, len(text)))
        stop = min(start + draw(st.sampled_from([0, 1, 1, 2, 5, 40])), len(text))
        new = draw(st.one_of(st.text(max_size=6), st.sampled_from([text[start:stop] * 2, *MARKS])))
        text = text[:start] + new + text[stop:]
    return text


def check(error: JobFileError) -> None:
    """Every problem has a place, and a message of one line."""
    assert error.problems
    for problem in error.problems:
        assert problem.message
        assert "\n" not in problem.headline()
        assert problem.place is not None


def read(text: str, planned: bool) -> None:
    """Reads a job text, and plans the job; nothing but a JobFileError may be raised."""
    begun = time.process_time()
    try:
        job = parse(text, folder=FOLDER)
        if planned:
            make_plan(job, memory=ALLOWED)
    except JobFileError as error:
        check(error)
    assert time.process_time() - begun < PATIENCE


changed = st.one_of(mutated_values(), mutated_texts())
often = settings(deadline=None, suppress_health_check=list(HealthCheck), derandomize=True)


@pytest.mark.parametrize("text", GOOD)
def test_good_jobs_are_good(text: str) -> None:
    make_plan(parse(text, folder=FOLDER), memory=ALLOWED)


@settings(often, max_examples=300)
@given(changed)
def test_reading_changed_jobs(text: str) -> None:
    read(text, planned=False)


@settings(often, max_examples=40)
@given(mutated_values())
def test_planning_changed_jobs(text: str) -> None:
    read(text, planned=True)


@pytest.mark.slow
@settings(often, max_examples=2000, derandomize=False)
@given(changed)
def test_reading_many_changed_jobs(text: str) -> None:
    read(text, planned=False)


@pytest.mark.slow
@settings(often, max_examples=200, derandomize=False)
@given(mutated_values())
def test_planning_many_changed_jobs(text: str) -> None:
    read(text, planned=True)
