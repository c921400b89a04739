"""`wavejob explain`: every word has a text, and every example can be read."""

from __future__ import annotations

import pytest

from wavejob.cli.check_words import checks
from wavejob.cli.dictionary import Entry, entries
from wavejob.cli.examples import nested, written
from wavejob.cli.explain import explanations
from wavejob.families import parse_family
from wavejob.kinds import FAMILIES
from wavejob.problems import JobFileError
from wavejob.reading.yaml_tree import read_text
from wavejob.settings import JobKeys

from .conftest import Call

KNOWN = {entry.path: entry for entry in entries()}
JOB = {
    "units": "units: {length: nm, time: fs, energy: meV}",
    "particle": "particle: {mass: 0.067 electron_mass, charge: -1 e}",
    "grid": "grid: {x: {from: -400 nm, to: 400 nm}}",
    "packet": "packet: {gaussian: {at: -150 nm, sigma: 20 nm, energy: 70 meV, toward: +x}}",
    "evolve": "evolve: {until: 1 ps}",
}


@pytest.mark.parametrize("entry", KNOWN.values(), ids=lambda entry: entry.dotted)
def test_every_example_is_read_as_a_job(entry: Entry) -> None:
    """Put into an ordinary job. A file that an example names is not there, or nothing is varied: the only mistake."""
    example = written(entry, KNOWN)
    key = entry.path[0]
    assert list(read_text(example, "example.yml").value) == [key] == list(nested(entry, KNOWN))
    text = "\n".join({**JOB, key: example}.values())
    try:
        parse_family(text)
    except JobFileError as error:
        missing = [problem.message for problem in error.problems]
        known = ("there is no file `table.csv`", "there is no file `_stack.yml`", "nothing is varied in this job")
        assert missing in [[one] for one in known]
        assert {"table", "file", "based_on", "when"} & set(entry.path)


@pytest.mark.parametrize("name", checks())
def test_every_check_is_explained(name: str) -> None:
    assert any(text.startswith(f"{name}: a check") for text in explanations(name))


@pytest.mark.parametrize("word", sorted({entry.path[-1] for entry in KNOWN.values()}))
def test_every_word_is_explained(word: str) -> None:
    told = explanations(word)
    assert told
    assert all(text.strip() and "None" not in text for text in told)


def test_every_key_and_kind_is_a_word() -> None:
    words = {entry.path[-1] for entry in KNOWN.values()}
    assert set(JobKeys.keys()) <= words
    assert {name for table in FAMILIES.values() for name in table} <= words


def test_keys_are_given_as_in_a_file(call: Call) -> None:
    found = call("explain", "potential[0].barrier.height")
    assert found.code == 0
    assert found.out.startswith("potential.barrier.height: value between the edges\n")
    assert "takes an energy such as 70 meV" in found.out
    assert "must be given" in found.out
    assert "    potential:\n      - barrier: {from: 5 nm, to: 10 nm, height: 70 meV}\n" in found.out


def test_an_observable_shows_its_results(call: Call) -> None:
    out = call("explain", "crossing").out
    assert "NAME.total" in out
    assert "probability that crossed the detector" in out


@pytest.mark.parametrize(
    ("word", "text"),
    [
        ("meV", "meV: a unit, for an energy; 1 meV = 1.60217663e-22 m^2 kg s^-2"),  # CODATA 2022
        ("norm.drift", "norm.drift: a result: largest abs(norm + absorbed - 1)"),
        (
            "edge leakage",
            "edge leakage: a check that every run makes of itself: probability in the outermost",
        ),
    ],
)
def test_units_results_and_checks_are_words_too(call: Call, word: str, text: str) -> None:
    assert call("explain", *word.split()).out.startswith(text)


def test_checks_are_found_where_they_are_made() -> None:
    found = checks()
    assert {"norm", "momentum head-room", "phase per step", "edge leakage", "accuracy reached"} <= set(found)
    assert all(found.values())


def test_the_overview_fits_a_screen(call: Call) -> None:
    found = call("explain")
    assert found.code == 0
    assert len(found.out.splitlines()) <= 24


@pytest.mark.parametrize(
    ("word", "cure"),
    [
        ("transmision", "did you mean `transmission`?"),
        ("grid.x.pionts", "did you mean `grid.x.points`?"),
        ("qqqq", "`wavejob explain` lists all words"),
    ],
)
def test_an_unknown_word_is_a_mistake(call: Call, word: str, cure: str) -> None:
    found = call("explain", word)
    assert (found.code, found.out, found.err) == (
        2,
        "",
        f"wavejob explain: no word `{word}` is known; {cure}\n",
    )
