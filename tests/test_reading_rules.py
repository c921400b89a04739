"""The reading rules of the job file, one by one: `let`, `based_on`, paths, sizes, odd files."""

from __future__ import annotations

import os
import time
from pathlib import Path

import h5py
import numpy as np
import pytest

from wavejob.job import Job
from wavejob.loading import load, parse
from wavejob.packets.gaussian import GaussianPacket, overlaps
from wavejob.plan import make_plan
from wavejob.problems import JobFileError
from wavejob.reading.tree import JobTree

GOOD = """\
units: natural
grid:
  x: {from: -20, to: 20, points: 256}
packet:
  gaussian: {at: -5, sigma: 1, wavenumber: 2}
evolve:
  until: 4
"""
SI = """\
units: {length: nm, time: fs, energy: meV}
particle: {mass: 0.067 electron_mass, charge: -1 e}
grid:
  x: {from: -400, to: 400 nm}
packet:
  gaussian: {at: -150, sigma: 20 nm}
evolve:
  until: 0.5 ps
"""


def written(folder: Path, **files: str) -> Path:
    """Writes the files NAME.yml of a job tree and returns the path of the first."""
    for name, text in files.items():
        (folder / f"{name}.yml").write_text(text, encoding="utf-8")
    return folder / f"{next(iter(files))}.yml"


def loaded(folder: Path, **files: str) -> Job:
    return load(written(folder, **files), JobTree(folder))


def refused(folder: Path, **files: str) -> str:
    with pytest.raises(JobFileError) as caught:
        loaded(folder, **files)
    return str(caught.value)


# ---- let


def test_names_in_sums_products_and_quotients() -> None:
    job = parse(
        SI + "let: {a: 3 nm, b: 2*a, c: a/2 + b - 1 nm, V0: 300 meV, unused: 5 fs}\n"
        "potential:\n  - barrier: {from: c - 100 nm, to: 0.5*b + 1 nm, height: 0.5*V0 + 1 meV}\n"
    )
    barrier = job.keys.potential[0].body
    assert barrier.start == pytest.approx(3 / 2 + 6 - 1 - 100)
    assert barrier.stop == pytest.approx(3 + 1)
    assert job.units.to_file(barrier.height, "energy") == pytest.approx(151)


def test_later_names_may_not_be_used_and_leave_no_echo() -> None:
    with pytest.raises(JobFileError) as caught:
        parse(SI + "let: {a: 2*b, b: 3 nm}\npotential:\n  - step: {at: a, height: 1 meV}\n")
    assert [p.key for p in caught.value.problems] == ["let.a"]


def test_bare_let_number_counts_in_the_files_units() -> None:
    job = parse(SI + "let: {a: 3}\npotential:\n  - step: {at: a, height: a}\n")
    step = job.keys.potential[0].body
    assert step.at == pytest.approx(3)
    assert job.units.to_file(step.height, "energy") == pytest.approx(3)


# ---- quantities: conversions from CODATA 2022 (physics.nist.gov/constants)


def test_energies_as_wave_numbers_and_temperatures() -> None:
    job = parse(SI + "potential:\n  - step: {at: 0, height: 8065.544 cm^-1}\n  - step: {at: 1, height: 11604.518 K}\n")
    for item in job.keys.potential:
        assert job.units.to_file(item.body.height, "energy") == pytest.approx(1000, rel=1e-7)


def test_flags_have_four_forms() -> None:
    for text, wanted in (("yes", True), ("no", False), ("true", True), ("false", False)):
        assert parse(f"{GOOD}  reproducible: {text}\n").evolve.reproducible is wanted


def test_particle_of_natural_and_atomic_units() -> None:
    assert parse(GOOD).particle.mass == 1
    assert parse(GOOD.replace("natural", "atomic")).particle.mass == pytest.approx(1)


# ---- based_on


def test_override_merges_deeply_and_replaces_lists(tmp_path: Path) -> None:
    job = loaded(
        tmp_path,
        job="based_on: _base.yml\ngrid: {x: {to: 30}}\ntags: [c]\n",
        _base=GOOD + "tags: [a, b]\nlet: {energy_scale: 3}\n",
    )
    assert (job.keys.grid.x.start, job.keys.grid.x.stop, job.keys.grid.x.points) == (-20, 30, 256)
    assert job.keys.tags == ["c"]


