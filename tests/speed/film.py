"""How much faster a frame is painted than drawn anew: `python -m tests.speed.film`.

The full draw is `canvas.draw()` of the same picture with matplotlib alone: every line and text of it is
drawn again, carpet and filled packet as images. Wanted: at least 4 frames painted for each one drawn.
"""

from __future__ import annotations

import time
from pathlib import Path
from tempfile import TemporaryDirectory

import numpy as np

from tests.outputs.scenes import double_barrier, driven
from tests.speed.timing import ratios
from wavejob.outputs.film import draw_film
from wavejob.outputs.film_picture import Film
from wavejob.outputs.scene import Scene
from wavejob.outputs.sheet import Rect, plain_matplotlib

WANTED = 4.0
FRAMES = 300


class FullDraw:
    """The film's picture as matplotlib draws it whole."""

    def __init__(self, scene: Scene) -> None:
        self.film = film = Film(scene, (1280, 720))
        film.frame(0)
        with plain_matplotlib():
            self.images = [(rect, self._image(rect)) for rect in (film.layout.carpet, film.packets[0].panel.rect)]
        for artist in film.sheet.figure.findobj():
            artist.set_animated(False)

    def _image(self, rect: Rect):
        sheet = self.film.sheet
        low = sheet.height - rect.bottom
        place = np.array([rect.left, low, rect.width, rect.height]) / np.tile([sheet.width, sheet.height], 2)
        axes = sheet.figure.add_axes(tuple(place))
        axes.set_axis_off()
        axes.set_zorder(-1)
        return axes.imshow(np.zeros((rect.height, rect.width, 3), np.uint8), aspect="auto", interpolation="nearest")

    def frame(self, number: int) -> None:
        pixels = self.film.frame(number)
        for rect, image in self.images:
            image.set_data(pixels[rect.top : rect.bottom, rect.left : rect.right, :3].copy())
        self.film.sheet.canvas.draw()


def compare(scene: Scene) -> float:
    """Time of a full draw over that of a painted frame; a full draw paints one too: taken off."""
    film, full = Film(scene, (1280, 720)), FullDraw(scene)

    def paint(count: int) -> None:
        for number in range(count):
            film.frame(number % scene.frames)

    def draw(count: int) -> None:
        for number in range(count):
            full.frame(number % scene.frames)

    return ratios({"painted": paint, "drawn": draw}, turns=7)["drawn"] - 1


def main() -> None:
    print("| scene | drawn / painted | wanted |")
    print("| --- | ---: | ---: |")
    for name, scene in (("double barrier", double_barrier()), ("driven barrier", driven())):
        print(f"| {name} | {compare(scene):.1f} | {WANTED} |")
    scene = double_barrier(FRAMES)
    with TemporaryDirectory() as folder:
        begun, own = time.perf_counter(), time.process_time()
        draw_film(scene, Path(folder) / "film.mp4")
        wall, own = time.perf_counter() - begun, time.process_time() - own
        size = (Path(folder) / "film.mp4").stat().st_size
    print(f"\n{FRAMES} frames of 1280x720: {wall:.1f} s, of which {own:.1f} s painting; {size // 1024} kB")


if __name__ == "__main__":
    main()
