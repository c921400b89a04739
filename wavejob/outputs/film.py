"""The film of a run: the packet over its potential, the space-time carpet below, probabilities beside it."""

from __future__ import annotations

from collections.abc import Callable
from pathlib import Path

from .encode import write_gif, write_mp4
from .film_picture import Film
from .scene import Scene
from .sheet import plain_matplotlib


def draw_film(
    scene: Scene,
    path: Path,
    *,
    size: tuple[int, int] = (1280, 720),
    fps: float = 25,
    progress: Callable[[int, int], None] | None = None,
) -> None:
    """Writes the film of `scene` as H.264 (`.mp4`) or GIF (`.gif`), one frame for each time.

    `progress` is told (frames drawn, frames in all). Raises ValueError for a size that is odd or below
    640x360 or for another ending, RunError where the film can't be encoded or written.
    """
    if path.suffix not in {".mp4", ".gif"}:
        raise ValueError(f"a film ends with .mp4 or .gif, got `{path.name}`")
    with plain_matplotlib():
        film = Film(scene, size)
        if path.suffix == ".mp4":
            write_mp4(path, film.frame, scene.frames, size=size, fps=fps, progress=progress)
        else:
            write_gif(path, film.frame, scene.frames, fps=fps, progress=progress)
