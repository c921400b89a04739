"""Frames into a file: H.264 that browsers play, or a GIF. The file appears whole or not at all."""

from __future__ import annotations

import os
from collections.abc import Callable, Iterator
from pathlib import Path

import numpy as np
from PIL import Image

from ..problems import RunError
from .files import atomic_path

Array = np.ndarray
Frame = Callable[[int], Array]  # number of a frame -> its pixels, shape (height, width, 4), uint8
Progress = Callable[[int, int], None] | None  # is told (frames written, frames in all)

QUALITY = 20  # x264's constant rate factor: no blur around letters
GIF_COLOURS = 255
CURE = "`pip install imageio-ffmpeg`, or install `ffmpeg` with libx264, or skip the film with `--no-film`"


def write_mp4(
    path: Path, frame: Frame, frames: int, *, size: tuple[int, int], fps: float, progress: Progress
) -> None:
    """H.264 in yuv420p with its index at the start. Raises RunError where it can't be encoded or written."""
    try:
        import imageio_ffmpeg  # here, because pictures can be drawn without an encoder

        imageio_ffmpeg.get_ffmpeg_exe()
    except (ImportError, RuntimeError) as error:
        raise RunError(f"could not write `{path}`: no video encoder was found", CURE) from error
    with atomic_path(path) as temporary:
        options = ["-preset", "veryfast", "-crf", str(QUALITY), "-movflags", "+faststart", "-threads", "1"]
        try:
            writer = imageio_ffmpeg.write_frames(
                str(temporary),
                size,
                pix_fmt_in="rgba",
                pix_fmt_out="yuv420p",
                fps=fps,
                codec="libx264",
                quality=None,
                macro_block_size=2,
                ffmpeg_log_level="quiet",
                output_params=options,
            )
            writer.send(None)
            try:
                for number in range(frames):
                    writer.send(frame(number))
                    if progress is not None:
                        progress(number + 1, frames)
            finally:
                writer.close()
            written = imageio_ffmpeg.count_frames_and_secs(str(temporary))[0]
        except (OSError, RuntimeError) as error:
            _find_cause(temporary)
            raise RunError(f"could not write `{path}`: the encoder stopped", CURE) from error
        if written != frames:
            _find_cause(temporary)
            raise RunError(f"could not write `{path}`: the encoder kept {written} of {frames} frames", CURE)


def _find_cause(temporary: Path) -> None:
    """Raises the system's error where nothing more can be written: the encoder doesn't say why it stops."""
    with open(temporary, "ab") as file:
        file.write(bytes(1 << 16))
        file.flush()
        os.fsync(file.fileno())


def write_gif(path: Path, frame: Frame, frames: int, *, fps: float, progress: Progress) -> None:
    """A GIF that repeats, with one palette for all frames. Raises RunError where it can't be written."""
    with atomic_path(path) as temporary:
        sample = [frame(int(n))[::2, ::2, :3].copy() for n in np.linspace(0, frames - 1, min(5, frames))]
        palette = Image.fromarray(np.concatenate(sample)).quantize(GIF_COLOURS, dither=Image.Dither.NONE)

        def pictures() -> Iterator[Image.Image]:
            for number in range(frames):
                pixels = Image.fromarray(frame(number)[..., :3].copy())
                yield pixels.quantize(palette=palette, dither=Image.Dither.NONE)
                if progress is not None:
                    progress(number + 1, frames)

        all_of_them = pictures()
        hundredths = max(2, round(100 / fps))  # viewers slow down anything faster
        next(all_of_them).save(
            temporary,
            save_all=True,
            append_images=all_of_them,
            duration=10 * hundredths,
            loop=0,
            optimize=False,
        )


def write_png(path: Path, pixels: Array) -> None:
    """One picture, shape (height, width, 4). Raises RunError where it can't be written."""
    with atomic_path(path) as temporary:
        Image.fromarray(pixels[..., :3].copy()).save(temporary, optimize=True)
