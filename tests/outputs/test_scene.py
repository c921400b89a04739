"""Scenes that are empty, single or broken are drawn or refused, never half drawn."""

from __future__ import annotations

import warnings
from dataclasses import replace

import matplotlib
import numpy as np
import pytest

from tests.outputs.scenes import scene
from wavejob.outputs.film_picture import Film
from wavejob.outputs.overview import Overview
from wavejob.outputs.scene import Scene

X = np.linspace(-1, 1, 64)


def small(**changes):
    """A scene with nothing in it but two frames of a packet."""
    given = {"title": "t", "subtitle": "s", "fingerprint": "f"}
    given |= {"length_label": "nm", "time_label": "fs", "energy_label": "meV"}
    given |= {"x": X, "times": np.array([0.0, 1.0]), "density": np.exp(-(np.stack([X, X]) ** 2))}
    given |= {"mean_energy": np.ones(2), "potential_x": np.array([-1.0, 1.0]), "potential": np.zeros(2)}
    return Scene(**{**given, **changes})


ODD = {
    "one frame": {"times": np.array([3.0]), "density": np.exp(-X[None] ** 2), "mean_energy": np.array([1.0])},
    "nothing there": {"density": np.zeros((2, 64))},
    "absorbed": {"density": np.stack([np.exp(-X**2), 0 * X]), "mean_energy": np.array([1.0, np.nan])},
    "no mean energy": {"mean_energy": np.array([np.nan, np.nan])},
    "no energy at all": {"mean_energy": np.zeros(2)},
    "below zero": {"mean_energy": np.array([-5.0, -5.0]), "potential": np.array([-10.0, -10.0])},
    "infinite potential": {"potential": np.array([np.inf, 0.0])},
    "deep": {"potential": np.array([-1e9, 0.0])},
    "tiny numbers": {"x": X * 1e-9, "potential_x": X[[0, -1]] * 1e-9, "density": np.full((2, 64), 1e-12)},
    "huge numbers": {"times": np.array([0.0, 1e9]), "mean_energy": np.array([1e12, 1e12])},
    "a view of nothing": {"view": (5.0, 6.0)},
    "a path that left": {"classical_path": np.array([0.0, np.nan])},
    "no letters": {"title": "", "subtitle": "", "fingerprint": ""},
    "nan probability": {"probabilities": (("p", np.array([np.nan, np.nan])),)},
    "zero probability": {"probabilities": (("p", np.zeros(2)),)},
    "detector at the end": {"detectors": (("d", 1.0, "+"), ("e", -1.0, "-"), ("far", 9.0, "+"))},
}  # fmt: skip


@pytest.mark.parametrize("name", ODD)
def test_odd_scenes_are_drawn(name):
    shown = small(**ODD[name])
    film = Film(shown, (640, 360))
    for frame in range(shown.frames):
        pixels = film.frame(frame)
    assert len(np.unique(pixels.reshape(-1, 4), axis=0)) > 10
    assert Overview(shown).pixels.shape[1] == 1600


@pytest.mark.parametrize(
    ("changes", "message"),
    [
        ({"density": np.zeros((3, 64))}, r"density has the shape \(3, 64\)"),
        ({"phase": np.zeros((2, 63))}, "phase has the shape"),
        ({"potential": np.zeros(3)}, "potential_x has the shape"),
        ({"probabilities": (("T", np.zeros(3)),)}, "probability T has the shape"),
        ({"times": np.zeros(0)}, "at least one time"),
        ({"wavenumber": np.zeros(4), "momentum_start": np.zeros(5)}, "momentum_start has the shape"),
    ],
)
def test_shapes_that_disagree_are_refused(changes, message):
    with pytest.raises(ValueError, match=message):
        small(**changes)


@pytest.mark.parametrize("title", ["$\\frac{1}{0", "a\nb\tc\x00d\u202ee", "\ud800 half", "量子 ψ 🐈 ع", "%s {}"])
def test_any_text_of_a_user_is_drawn_as_it_stands(title):
    """No formula is read, nothing warns, control characters are gone."""
    with warnings.catch_warnings():
        warnings.simplefilter("error")
        shown = small(title=title, detectors=((title, 0.0, "+"),), probabilities=((title, np.ones(2)),))
        film = Film(shown, (640, 360))
        film.frame(1)
    said = "".join(text.get_text() for text in film.texts())
    assert not set(said) & set("\n\t\x00\u202e\ud800")
    assert title.split()[0].rstrip("\x00\n\t\ud800")[:2] in said


def test_the_users_own_matplotlib_settings_change_nothing():
    plain = Film(scene("free"), (640, 360)).frame(5).copy()
    with matplotlib.rc_context({"font.size": 30, "lines.linestyle": ":", "text.color": "red", "hatch.color": "red"}):
        same = Film(scene("free"), (640, 360)).frame(5)
        np.testing.assert_array_equal(same, plain)
        assert matplotlib.rcParams["font.size"] == 30


def test_a_view_shows_only_its_part():
    film = Film(replace(scene("free"), view=(-10.0, 10.0)), (640, 360))
    assert (film.carpet.x_low, film.carpet.x_high) == (-10.0, 10.0)
