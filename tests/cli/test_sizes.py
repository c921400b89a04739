"""Times as people write them on the command line."""

from __future__ import annotations

import pytest

from wavejob.cli.sizes import SizeError, read_duration


@pytest.mark.parametrize(("text", "seconds"), [("90s", 90), ("30 min", 1800), ("2h", 7200), ("1.5 d", 129600)])
def test_times(text: str, seconds: float) -> None:
    """SI Brochure 2019, table 8: 60 s, 3600 s and 86400 s."""
    assert read_duration(text) == seconds


@pytest.mark.parametrize("text", ["", "2", "1x", "-1h", "0s", "h", "1 h 30 min"])
def test_what_is_no_time(text: str) -> None:
    with pytest.raises(SizeError, match="write a number and a unit"):
        read_duration(text)
