"""Units of a file in nm, fs and meV, as outputs see them."""

from __future__ import annotations

from typing import Any

import pytest

HBAR = 658.2119569  # meV fs, CODATA 2022: hbar = 6.582119569e-16 eV s
LABELS = {
    "number": "",
    "length": "nm",
    "time": "fs",
    "energy": "meV",
    "wavenumber": "1/nm",
    "density": "1/nm",
    "momentum_density": "nm",
    "flux": "1/fs",
}


class FileUnits:
    """Lengths and times as they are, energies from hbar/fs to meV."""

    def to_file(self, x: Any, dimension: str) -> Any:
        return x * HBAR if dimension == "energy" else x

    def label(self, dimension: str) -> str:
        return LABELS[dimension]


class NaturalUnits:
    """hbar 1 and no labels."""

    def to_file(self, x: Any, dimension: str) -> Any:
        return x

    def label(self, dimension: str) -> str:
        return ""


@pytest.fixture
def units() -> FileUnits:
    return FileUnits()


@pytest.fixture
def natural() -> NaturalUnits:
    return NaturalUnits()
