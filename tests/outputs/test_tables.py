"""Tables read back to the same doubles by csv, pandas and numpy; results.json is as the contract shows."""

from __future__ import annotations

import csv
import json
import math
from io import StringIO
from pathlib import Path
from typing import Any

import numpy as np
import pandas as pd
import pytest
from hypothesis import given
from hypothesis import strategies as st

from wavejob.outputs import tables
from wavejob.results import Check, Column, Curve, Judgement, Result

COLUMNS = (Column("position.x", "length"), Column("norm"), Column("energy.total", "energy"))
HBAR = 658.2119569  # meV fs, CODATA 2022


def test_series_has_names_with_units(tmp_path: Path, units: Any) -> None:
    path = tmp_path / "series.csv"
    rows = np.array([[-150.0, 1.0, 0.1], [0.1, 1 / 3, math.nan]])
    tables.write_series(path, np.array([0.0, 5.0]), COLUMNS, rows, units)
    assert path.read_bytes().decode() == (
        "time [fs],position.x [nm],norm,energy.total [meV]\n"
        f"0.0,-150.0,1.0,{0.1 * HBAR!r}\n"
        "5.0,0.1,0.3333333333333333,\n"
    )


def test_natural_units_have_no_brackets(tmp_path: Path, natural: Any) -> None:
    tables.write_series(tmp_path / "series.csv", np.array([0.0]), COLUMNS, np.zeros((1, 3)), natural)
    header = (tmp_path / "series.csv").read_text().splitlines()[0]
    assert header == "time,position.x,norm,energy.total"


def test_errors_stand_beside_their_column(tmp_path: Path, units: Any) -> None:
    curve = Curve("T", (Column("energy", "energy"), Column("T")), np.array([[0.1, 0.5], [0.2, 0.75]]))
    path = tables.write_curve(tmp_path, curve, units, {"T": np.array([0.01, math.nan])})
    assert path == tmp_path / "T.csv"
    read = pd.read_csv(path)
    assert list(read) == ["energy [meV]", "T", "T.error"]
    assert read["T.error"].tolist()[0] == 0.01
    assert math.isnan(read["T.error"].tolist()[1])


def test_errors_are_in_the_units_of_their_column(tmp_path: Path, units: Any) -> None:
    path = tmp_path / "series.csv"
    columns = (Column("energy.total", "energy"),)
    tables.write_series(path, np.zeros(1), columns, np.ones((1, 1)), units, {"energy.total": np.array([2.0])})
    read = pd.read_csv(path)
    assert read["energy.total.error [meV]"].tolist() == [2 * HBAR]


def test_a_series_without_columns_keeps_its_times(tmp_path: Path, units: Any) -> None:
    tables.write_series(tmp_path / "s.csv", np.array([0.0, 0.5]), (), np.zeros((2, 0)), units)
    assert (tmp_path / "s.csv").read_text() == "time [fs]\n0.0\n0.5\n"


def test_every_reader_gets_the_same_numbers(tmp_path: Path, natural: Any) -> None:
    rows = np.random.default_rng(1).standard_normal((50, 3)) * 10.0 ** np.arange(-200, 100, 6)[:50, None]
    times = np.arange(50) / 7
    path = tmp_path / "series.csv"
    tables.write_series(path, times, COLUMNS, rows, natural)
    wanted = np.column_stack([times, rows])
    with path.open(newline="", encoding="utf-8") as file:
        by_csv = [[float(cell) for cell in row] for row in list(csv.reader(file))[1:]]
    assert np.array_equal(by_csv, wanted)
    assert np.array_equal(np.genfromtxt(path, delimiter=",", skip_header=1), wanted)
    # pandas' quick parser is not exact: its manual promises 15 digits
    np.testing.assert_allclose(pd.read_csv(path).to_numpy(), wanted, rtol=1e-15)


def test_missing_values_are_missing_to_pandas_and_numpy(tmp_path: Path, natural: Any) -> None:
    curve = Curve("a", (Column("a"),), np.array([[1.0], [math.nan], [3.0]]))
    path = tables.write_curve(tmp_path, curve, natural)
    read = pd.read_csv(path)
    assert read["a"].dtype == float
    assert read["a"].isna().tolist() == [False, True, False]
    pair = Curve("b", (Column("t"), Column("b")), np.array([[1.0, math.nan]]))
    by_numpy = np.genfromtxt(tables.write_curve(tmp_path, pair, natural), delimiter=",", skip_header=1)
    assert np.isnan(by_numpy).tolist() == [False, True]


@given(st.floats(allow_nan=False))
def test_numbers_are_the_shortest_that_read_back(x: float) -> None:
    text = tables._text(x)
    assert float(text) == x
    assert len(text) <= 24  # 17 digits, sign, point, e, sign, 3 digits: Steele and White 1990


def test_single_precision_numbers_stay_numbers(tmp_path: Path, natural: Any) -> None:
    curve = Curve("a", (Column("a"),), np.array([[0.5]], dtype=np.float32))
    tables.write_curve(tmp_path, curve, natural)
    assert (tmp_path / "a.csv").read_text() == "a\n0.5\n"


