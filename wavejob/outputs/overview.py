"""One picture that tells a run's story: start and end over the potential, the carpet, and what came out."""

from __future__ import annotations

import textwrap
from pathlib import Path

import numpy as np
from matplotlib.text import Text

from . import film_words
from .axes import bottom_axis, numbers_room, side_axis, side_ticks
from .carpet import draw_time_axes, paint_carpet, paint_curves
from .choices import CLOSE_UP_MARGIN, choose
from .encode import write_png
from .key import Stroke, Wordings, Words, draw_key
from .names import pack
from .packet_panel import FLAT, PacketPanel
from .palette import INK, QUIET, START
from .scene import Scene
from .sheet import Panel, Rect, Sheet, plain_matplotlib
from .stage import close_up_title, draw_stage_axes, mark_close_up
from .titles import broken_into_lines
from .wording import clean, per, with_unit

Array = np.ndarray

WIDTH, HEIGHT, SHORT_HEIGHT = 1600, 1130, 820  # short where neither close-up nor momentum is shown
FONT = 15.0
LINE = 1.4 * FONT
FINE = 1.3
LEFT, STAGE_WIDTH = 110, 880
RIGHT, RIGHT_WIDTH = 1110, 460
STAGE = Rect(LEFT, 140, STAGE_WIDTH, 250)
CARPET = Rect(LEFT, 420, STAGE_WIDTH, 270)
CHANCES = Rect(RIGHT, 420, RIGHT_WIDTH, 270)
KEY = Rect(LEFT, 752, STAGE_WIDTH + 90, round(2 * LINE))
READOUTS = Rect(RIGHT, 752, RIGHT_WIDTH, round(3 * LINE))
LOWER = (Rect(LEFT, 865, 560, 200), Rect(LEFT + 790, 865, 560, 200))
START_DASH = (0, (4, 2))
NAME_ROWS = 2
FINDINGS_TOP = 88.0
CHECK_LETTERS = 54
TRACE = 1e-3  # of the highest momentum density


def draw_overview(scene: Scene, path: Path) -> None:
    """Writes the overview of a run as a PNG, 1600 pixels wide. Raises RunError where it can't be written."""
    with plain_matplotlib():
        write_png(path, Overview(scene).pixels)


