"""The overview: one picture with everything a run wants to tell, and nothing said over something else."""

from __future__ import annotations

from dataclasses import replace

import numpy as np
import pytest
from PIL import Image

from tests.outputs.scenes import MAKERS, TITLE, scene
from tests.outputs.test_film import overlapping
from wavejob.outputs.overview import Overview, draw_overview
from wavejob.problems import RunError


def said(overview):
    return "\n".join(text.get_text() for text in overview.texts())


MANY = tuple((f"a.rather.long.name.of.result.{n}", "0.12345 ± 0.00067 hbar/hartree") for n in range(40))
CHECKS = (
    "edge leakage: 3e-4 came back from the absorbing layer; give `edges` at least 90 nm",
    "grid: too coarse",
)


@pytest.mark.parametrize("name", MAKERS)
def test_no_two_texts_overlap_and_none_leaves_the_picture(name):
    """From the boxes of the drawn texts; the title has 80 characters, the results are too many."""
    overview = Overview(replace(scene(name), title=TITLE, results=MANY, failed_checks=CHECKS))
    drawn = [(t.get_text(), t.get_window_extent(overview.sheet.renderer)) for t in overview.texts()]
    assert overlapping(drawn) == []
    height, width = overview.pixels.shape[:2]
    assert [t for t, b in drawn if b.x0 < 0 or b.y0 < 0 or b.x1 > width or b.y1 > height] == []
    assert "more in results.json" in said(overview)


def test_it_tells_results_verdict_and_failed_checks():
    shown = replace(scene("double barrier"), verdict="doubtful", failed_checks=CHECKS)
    words = said(Overview(shown))
    wanted = ["transmitted.total", "0.1589 ± 0.0003", "doubtful", "edge leakage", "90 nm", "start, t = 0 fs"]
    wanted += [
        "end, t = 1480 fs",
        "wavenumber [1/nm]",
        "momentum density [nm]",
        "close-up",
        "transmitted 0.0889",
    ]
    assert [w for w in wanted if w not in words.replace("\n", " ")] == []


def test_a_picture_is_written_whole_or_not_at_all(tmp_path):
    draw_overview(scene("free"), tmp_path / "overview.png")
    with Image.open(tmp_path / "overview.png") as picture:
        assert picture.size[0] == 1600
    assert [p.name for p in tmp_path.iterdir()] == ["overview.png"]
    with pytest.raises(RunError, match="its folder is gone"):
        draw_overview(scene("free"), tmp_path / "gone" / "overview.png")


def test_the_close_up_shows_the_time_at_which_most_is_inside():
    shown = scene("double barrier")
    overview = Overview(shown)
    share = shown.density[:, np.abs(shown.x) < 6].sum(axis=1)  # between the outer edges of the barriers
    assert share[overview.fullest] == pytest.approx(share.max(), rel=0.01)
    assert np.ptp(overview.packets[1].heights[overview.fullest]) > 10
