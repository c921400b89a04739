"""Films: nothing said overlaps, what is hard to see is magnified, and the file plays where it should."""

from __future__ import annotations

import itertools
import re
import subprocess
import sys
from dataclasses import replace
from pathlib import Path

import imageio_ffmpeg
import numpy as np
import pytest
from PIL import Image

from tests.outputs.scenes import MAKERS, TITLE, double_barrier, scene
from wavejob.outputs.film import draw_film
from wavejob.outputs.film_picture import Film
from wavejob.outputs.palette import CURVES, ENVELOPE, PAPER, rgb
from wavejob.problems import RunError

SIZES = [(640, 360), (1280, 720), (1920, 1080)]
SIZE_NAMES = ["x".join(map(str, size)) for size in SIZES]


def boxes(film, renderer):
    return [(text.get_text(), text.get_window_extent(renderer)) for text in film.texts()]


def overlapping(drawn):
    """Pairs of texts whose boxes share more than half a pixel each way."""
    pairs = []
    for (one, a), (other, b) in itertools.combinations(drawn, 2):
        across = min(a.x1, b.x1) - max(a.x0, b.x0)
        down = min(a.y1, b.y1) - max(a.y0, b.y0)
        if across > 0.5 and down > 0.5:
            pairs.append((one, other))
    return pairs


