"""The interpolant between grid points."""

from __future__ import annotations

import numpy as np
import pytest

from wavejob.grid import Axis
from wavejob.observables.interpolant import finer


@pytest.mark.parametrize("transform", ["periodic", "sine"])
@pytest.mark.parametrize("points", [96, 97])
@pytest.mark.parametrize("times", [2, 5])
def test_a_packet_between_the_points(transform: str, points: int, times: int) -> None:
    """A band-limited function is its own interpolant (Shannon 1949): a Gaussian well inside the grid, to rounding."""
    axis = Axis("x", -12.0, 12.5, points, transform)  # type: ignore[arg-type]
    fine = Axis("x", -12.0, 12.5, times * points, transform)  # type: ignore[arg-type]

    def packet(x: np.ndarray) -> np.ndarray:
        return np.exp(-((x - 1) ** 2) / 3 + 2j * x)

    np.testing.assert_allclose(finer(axis, packet(axis.x), times), packet(fine.x), atol=1e-12)