@pytest.mark.parametrize(
    ("override", "gone", "there"),
    [
        (
            "packet: {gaussian: {energy: 2, toward: +x}}",
            "packet.gaussian.wavenumber",
            "packet.gaussian.energy",
        ),
        ("packet: {sum: [{gaussian: {at: 0, sigma: 1}}]}", "packet.gaussian", "packet.sum"),
        ("grid: {x: {spacing: 0.1}}", "grid.x.points", "grid.x.spacing"),
        ("evolve: {accuracy: 1e-3}", "evolve.step", "evolve.accuracy"),
        ("edges: {x: {low: wall, high: wall}}", "edges.x.absorb", "edges.x.low"),
        (
            "evolve: {stop_when: {norm: {above: 3}}}",
            "evolve.stop_when.norm.below",
            "evolve.stop_when.norm.above",
        ),
    ],
)
def test_alternatives_take_each_others_place(tmp_path: Path, override: str, gone: str, there: str) -> None:
    base = GOOD + "  step: 0.01\n  stop_when: {norm: {below: 0.1}}\nedges: {x: {absorb: 3}}\n"
    job = loaded(tmp_path, job=f"based_on: _base.yml\n{override}\n", _base=base)

    def has(dotted: str) -> bool:
        return tuple(dotted.split(".")) in job.document.places

    assert has(there)
    assert not has(gone)


def test_toward_goes_with_the_energy_it_belongs_to(tmp_path: Path) -> None:
    base = GOOD.replace("wavenumber: 2", "energy: 2, toward: +x")
    job = loaded(tmp_path, job="based_on: _base.yml\npacket: {gaussian: {velocity: -1}}\n", _base=base)
    assert job.packet.mean_wavenumber(1.0) == -1  # type: ignore[attr-defined]


def test_names_of_let_are_no_alternatives(tmp_path: Path) -> None:
    base = GOOD + "let: {momentum0: 3, omega: 1}\n"
    top = "based_on: _base.yml\nlet: {stiffness: 2}\npotential:\n  - step: {at: momentum0, height: omega}\n"
    assert loaded(tmp_path, job=top, _base=base).keys.potential[0].body.at == 3


def test_named_items_replace_and_are_appended(tmp_path: Path) -> None:
    items = "potential:\n  - step: {at: 1, height: 1}\n  - step: {at: 2, height: 1}\n    name: second\n"
    top = (
        "based_on: _base.yml\npotential:\n  - well: {from: 3, to: 4, depth: 1}\n    name: second\n"
        "  - step: {at: 5, height: 1}\n    name: third\n"
    )
    job = loaded(tmp_path, job=top, _base=GOOD + items)
    assert [item.kind for item in job.keys.potential] == ["step", "well", "step"]
    assert job.document.place(("potential", 1, "well")).path.endswith("/job.yml")
    assert job.document.place(("potential", 0, "step")).path.endswith("/_base.yml")


def test_unnamed_items_replace_the_list(tmp_path: Path) -> None:
    items = "potential:\n  - step: {at: 1, height: 1}\n    name: first\n"
    job = loaded(tmp_path, job="based_on: _base.yml\npotential:\n  - step: {at: 2, height: 1}\n", _base=GOOD + items)
    assert len(job.keys.potential) == 1


def test_a_name_given_twice_is_no_silent_choice(tmp_path: Path) -> None:
    item = "  - step: {at: 1, height: 1}\n    name: first\n"
    said = refused(tmp_path, job=f"based_on: _base.yml\npotential:\n{item}{item}", _base=f"{GOOD}potential:\n{item}")
    assert "another term is called `first`" in said


def test_mistakes_point_into_the_file_they_stand_in(tmp_path: Path) -> None:
    said = refused(tmp_path, job="based_on: _base.yml\n", _base=GOOD + "film: no\n")
    assert "/_base.yml:8:7: film: " in said


def test_paths_of_a_base_are_relative_to_the_base(tmp_path: Path) -> None:
    (tmp_path / "lib").mkdir()
    (tmp_path / "lib" / "V.csv").write_text("".join(f"{x},0\n" for x in range(-30, 31)))
    (tmp_path / "lib" / "_base.yml").write_text(GOOD + "potential:\n  - table: {file: V.csv}\n")
    assert len(loaded(tmp_path, job="based_on: lib/_base.yml\n").keys.potential) == 1


def test_eight_bases_are_followed_and_no_ninth(tmp_path: Path) -> None:
    files = {f"f{i}": f"based_on: f{i + 1}.yml\n" for i in range(8)} | {"f8": GOOD}
    assert loaded(tmp_path, **files).evolve.until == 4
    (tmp_path / "top.yml").write_text("based_on: f0.yml\n")
    with pytest.raises(JobFileError, match="the 9th file"):
        load(tmp_path / "top.yml", JobTree(tmp_path))


def test_units_stated_again_are_no_change(tmp_path: Path) -> None:
    assert loaded(tmp_path, job="based_on: _base.yml\nunits: natural\n", _base=GOOD).evolve.until == 4