TOTAL = Result(
    "transmitted.total",
    0.1589,
    error=0.0003,
    error_status="estimated",
    error_parts={"step": 1e-4, "grid": 2e-4},
    meaning="probability that crossed x = 60 nm",
)


def _written(path: Path, results: list[Result], units: Any, **more: Any) -> dict[str, Any]:
    tables.write_results_json(
        path,
        **{
            "job": "stack/nominal",
            "fingerprint": "3f9a0c12d4",
            "verdict": "trusted",
            "results": results,
            "checks": [Check("edge leakage", True, 2e-9, 1e-6)],
            "judgements": [Judgement("transmitted.total", "met", "...")],
            "units": units,
            **more,
        },
    )

    def refuse(word: str) -> None:
        raise ValueError(f"{word} is no JSON")

    document: dict[str, Any] = json.loads(path.read_text(encoding="utf-8"), parse_constant=refuse)
    return document


def test_results_json_is_as_the_contract_shows(tmp_path: Path, units: Any) -> None:
    assert _written(tmp_path / "results.json", [TOTAL], units) == {
        "format": 1,
        "job": "stack/nominal",
        "fingerprint": "3f9a0c12d4",
        "verdict": "trusted",
        "results": {
            "transmitted.total": {
                "value": 0.1589,
                "error": 0.0003,
                "scale": 1.0,
                "unit": "",
                "error_status": "estimated",
                "error_parts": {"step": 1e-4, "grid": 2e-4},
                "meaning": "probability that crossed x = 60 nm",
            }
        },
        "checks": [
            {
                "name": "edge leakage",
                "passed": True,
                "value": 2e-9,
                "limit": 1e-6,
                "reason": "",
                "advice": "",
            }
        ],
        "expectations": [{"result": "transmitted.total", "outcome": "met", "text": "..."}],
    }


def test_all_figures_of_a_result_are_in_the_files_units(tmp_path: Path, units: Any) -> None:
    result = Result("energy.final", 2.0, "energy", 3.0, "", 0.5, error_status="estimated", error_parts={"step": 0.25})
    found = _written(tmp_path / "r.json", [result], units)["results"]["energy.final"]
    assert found["unit"] == "meV"
    figures = (found["value"], found["scale"], found["error"], found["error_parts"]["step"])
    assert figures == (2 * HBAR, 3 * HBAR, 0.5 * HBAR, 0.25 * HBAR)


@pytest.mark.parametrize("status", ["off", "not_converging"])
def test_an_error_not_estimated_is_null(tmp_path: Path, units: Any, status: Any) -> None:
    found = _written(tmp_path / "r.json", [Result("a", 1.0, error=0.1, error_status=status)], units)
    assert found["results"]["a"]["error"] is None
    assert found["results"]["a"]["error_status"] == status


@pytest.mark.parametrize(
    ("value", "note", "said"),
    [
        (None, "absorbed more than 1e-8", "absorbed more than 1e-8"),
        (None, "", "not computed"),
        (math.nan, "", "came out as nan"),
        (math.inf, "", "came out as inf"),
        (np.float64("-inf"), "no lifetime", "no lifetime"),
    ],
)
def test_what_cannot_be_had_is_null_with_a_note(
    tmp_path: Path, units: Any, value: float | None, note: str, said: str
) -> None:
    found = _written(tmp_path / "r.json", [Result("a", value, note=note)], units)["results"]["a"]
    assert found["value"] is None
    assert found["note"] == said


def test_numpy_numbers_and_flags_are_written(tmp_path: Path, units: Any) -> None:
    check = Check("a", np.bool_(False), np.float32(0.5), None)  # type: ignore[arg-type]
    found = _written(tmp_path / "r.json", [Result("b", np.float32(0.25))], units, checks=[check])  # type: ignore[arg-type]
    assert found["checks"][0]["passed"] is False
    assert found["checks"][0]["value"] == 0.5
    assert found["results"]["b"]["value"] == 0.25


def test_two_results_of_one_name_are_refused(tmp_path: Path, units: Any) -> None:
    with pytest.raises(ValueError, match="one name"):
        _written(tmp_path / "r.json", [TOTAL, TOTAL], units)
    assert not (tmp_path / "r.json").exists()


def test_results_csv(tmp_path: Path, units: Any) -> None:
    path = tmp_path / "results.csv"
    odd = Result("energy.drift", None, "energy", None, 'largest "drift", relative')
    tables.write_results_csv(path, [TOTAL, odd], units)
    rows = list(csv.reader(StringIO(path.read_text(encoding="utf-8"))))
    assert rows == [
        ["name", "value", "error", "unit", "scale", "meaning"],
        ["transmitted.total", "0.1589", "0.0003", "", "1.0", "probability that crossed x = 60 nm"],
        ["energy.drift", "", "", "meV", "", 'largest "drift", relative'],
    ]