class Overview:
    """The picture: `pixels` (height, width, 4), uint8."""

    def __init__(self, scene: Scene) -> None:
        self.scene, self.chosen = scene, choose(scene)
        self.last = scene.frames - 1
        lower = self.chosen.close is not None or scene.wavenumber is not None
        with plain_matplotlib():
            self.sheet = Sheet((WIDTH, HEIGHT if lower else SHORT_HEIGHT))
            self._draw_caption()
            self._draw_stage()
            self._draw_momentum()
            self._draw_key()
            self._draw_findings()
            self.pixels = self._painted()

    def texts(self) -> list[Text]:
        """Every visible text."""
        return self.sheet.texts()

    def _draw_caption(self) -> None:
        sheet, scene = self.sheet, self.scene
        lines, size = broken_into_lines(sheet, scene.title, (26, 16), RIGHT - LEFT - 2 * FONT)
        first = 42 if len(lines) == 1 else 30
        for number, words in enumerate(lines):
            sheet.text(LEFT, first + number * 1.2 * size, words, size, bold=True)
        said = sheet.fit(scene.subtitle, FONT, RIGHT - LEFT - 2 * FONT)
        sheet.text(LEFT, 42 + 1.9 * FONT, said, FONT, colour=QUIET)
        sheet.text(RIGHT, 42, sheet.fit(film_words.run_line(scene), 18, RIGHT_WIDTH, bold=True), 18, bold=True)

    def _draw_stage(self) -> None:
        sheet, scene, chosen = self.sheet, self.scene, self.chosen
        stage = Panel(STAGE, *chosen.view, *chosen.energies)
        self.carpet = Panel(CARPET, *chosen.view, *chosen.span, downward=True)
        self.packets = [PacketPanel(sheet, scene, chosen, stage, phases=None, fine=FINE)]
        axis, room = draw_stage_axes(sheet, scene, self.packets[0], FONT, self.carpet)
        self.axes = [(axis, self.last)]
        names = film_words.detector_names(scene, stage, chosen.magnified)
        names += film_words.place_names(scene, stage, beyond=chosen.close)
        placed, self.homeless = pack(sheet, names, FONT, (LEFT, LEFT + STAGE_WIDTH + 40), NAME_ROWS)
        film_words.write_names(sheet, placed, STAGE.top, FONT, LINE)
        self.chances = Panel(CHANCES, 0.0, 1.0, *chosen.span, downward=True) if chosen.curves else None
        draw_time_axes(sheet, scene, self.carpet, self.chances, FONT, room)
        if chosen.close is not None:
            self._draw_close_up(stage, Panel(LOWER[0], *chosen.close, *chosen.energies))

    def _draw_close_up(self, stage: Panel, close: Panel) -> None:
        sheet, scene, rect = self.sheet, self.scene, close.rect
        mark_close_up(sheet, stage, close)
        reach = (close.x_high - close.x_low) / (2 + 4 * CLOSE_UP_MARGIN)  # of the structure itself
        inside = np.abs(scene.x - (close.x_low + close.x_high) / 2) < reach
        self.fullest = int(np.argmax(scene.density[:, inside].sum(axis=1)))
        self.packets.append(PacketPanel(sheet, scene, self.chosen, close, phases=None, fine=FINE))
        self.axes.append((draw_stage_axes(sheet, scene, self.packets[1], FONT, None)[0], self.fullest))
        bottom_axis(sheet, close, FONT, "x", scene.length_label)
        names = film_words.place_names(scene, close, within=self.chosen.close)
        placed, _ = pack(sheet, names, FONT, (rect.left, rect.right), 1)
        film_words.write_names(sheet, placed, rect.top, FONT, LINE)
        y = rect.top - 4 - (1.28 if placed else 0.28) * LINE
        said = f"{close_up_title(scene, stage, close)}, {self._time(self.fullest)}, when most is inside"
        sheet.text(rect.left, y, said, FONT, colour=QUIET)

    def _time(self, frame: int) -> str:
        number = film_words.time_numbers(self.scene.times)(float(self.scene.times[frame]))
        return f"t = {with_unit(number, self.scene.time_label)}"

    def _draw_momentum(self) -> None:
        """Momentum densities at the start and the end, where either is more than a trace."""
        scene, sheet = self.scene, self.sheet
        if scene.wavenumber is None or scene.momentum_start is None or scene.momentum_end is None:
            return
        both = np.maximum(scene.momentum_start, scene.momentum_end)
        highest = float(both.max()) or 1.0
        shown = scene.wavenumber[both > TRACE * highest]
        low, high = (float(shown[0]), float(shown[-1])) if shown.size else (-1.0, 1.0)
        margin = 0.05 * (high - low) or 1.0
        rect = LOWER[1] if self.chosen.close is not None else LOWER[0]
        panel = Panel(rect, low - margin, high + margin, 0.0, 1.06 * highest)
        bottom_axis(sheet, panel, FONT, "wavenumber", per(scene.length_label))
        room = numbers_room(sheet, side_ticks(panel, FONT), FONT)
        side_axis(sheet, panel, FONT, "momentum density", scene.length_label, room=room)
        k = panel.across(scene.wavenumber)
        sheet.line(k, panel.down(scene.momentum_start), START, 1.6 * FINE, dash=START_DASH, within=rect)
        sheet.line(k, panel.down(scene.momentum_end), INK, 1.2 * FINE, within=rect)

    def _draw_key(self) -> None:
        scene, chosen, sheet = self.scene, self.chosen, self.sheet
        items: list[Wordings] = [
            ((Stroke(START, START_DASH), Words(f"start, {self._time(0)}")),),
            ((Stroke(INK), Words(f"end, {self._time(self.last)}")),),
        ]
        items += film_words.key_items(scene, chosen, phases=None, where="", homeless=self.homeless, last=True)
        draw_key(sheet, items, FONT, LINE, KEY)
        draw_key(sheet, film_words.readout_items(chosen, self.last), FONT, LINE, READOUTS)

    def _draw_findings(self) -> None:
        """What failed, then the results, as many as there is room for."""
        sheet, scene = self.sheet, self.scene
        y, bottom = FINDINGS_TOP, float(STAGE.bottom)
        for check in scene.failed_checks:
            for number, words in enumerate(textwrap.wrap(clean(check), CHECK_LETTERS)):
                mark = "" if number else "\u2717"
                if y <= bottom:
                    sheet.text(RIGHT, y, mark, FONT, bold=True)
                    sheet.text(RIGHT + 1.4 * FONT, y, sheet.fit(words, FONT, RIGHT_WIDTH - 2 * FONT), FONT)
                y += LINE
        y += 0.4 * LINE if scene.failed_checks else 0.0
        room = max(int((bottom - y) / LINE) + 1, 0)
        shown = scene.results if len(scene.results) <= room else scene.results[: max(room - 1, 0)]
        for name, value in shown:
            said = sheet.fit(value, FONT, 0.7 * RIGHT_WIDTH)
            taken = sheet.measure(said, FONT)
            sheet.text(RIGHT, y, sheet.fit(name, FONT, RIGHT_WIDTH - taken - FONT), FONT, colour=QUIET)
            sheet.text(RIGHT + RIGHT_WIDTH, y, said, FONT, align="right")
            y += LINE
        if len(shown) < len(scene.results) and y <= bottom + 1:
            more = f"and {len(scene.results) - len(shown)} more in results.json"
            sheet.text(RIGHT, y, more, FONT, colour=QUIET)

    def _painted(self) -> Array:
        sheet, scene, chosen = self.sheet, self.scene, self.chosen
        pixels = sheet.draw()
        paint_carpet(sheet, scene, self.carpet, chosen.carpet, FINE, pixels)
        if self.chances is not None:
            paint_curves(sheet, scene.times, self.chances, chosen, FINE)
        stage, *close_ups = self.packets
        stage.paint(self.last, pixels, shadow=0)
        tops = np.where(stage.heights[0] > FLAT, stage.tops(0), np.nan)
        sheet.paint(sheet.line(stage.x, tops, START, 1.2 * FINE, dash=START_DASH, within=STAGE, moving=True))
        for packet in close_ups:
            packet.paint(self.fullest, pixels)
        for axis, frame in self.axes:
            axis.paint(frame)
        return pixels