def test_long_lists_merge_quickly(tmp_path: Path) -> None:
    def items(height: int) -> str:
        return "potential:\n" + "".join(f"  - {{step: {{at: 0, height: {height}}}, name: n{i}}}\n" for i in range(2000))

    begun = time.process_time()
    said = refused(tmp_path, job="based_on: _base.yml\n" + items(1), _base=GOOD + items(2))
    assert "the list has 2000 items" in said
    assert time.process_time() - begun < 20


# ---- paths


def test_links_may_not_leave_the_tree(tmp_path: Path) -> None:
    tree, outside = tmp_path / "tree", tmp_path / "outside.csv"
    tree.mkdir()
    outside.write_text("".join(f"{x},0\n" for x in range(-30, 31)))
    (tree / "link.csv").symlink_to(outside)
    (tree / "folder").symlink_to(tmp_path)
    for path in ("link.csv", "folder/outside.csv"):
        text = f"{GOOD}potential:\n  - table: {{file: {path}}}\n"
        assert f"`{path}` leaves the job tree" in refused(tree, job=text)
        assert load(tree / "job.yml", JobTree(tree), trust_paths=True)


def test_a_linked_job_reads_beside_the_file_itself(tmp_path: Path) -> None:
    (tmp_path / "real").mkdir()
    (tmp_path / "real" / "V.csv").write_text("".join(f"{x},0\n" for x in range(-30, 31)))
    written(tmp_path / "real", job=GOOD + "potential:\n  - table: {file: V.csv}\n")
    (tmp_path / "linked.yml").symlink_to(tmp_path / "real" / "job.yml")
    assert load(tmp_path / "linked.yml", JobTree(tmp_path)).id == "linked"


@pytest.mark.skipif(not hasattr(os, "mkfifo"), reason="no pipes on this platform")
def test_pipes_are_no_files(tmp_path: Path) -> None:
    os.mkfifo(tmp_path / "pipe.csv")
    os.mkfifo(tmp_path / "_pipe.yml")
    text = f"{GOOD}potential:\n  - table: {{file: pipe.csv}}\n"
    assert "not a regular file" in refused(tmp_path, job=text)
    assert "not a regular file" in refused(tmp_path, job="based_on: _pipe.yml\n")


def test_devices_are_no_files_even_where_paths_are_trusted(tmp_path: Path) -> None:
    path = written(tmp_path, job=f"{GOOD}potential:\n  - table: {{file: /dev/zero}}\n")
    with pytest.raises(JobFileError, match="not a regular file"):
        load(path, JobTree(tmp_path), trust_paths=True)


@pytest.mark.parametrize("name", ["missing.yml", "a\0b.yml", "n" * 5000 + ".yml", "."])
def test_jobs_that_cannot_be_opened(tmp_path: Path, name: str) -> None:
    with pytest.raises(JobFileError):
        load(tmp_path / name, JobTree(tmp_path))
    with pytest.raises(JobFileError):
        load(tmp_path / name)


def test_tables_have_bounds(tmp_path: Path) -> None:
    with (tmp_path / "huge.csv").open("wb") as file:
        file.truncate(2**30)  # a hole: it takes no disk
    assert "1.02e+03 MiB, at most 16 are read" in refused(
        tmp_path, job=f"{GOOD}potential:\n  - table: {{file: huge.csv}}\n"
    )


@pytest.mark.parametrize("separator", [",", " ", "\t", " , "])
def test_tables_with_header_and_remarks(tmp_path: Path, separator: str) -> None:
    rows = "".join(f"{x}{separator}{x * x}\n" for x in range(-30, 31))
    (tmp_path / "V.csv").write_text(f"# remark\nx{separator}V\n\n{rows}", encoding="utf-8-sig", newline="\r\n")
    job = loaded(tmp_path, job=f"{GOOD}potential:\n  - table: {{file: V.csv}}\n")
    assert job.landscape.value(np.array([2.5]), 0.0) == pytest.approx(6.25)


def test_a_broken_first_row_is_no_header(tmp_path: Path) -> None:
    (tmp_path / "V.csv").write_text("-30,oops\n" + "".join(f"{x},0\n" for x in range(-29, 31)))
    assert "line 1: `oops` is no number" in refused(tmp_path, job=f"{GOOD}potential:\n  - table: {{file: V.csv}}\n")


# ---- stored fields


def stored(path: Path, psi: np.ndarray, x: np.ndarray, unit: str) -> None:
    with h5py.File(path, "w") as file:
        file["psi"], file["x"] = psi, x
        file["x"].attrs["units"] = unit


