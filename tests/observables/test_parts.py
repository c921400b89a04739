"""The parts that energy-resolved results are made of."""

from __future__ import annotations

import numpy as np
import pytest

from wavejob.observables.fourier import even_sums, sums
from wavejob.observables.peaks import find_peaks

Array = np.ndarray


def test_evenly_spaced_sums_are_the_same_sums() -> None:
    """By their definition."""
    generator = np.random.default_rng(1)
    values = generator.normal(size=1001) + 1j * generator.normal(size=1001)
    times, energies = 0.05 * np.arange(1001), -3 + 0.013 * np.arange(700)
    np.testing.assert_allclose(
        even_sums(0.05, values, -3, 0.013, 700), sums(times, values[:, None], energies)[:, 0], atol=1e-9
    )


def two_resonances(e: Array) -> Array:
    """Breit and Wigner 1936: tops at 1 and 2, full widths 0.1 and 0.02, on nothing."""
    found = np.zeros(len(e))
    for at, width in ((1.0, 0.1), (2.0, 0.02)):
        found += (width / 2) ** 2 / ((e - at) ** 2 + (width / 2) ** 2)
    return found


def test_peaks_of_two_resonances() -> None:
    first, second = find_peaks(two_resonances, np.linspace(0.5, 2.5, 801), 2)
    assert first.energy == pytest.approx(1, abs=1e-4)
    assert second.energy == pytest.approx(2, abs=1e-4)
    assert first.width == pytest.approx(0.1, rel=1e-3)
    assert second.width == pytest.approx(0.02, rel=1e-2)  # it stands on the flank of the other


def test_one_resonance_alone_is_exact() -> None:
    (peak,) = find_peaks(lambda e: 0.3 / (1 + ((e - 1.234567) / 0.05) ** 2), np.linspace(0.5, 2.5, 201), 3)
    assert peak.energy == pytest.approx(1.234567, abs=1e-8)
    assert peak.height == pytest.approx(0.3, rel=1e-8)
    assert peak.width == pytest.approx(0.1, rel=1e-6)


def test_a_shoulder_is_no_peak_and_a_cut_off_peak_has_no_width() -> None:
    energies = np.linspace(0, 1, 101)
    assert find_peaks(lambda e: e + 0.01 * np.sin(40 * e), energies, 3) == []
    (peak,) = find_peaks(lambda e: 1 - (e - 0.5) ** 2, energies, 1)
    assert peak.width is None


def test_gaps_are_left_out() -> None:
    def held(e: Array) -> Array:
        return np.where(e < 1.5, two_resonances(e), np.nan)

    assert len(find_peaks(held, np.linspace(0.5, 2.5, 801), 3)) == 1