@pytest.mark.parametrize("size", SIZES, ids=SIZE_NAMES)
@pytest.mark.parametrize("name", MAKERS)
def test_no_two_texts_overlap_and_none_leaves_the_picture(name, size):
    """From the boxes of the drawn texts; the title has 80 characters."""
    assert len(TITLE) == 80
    drawn_scene = replace(scene(name), title=TITLE)
    film = Film(drawn_scene, size)
    for frame in (0, drawn_scene.frames // 2, drawn_scene.frames - 1):
        film.frame(frame)
        drawn = boxes(film, film.sheet.renderer)
        assert overlapping(drawn) == []
        outside = [t for t, b in drawn if b.x0 < 0 or b.y0 < 0 or b.x1 > size[0] or b.y1 > size[1]]
        assert outside == []


@pytest.mark.parametrize("size", SIZES, ids=SIZE_NAMES)
def test_a_title_of_80_characters_is_whole(size):
    film = Film(replace(scene("double barrier"), title=TITLE), size)
    said = " ".join(text.get_text() for text in film.texts())
    assert TITLE in said


@pytest.mark.parametrize("title", ["W" * 80, "i" * 80, "W " * 40, "", "many words " * 40])
def test_any_title_stays_inside_its_place(title):
    film = Film(replace(scene("free"), title=title), (640, 360))
    film.frame(0)
    assert overlapping(boxes(film, film.sheet.renderer)) == []


@pytest.mark.parametrize("size", SIZES, ids=SIZE_NAMES)
def test_nothing_essential_is_left_out(size):
    """Caption, units of every axis, keys, magnification: at every size."""
    film = Film(scene("double barrier"), size)
    film.frame(60)
    said = "\n".join(text.get_text() for text in film.texts())
    wanted = [
        "3f9a0c12d4",
        "trusted",
        "fs",
        "x [nm]",
        "time [fs]",
        "potential [meV]",
        "1/nm]",
        "probability",
        "phase",
        "F = m a",
        "mean energy",
        "70.4 meV",
        "transmitted",
        "in the well",
        "before the stack",
        "well",
        "close-up",
    ]
    assert [words for words in wanted if words not in said] == []


def test_the_magnification_beyond_a_detector_is_stated_and_true():
    """A power of ten that brings the highest density beyond the detector to 0.1 to 1 of the highest."""
    shown = scene("double barrier")
    film = Film(shown, (1280, 720))
    said = "\n".join(text.get_text() for text in film.texts())
    assert "transmitted → curve ×10²" in said
    beyond = shown.density[:, shown.x > 60].max() / shown.density.max()
    assert 0.1 < 100 * beyond < 1
    stage = film.packets[0]
    column = int(stage.panel.across(150.0)) - stage.panel.rect.left
    plain = shown.density[60][np.searchsorted(shown.x, 150.0)] / stage.per_pixel
    assert stage.heights[60, column] == pytest.approx(100 * plain, rel=0.02)  # 0.8 nm a column on this slope


def test_small_probabilities_are_magnified_and_say_so():
    film = Film(scene("double barrier"), (1280, 720))
    said = "\n".join(text.get_text() for text in film.texts())
    assert "(curve ×10)" in said  # transmitted ends at 0.0889


def colours_of_packet(film, frame):
    """How many colours the filled packet has in the row just above its baseline."""
    pixels = film.frame(frame)
    stage = film.packets[0]
    row = int(stage.base[frame]) - 3
    inside = stage.heights[frame] > 8
    columns = stage.panel.rect.left + np.flatnonzero(inside)
    return np.unique(pixels[row, columns, :3], axis=0)


@pytest.mark.parametrize(("pixels", "coloured"), [(7.9, False), (8.1, True)])
def test_phase_colours_only_where_a_wave_spans_eight_pixels(pixels, coloured):
    shown = scene("free")
    width = Film(shown, (1280, 720)).layout.stage.width
    film = Film(replace(shown, wavelength=80 / width * pixels), (1280, 720))
    colours = colours_of_packet(film, 10)
    assert (len(colours) > 20) == coloured
    assert any(np.array_equal(c, rgb(ENVELOPE)) for c in colours) != coloured
    said = [text.get_text() for text in film.texts()]
    assert ("phase" in said) == coloured


def test_a_hairline_structure_gets_a_close_up_that_spans_it():
    film = Film(scene("double barrier"), (1280, 720))
    low, high = film.chosen.close
    assert -40 < low < -6
    assert 6 < high < 40
    assert Film(scene("morse"), (1280, 720)).chosen.close is None


def test_the_baseline_follows_the_mean_energy():
    film = Film(scene("driven"), (1280, 720))
    stage = film.packets[0]
    wanted = stage.panel.down(scene("driven").mean_energy)
    assert np.abs(stage.base - wanted).max() <= 0.5
    assert np.ptp(stage.base) > 5


def test_the_carpet_grows_with_time():
    """Rows later than the frame's time are still empty, earlier ones stay as they were."""
    film = Film(scene("free"), (640, 360))
    rect = film.layout.carpet
    early, late = film.frame(20).copy(), film.frame(40).copy()
    now = round(float(film.carpet.down(scene("free").times[20])))
    inner = slice(rect.left + 2, rect.right - 2)
    np.testing.assert_array_equal(early[rect.top : now, inner], late[rect.top : now, inner])
    assert np.unique(early[now + 2 : rect.bottom - 2, inner, :3].reshape(-1, 3), axis=0).shape[0] == 1


@pytest.mark.parametrize(("name", "logarithmic"), [("double barrier", True), ("morse", False), ("free", False)])
def test_the_carpet_is_logarithmic_where_something_weak_must_be_seen(name, logarithmic):
    film = Film(scene(name), (1280, 720))
    assert film.chosen.carpet.logarithmic is logarithmic
    said = " ".join(text.get_text() for text in film.texts())
    assert ("logarithmic" if logarithmic else "linear") in said


def test_frames_do_not_depend_on_their_order():
    film = Film(scene("driven"), (640, 360))
    first = film.frame(30).copy()
    film.frame(50)
    np.testing.assert_array_equal(film.frame(30), first)


@pytest.mark.parametrize("size", [(640, 360), (854, 480)])
def test_mp4_has_every_frame_and_plays_in_browsers(tmp_path, size):
    """What the decoder says; every browser plays yuv420p with an index at the start (common practice)."""
    shown = scene("morse")
    told = []
    draw_film(shown, tmp_path / "film.mp4", size=size, fps=30, progress=lambda n, of: told.append((n, of)))
    decoded = subprocess.run(
        [
            imageio_ffmpeg.get_ffmpeg_exe(),
            "-i",
            tmp_path / "film.mp4",
            "-f",
            "rawvideo",
            "-pix_fmt",
            "rgb24",
            "-",
        ],
        capture_output=True,
        check=True,
    )
    said = decoded.stderr.decode()
    assert re.search(rf"Video: h264 .*yuv420p\(.*, {size[0]}x{size[1]}\b.*, 30 fps", said)
    frames = np.frombuffer(decoded.stdout, dtype=np.uint8).reshape(-1, size[1], size[0], 3)
    assert len(frames) == shown.frames
    # half-resolution colour and its coding blur single pixels, but not the picture
    drawn = Film(shown, size).frame(40)[..., :3]
    assert np.abs(frames[40].astype(float) - drawn).mean() < 3
    paper = frames[40][2, 2].astype(float)
    assert np.abs(paper - rgb(PAPER)).max() <= 2  # one step of 219 in luma, and rounding
    assert "bt709" in said
    assert told == [(n + 1, shown.frames) for n in range(shown.frames)]
    start = (tmp_path / "film.mp4").read_bytes()
    assert start.index(b"moov") < start.index(b"mdat")
    assert [p.name for p in tmp_path.iterdir()] == ["film.mp4"]


def test_gif_has_every_frame_and_one_palette(tmp_path):
    draw_film(double_barrier(frames=12, until=400.0), tmp_path / "film.gif", size=(640, 360), fps=20)
    with Image.open(tmp_path / "film.gif") as gif:
        assert gif.n_frames == 12
        assert gif.size == (640, 360)
        assert gif.info["duration"] == 50
        assert gif.info["loop"] == 0
        seen = np.unique(np.array(gif.convert("RGB"), dtype=int).reshape(-1, 3), axis=0)
    for colour in (PAPER, *(colour for colour, _, _ in CURVES)):
        assert np.abs(seen - rgb(colour)).max(axis=1).min() <= 4  # looked up in cells of 4 to 8 levels


def test_a_film_that_fails_leaves_nothing_and_keeps_the_old_one(tmp_path):
    path = tmp_path / "film.mp4"
    path.write_bytes(b"the old film")

    def stop(number, _of):
        if number == 5:
            raise KeyboardInterrupt

    with pytest.raises(KeyboardInterrupt):
        draw_film(scene("free"), path, size=(640, 360), progress=stop)
    assert path.read_bytes() == b"the old film"
    assert [p.name for p in tmp_path.iterdir()] == ["film.mp4"]


def test_no_encoder_is_a_run_error_with_a_cure(tmp_path, monkeypatch):
    def nothing():
        raise RuntimeError("No ffmpeg exe could be found.")

    monkeypatch.setattr(imageio_ffmpeg, "get_ffmpeg_exe", nothing)
    with pytest.raises(RunError, match="no video encoder was found; `pip install imageio-ffmpeg`"):
        draw_film(scene("free"), tmp_path / "film.mp4", size=(640, 360))
    assert list(tmp_path.iterdir()) == []


def test_an_encoder_that_stops_is_a_run_error(tmp_path, monkeypatch):
    monkeypatch.setenv("IMAGEIO_FFMPEG_EXE", "/bin/false")
    with pytest.raises(RunError, match="the video encoder stopped"):
        draw_film(scene("free"), tmp_path / "film.mp4", size=(640, 360))
    assert list(tmp_path.iterdir()) == []


LIMITED = """
import resource, signal, sys
from pathlib import Path
from tests.outputs.scenes import scene
from wavejob.outputs.film import draw_film
from wavejob.problems import RunError
import imageio_ffmpeg
shown = scene("driven")
draw_film(shown, Path(sys.argv[1]), size=(640, 360))
Path(sys.argv[1]).unlink()
signal.signal(signal.SIGXFSZ, signal.SIG_IGN)
resource.setrlimit(resource.RLIMIT_FSIZE, (20000, 20000))
try:
    draw_film(shown, Path(sys.argv[1]), size=(640, 360))
except RunError as error:
    print(error)
"""


@pytest.mark.parametrize("name", ["film.mp4", "film.gif"])
def test_a_file_that_may_not_grow_is_told_by_its_cause(tmp_path, name):
    """A limit on file sizes stands for a full disk: both come back as an error of the system's write."""
    told = subprocess.run(
        [sys.executable, "-c", LIMITED, str(tmp_path / name)],
        capture_output=True,
        text=True,
        check=True,
        cwd=Path(__file__).parents[2],
    )
    assert "the file would be larger than allowed here" in told.stdout
    assert list(tmp_path.iterdir()) == []


@pytest.mark.parametrize("size", [(641, 360), (640, 361), (320, 180)])
def test_sizes_that_cannot_be_encoded_or_read_are_refused(tmp_path, size):
    with pytest.raises(ValueError, match="even width and height from 640x360"):
        draw_film(scene("free"), tmp_path / "film.mp4", size=size)


def test_other_endings_are_refused(tmp_path):
    with pytest.raises(ValueError, match=r"ends with \.mp4 or \.gif"):
        draw_film(scene("free"), tmp_path / "film.avi")
