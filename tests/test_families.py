"""A varied file stands for the jobs that a user would otherwise write one by one."""

from __future__ import annotations

from pathlib import Path

import pytest

from wavejob.families import MOST_FILMS, load_family, load_variant, parse_family
from wavejob.loading import parse
from wavejob.problems import JobFileError
from wavejob.reading.tree import JobTree

BASE = """\
units: {length: nm, time: fs, energy: meV}
let: {b2: 3 nm}
particle: {mass: 0.067 electron_mass, charge: -1 e}
grid: {x: {from: -100 nm, to: 100 nm, points: 512}}
packet: {gaussian: {at: -30 nm, sigma: 5 nm, energy: 80 meV, toward: +x}}
potential:
  - barrier: {from: 0 nm, to: b2, height: 300 meV}
    name: first
  - barrier: {from: 8 nm, to: 8 nm + b2, height: 300 meV}
    name: second
evolve: {until: 100 fs}
"""


def varied(*lines: str) -> str:
    return BASE + "\n".join(lines) + "\n"


def test_each_variant_is_the_job_that_has_its_values_written_out() -> None:
    """Fingerprints tell whether two jobs yield the same numbers."""
    family = parse_family(varied("vary:", "  - b2: {from: 2 nm, to: 4 nm, points: 3}"))
    by_hand = [parse(BASE.replace("b2: 3 nm", f"b2: {n} nm")).fingerprint for n in (2, 3, 4)]
    assert [job.fingerprint for job in family.jobs] == by_hand
    assert len(set(by_hand)) == 3
    assert [job.title for job in family.jobs] == ["job, b2 = 2 nm", "job, b2 = 3 nm", "job, b2 = 4 nm"]


@pytest.mark.parametrize("key", ["potential.second.barrier.height", "potential[1].barrier.height"])
def test_a_term_is_found_by_name_and_by_place(key: str) -> None:
    family = parse_family(varied("vary:", f"  - {key}: [0.25 eV, 300]"))
    first = BASE.rpartition("300 meV")
    assert family.jobs[0].fingerprint == parse("250 meV".join([first[0], first[2]])).fingerprint
    assert family.jobs[1].fingerprint == parse(BASE).fingerprint
    assert [str(job.variant[0]) for job in family.jobs] == [f"{key} = 0.25 eV", f"{key} = 300 meV"]
    scaled, units = family.jobs[0].variant[0].value, family.jobs[0].units
    assert scaled is not None
    assert units.to_file(scaled, "energy") == pytest.approx(250, rel=1e-14)


def test_a_key_that_was_left_out_can_be_varied() -> None:
    family = parse_family(varied("vary:", "  - evolve.accuracy: [1e-3, 1e-5]"))
    assert [job.accuracy.first for job in family.jobs] == [1e-3, 1e-5]


def test_words_are_varied_too() -> None:
    text = BASE.replace("{mass: 0.067 electron_mass, charge: -1 e}", "electron").replace(", points: 512", "")
    family = parse_family(text + "vary:\n  - particle: [electron, muon]\n")
    assert [job.variant[0].value for job in family.jobs] == [None, None]
    assert family.jobs[1].particle.mass / family.jobs[0].particle.mass == pytest.approx(206.7682827)  # CODATA 2022


def test_every_combination_or_in_step() -> None:
    entries = ["  - b2: [2 nm, 3 nm]", "  - packet.gaussian.energy: [70 meV, 80 meV]"]
    assert len(parse_family(varied("vary:", *entries)).jobs) == 4
    together = parse_family(varied("vary_together:", *entries))
    assert [[one.text for one in job.variant] for job in together.jobs] == [["2 nm", "70 meV"], ["3 nm", "80 meV"]]


def test_an_expectation_is_judged_where_it_belongs() -> None:
    expect = ["expect:", "  - {result: norm.final, above: 0.5}"]
    expect += ["  - {result: norm.drift, below: 1, when: {b2: 0.004 um}}"]
    family = parse_family(varied("vary:", "  - b2: {from: 2 nm, to: 4 nm, points: 3}", *expect))
    assert [[e.result for e in job.keys.expect] for job in family.jobs] == [
        ["norm.final"], ["norm.final"], ["norm.final", "norm.drift"],
    ]  # fmt: skip
    assert family.expected == ("norm.final", "norm.drift")


def test_mistakes_stand_at_the_entry_and_name_the_value() -> None:
    with pytest.raises(JobFileError) as found:
        parse_family(varied("vary:", "  - packet.gaussian.sigma: [5 nm, -1 nm]"))
    (problem,) = found.value.problems
    assert problem.source == "  - packet.gaussian.sigma: [5 nm, -1 nm]"
    assert problem.place is not None
    assert problem.source[problem.place.column - 1 :].startswith("-1 nm")
    assert problem.message == "with packet.gaussian.sigma = -1 nm: must be greater than 0, got `-1 nm`"


def test_a_mistake_of_all_variants_is_told_once_and_plainly() -> None:
    with pytest.raises(JobFileError) as found:
        parse_family(varied("vary:", "  - b2: [2 nm, 3 nm]").replace("sigma:", "sigmo:"))
    (problem,) = (p for p in found.value.problems if "unknown" in p.message)
    assert problem.message == "unknown key `sigmo`"


def test_large_families_have_films_only_where_asked() -> None:
    many = ["vary:", f"  - b2: {{from: 2 nm, to: 4 nm, points: {MOST_FILMS + 1}}}"]
    assert parse_family(varied(*many)).jobs[0].keys.film == "none"
    assert parse_family(varied(*many, "film: {fps: 10}")).jobs[0].keys.film != "none"
    few = many[1].replace(str(MOST_FILMS + 1), str(MOST_FILMS))
    assert parse_family(varied("vary:", few)).jobs[0].keys.film != "none"


def test_one_variant_is_read_alone_and_vary_comes_from_a_base_too(tmp_path: Path) -> None:
    (tmp_path / "_base.yml").write_text(varied("vary:", "  - b2: [2 nm, 3 nm]"), encoding="utf-8")
    (tmp_path / "job.yml").write_text("based_on: _base.yml\n", encoding="utf-8")
    family = load_family(tmp_path / "job.yml", JobTree(tmp_path))
    alone = load_variant(tmp_path / "job.yml", JobTree(tmp_path), 1)
    assert alone.fingerprint == family.jobs[1].fingerprint
    assert alone.variant == family.jobs[1].variant


def test_a_plain_job_is_a_family_of_one_and_a_varied_one_no_job() -> None:
    family = parse_family(BASE)
    assert not family.is_varied
    assert [job.fingerprint for job in family.jobs] == [parse(BASE).fingerprint]
    with pytest.raises(JobFileError, match="a varied job is many jobs; read it with `load_family`"):
        parse(varied("vary:", "  - b2: [2 nm]"))