@pytest.mark.parametrize(
    ("psi", "x", "unit", "said"),
    [
        (np.ones((1, 9, 2)), np.arange(9.0), "parsec", "the stored places are in `parsec`"),
        (np.ones((1, 3, 9, 2)), np.arange(9.0), "", "does not hold a field on one axis"),
        (np.ones((9, 3)), np.arange(9.0), "", "does not hold a field on one axis"),
        (np.ones((0, 9, 2)), np.arange(9.0), "", "is no fields file"),
        (np.full((1, 9, 2), np.nan), np.arange(9.0), "", "is not finite everywhere"),
        (np.zeros((1, 9, 2)), np.arange(9.0), "", "is 0 everywhere"),
        (np.ones((1, 9, 2)), np.zeros(9), "", "do not rise"),
    ],
)
def test_stored_fields_that_do_not_fit(tmp_path: Path, psi: np.ndarray, x: np.ndarray, unit: str, said: str) -> None:
    stored(tmp_path / "f.nc", psi, x, unit)
    text = GOOD.replace("gaussian: {at: -5, sigma: 1, wavenumber: 2}", "file: {path: f.nc}")
    assert said in refused(tmp_path, job=text)


# ---- sizes


def test_a_file_of_ten_megabytes(tmp_path: Path) -> None:
    assert "larger than 1 MiB" in refused(tmp_path, job=GOOD + "# padding\n" * 2**20)


def test_a_hundred_thousand_items(tmp_path: Path) -> None:
    begun = time.process_time()
    assert "more than 20000 values" in refused(tmp_path, job=GOOD + "tags: [" + "a," * 100_000 + "]\n")
    assert time.process_time() - begun < 20


def test_line_ends_and_byte_order_marks(tmp_path: Path) -> None:
    (tmp_path / "job.yml").write_bytes(b"\xef\xbb\xbf" + GOOD.replace("\n", "\r\n").encode())
    assert load(tmp_path / "job.yml", JobTree(tmp_path)).evolve.until == 4


def test_numbers_of_yaml(tmp_path: Path) -> None:
    job = loaded(tmp_path, job=GOOD.replace("256", "0x100").replace("-20", "-2.0e+1").replace("at: -5", "at: -0.0"))
    assert (job.keys.grid.x.points, job.keys.grid.x.start) == (256, -20)


# ---- what a machine can hold


def test_chosen_points_beyond_memory() -> None:
    job = parse(GOOD.replace("from: -20, to: 20, points: 256", "from: -20, to: 20000000000"))
    with pytest.raises(
        JobFileError, match=r"points, as many as the packet and the potential ask for, take .* of memory"
    ):
        make_plan(job, memory=2**31)


def test_an_endless_run() -> None:
    job = parse(GOOD.replace("until: 4", "until: 1e13"))
    with pytest.raises(JobFileError, match=r"evolve\.until: the run has .* steps, which take .* years at the least"):
        make_plan(job, memory=2**31)


def test_prime_numbers_of_steps_are_planned_quickly() -> None:
    begun = time.process_time()
    plan = make_plan(parse(GOOD.replace("until: 4", "until: 99999999977\n  step: 1")), memory=2**40)
    assert plan.steps == 99999999977  # a prime number
    assert 300 < plan.steps / plan.record < 500
    assert time.process_time() - begun < 20


# ---- packets


def test_overlaps_of_packets_in_closed_form() -> None:
    """Against the integral on a fine grid (trapezoidal rule, spectrally exact for Gaussians)."""
    packets = [
        GaussianPacket.model_construct(
            at=at, sigma=sigma, wavenumber=k, energy=None, toward=None, momentum=None, velocity=None
        )
        for at, sigma, k in ((-1.0, 0.7, 3.0), (0.5, 1.3, -1.0), (2.0, 0.4, 2.0))
    ]
    x = np.linspace(-30, 30, 20001)
    fields = np.array(
        [
            (2 * np.pi * p.sigma**2) ** -0.25
            * np.exp(-(((x - p.at) / (2 * p.sigma)) ** 2) + 1j * p.wavenumber * (x - p.at))
            for p in packets
        ]
    )
    integrals = fields.conj() @ fields.T * (x[1] - x[0])
    np.testing.assert_allclose(overlaps(packets, 1.0), integrals, atol=1e-12)


@pytest.mark.parametrize(("phase", "cancels"), [("3.141592653589793", True), ("3.0", False)])
def test_sums_that_cancel(phase: str, cancels: bool) -> None:
    two = "sum: [{gaussian: {at: 0, sigma: 1}}, {phase: %s, gaussian: {at: 0, sigma: 1}}]" % phase  # noqa: UP031
    text = GOOD.replace("gaussian: {at: -5, sigma: 1, wavenumber: 2}", two)
    if cancels:
        with pytest.raises(JobFileError, match="cancel each other"):
            parse(text)
    else:
        assert parse(text)
