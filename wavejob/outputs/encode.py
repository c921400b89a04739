"""Frames into a file: H.264 that browsers play, or a GIF. The file appears whole or not at all."""

from __future__ import annotations

import contextlib
import os
import shutil
from collections.abc import Callable, Iterator
from pathlib import Path
from subprocess import DEVNULL, PIPE, Popen
from tempfile import TemporaryFile
from typing import IO, cast

import imageio_ffmpeg
import numpy as np
from PIL import Image

from ..problems import RunError
from .files import atomic_path
from .palette import LINE_COLOURS, rgb

Array = np.ndarray
Frame = Callable[[int], Array]  # number of a frame -> its pixels, shape (height, width, 4), uint8
Progress = Callable[[int, int], None] | None  # is told (frames written, frames in all)

QUALITY = 20  # x264's constant rate factor: no blur around letters
GIF_COLOURS = 255
CURE = "`pip install imageio-ffmpeg`, or install `ffmpeg` with libx264, or skip the film with `--no-film`"


def video_encoder() -> str:
    """The program that makes the film. Raises RunError where there is none."""
    try:
        encoder = str(imageio_ffmpeg.get_ffmpeg_exe())
    except RuntimeError as error:
        raise RunError("no video encoder was found", CURE) from error
    if shutil.which(encoder) is None:
        raise RunError(f"the video encoder `{encoder}` is missing", CURE)
    return encoder


def write_mp4(path: Path, frame: Frame, frames: int, *, size: tuple[int, int], fps: float, progress: Progress) -> None:
    """H.264 in yuv420p with its index at the start. Raises RunError where it can't be encoded or written."""
    encoder = video_encoder()
    raw = ["-f", "rawvideo", "-pix_fmt", "rgba", "-s", f"{size[0]}x{size[1]}", "-r", str(fps), "-i", "-"]
    coded = ["-an", "-c:v", "libx264", "-preset", "veryfast", "-crf", str(QUALITY), "-threads", "1"]
    # players take pictures of this size for BT.709 whatever was written, and would shift every colour
    toned = ["-vf", "scale=out_color_matrix=bt709:out_range=tv", "-colorspace", "bt709"]
    toned += ["-color_primaries", "bt709", "-color_trc", "bt709", "-color_range", "tv"]
    played = ["-pix_fmt", "yuv420p", "-movflags", "+faststart"]
    with atomic_path(path) as temporary, TemporaryFile() as said:
        command = [encoder, "-y", "-v", "error", *raw, *coded, *toned, *played, str(temporary)]
        with _started(command, said) as process:
            sent = _send_all(process, frame, frames, progress)
        if not sent or process.returncode != 0:
            _find_cause(temporary)
            said.seek(0)
            last = said.read().decode(errors="replace").strip().rpartition("\n")[2]
            raise RunError(f"could not write `{path}`: the video encoder stopped ({last or 'no reason given'})", CURE)


def _started(command: list[str], said: IO[bytes]) -> Popen[bytes]:
    try:
        return Popen(command, stdin=PIPE, stdout=DEVNULL, stderr=said)
    except OSError as error:
        raise RunError(f"could not start the video encoder `{command[0]}`: {error.strerror}", CURE) from error


def _send_all(process: Popen[bytes], frame: Frame, frames: int, progress: Progress) -> bool:
    """Whether the encoder took every frame. It is stopped where drawing fails."""
    pipe = cast(IO[bytes], process.stdin)
    try:
        for number in range(frames):
            pixels = frame(number)
            try:
                pipe.write(pixels.data)
            except BrokenPipeError:
                return False
            if progress is not None:
                progress(number + 1, frames)
    except BaseException:
        process.kill()
        raise
    finally:
        with contextlib.suppress(BrokenPipeError):  # of what was not yet flushed
            pipe.close()
    return True


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
        palette = _palette(np.concatenate(sample))

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


def _palette(sample: Array) -> Image.Image:
    """A palette for pictures like `sample`, shape (rows, columns, 3), that keeps thin lines' colours."""
    lines = np.array([rgb(colour) for colour in LINE_COLOURS])
    common = Image.fromarray(sample).quantize(GIF_COLOURS - len(lines), dither=Image.Dither.NONE)
    colours = common.getpalette() or []
    palette = Image.new("P", (1, 1))
    palette.putpalette(colours[: 3 * (GIF_COLOURS - len(lines))] + [int(c) for c in lines.flat])
    return palette


def write_png(path: Path, pixels: Array) -> None:
    """One picture, shape (height, width, 4). Raises RunError where it can't be written."""
    with atomic_path(path) as temporary:
        Image.fromarray(pixels[..., :3].copy()).save(temporary, optimize=True)
