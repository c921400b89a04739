"""`wavejob schema`: both dialects in use read it, and it tells good job files from bad ones."""

from __future__ import annotations

import json
from pathlib import Path
from typing import Any

import pytest
from jsonschema import Draft7Validator, Draft202012Validator

from wavejob.cli.new import template
from wavejob.cli.schema import schema
from wavejob.reading.yaml_tree import read_text

from .conftest import JOB, ROOT, Call

SCHEMA = schema()
FILES = sorted((ROOT / "jobs").rglob("*.yml"))
DIALECTS = pytest.mark.parametrize("dialect", [Draft7Validator, Draft202012Validator])


@DIALECTS
def test_it_is_a_schema(dialect: Any) -> None:
    dialect.check_schema(SCHEMA)


@DIALECTS
@pytest.mark.parametrize("path", FILES, ids=lambda path: path.stem)
def test_every_demo_job_fits(dialect: Any, path: Path) -> None:
    value = read_text(path.read_text(encoding="utf-8"), path.name).value
    if path.name.startswith("_"):  # a base of other jobs, which need not be whole
        value = {**value, "based_on": "another"}
    assert [error.message for error in dialect(SCHEMA).iter_errors(value)] == []


GOOD = [
    "edges: {x: wall}",
    "edges: {x: {absorb: 2}}",
    "edges: {x: {low: wall, high: {absorb: 2}}}",
    "observables: [norm, {norm: {}}, energy]",
    "observables: [{overlap: {name: back, with: start}}]",
    "packet: {sum: [{gaussian: {at: -5, sigma: 1}}, {weight: 2, phase: 1.57, gaussian: {at: 5, sigma: 1}}]}",
    "potential: [{barrier: {from: -1 nm, to: 1, height: V0}, name: first, in_time: {constant: {value: 1}}}]",
    "film: none",
    "film: {fps: 10}",
    "units: atomic",
    "evolve: {until: 1 ps, accuracy: 1.0e-3, reproducible: 'yes'}",
    "based_on: _other.yml",
]
BAD = [
    "grid: {x: {from: -20, to: 20, pionts: 128}}",
    "grid: {x: {from: -20}}",
    "grid: {x: {from: -20, to: 20, points: 4}}",
    "potential: [{barier: {from: -1, to: 1, height: 1}}]",
    "potential: [{barrier: {from: -1, to: 1}}]",
    "potential: [{barrier: {from: -1, to: 1, height: 1}, well: {from: -1, to: 1, depth: 1}}]",
    "potential: {barrier: {from: -1, to: 1, height: 1}}",
    "observables: [nrom]",
    "observables: [crossing]",
    "edges: {x: mirror}",
    "packet: {gaussian: {at: -5}}",
    "packet: []",
    "evolve: {until: 1, order: 3}",
    "film: {fps: fast}",
    "units: imperial",
    "colour: blue",
]


def _changed(line: str) -> Any:
    key = line.partition(":")[0]
    lines = [old for old in JOB.splitlines() if not old.startswith(f"{key}:")]
    return read_text("\n".join([*lines, line]), "job.yml").value


@DIALECTS
@pytest.mark.parametrize("line", GOOD)
def test_good_lines_fit(dialect: Any, line: str) -> None:
    assert [error.message for error in dialect(SCHEMA).iter_errors(_changed(line))] == []


@DIALECTS
@pytest.mark.parametrize("line", BAD)
def test_bad_lines_do_not(dialect: Any, line: str) -> None:
    assert list(dialect(SCHEMA).iter_errors(_changed(line)))


@DIALECTS
def test_what_is_missing_is_missed_but_not_in_a_file_with_a_base(dialect: Any) -> None:
    assert list(dialect(SCHEMA).iter_errors({"job": "nothing else"}))
    assert not list(dialect(SCHEMA).iter_errors({"job": "nothing else", "based_on": "_other.yml"}))
    assert list(dialect(SCHEMA).iter_errors({"jb": "misspelt", "based_on": "_other.yml"}))


def test_kinds_have_one_required_key_each() -> None:
    """So that an editor offers the kinds, and then the parameters of the one that was chosen."""
    options = SCHEMA["$defs"]["JobFile"]["properties"]["potential"]["items"]["oneOf"]
    names = [option["$ref"].rpartition("/")[2] for option in options]
    required = [SCHEMA["$defs"][name]["required"] for name in names]
    assert ["barrier"] in required
    assert all(len(keys) == 1 for keys in required)


def test_keys_carry_their_texts() -> None:
    barrier = SCHEMA["$defs"]["Barrier"]
    assert barrier["description"] == "`height` between `from` and `to`, 0 elsewhere."
    assert barrier["properties"]["height"]["description"] == "value between the edges"


def test_it_is_printed(call: Call) -> None:
    found = call("schema")
    assert (found.code, found.err) == (0, "")
    assert json.loads(found.out) == json.loads(json.dumps(SCHEMA))


@DIALECTS
def test_the_file_to_start_from_fits(dialect: Any) -> None:
    assert not list(dialect(SCHEMA).iter_errors(read_text(template(), "first.yml").value))
