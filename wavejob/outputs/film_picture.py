"""The picture of a film and its frames.

Everything that stands still is drawn once. Carpet and probabilities are drawn once in full, and each frame
uncovers their rows down to its time; the packet is filled straight into the frame's pixels.
"""

from __future__ import annotations

import numpy as np
from matplotlib.text import Text

from . import film_words
from .axes import bottom_axis
from .carpet import Now, draw_time_axes, paint_carpet, paint_curves
from .choices import choose
from .key import draw_key, rows_needed
from .layout import LINE, Layout, arrange, widths
from .names import PlacedName, pack
from .packet_panel import PacketPanel
from .palette import QUIET
from .scene import Scene
from .sheet import Panel, Rect, Sheet, plain_matplotlib
from .stage import close_up_title, draw_stage_axes, mark_close_up, phases_for
from .titles import broken_into_lines
from .wording import with_unit

Array = np.ndarray

SMALLEST = (640, 360)
NAME_ROWS = 2
KEY_ROWS = 3


class Film:
    """The picture of a scene at a size, and its frames. Texts are where they stay; few of them change."""

    def __init__(self, scene: Scene, size: tuple[int, int]) -> None:
        if size[0] % 2 or size[1] % 2 or size[0] < SMALLEST[0] or size[1] < SMALLEST[1]:
            least = "x".join(map(str, SMALLEST))
            raise ValueError(f"a film has an even width and height from {least}, got {size}")
        self.scene, self.fine = scene, max(size[1] / 720, 0.75)
        self.chosen = choose(scene)
        self.time_numbers = film_words.time_numbers(scene.times)
        with plain_matplotlib():
            self.sheet = Sheet(size)
            self._lay_out(size)
            self._draw_caption()
            self._draw_packet()
            self._draw_carpet()
            self._draw_key()
            self.pixels = self.sheet.draw()
            self.empty = self.pixels.copy()
            self._paint_in_full()
            self.full = self.pixels.copy()

    def _lay_out(self, size: tuple[int, int]) -> None:
        """Words first, since the heights depend on how many rows they take."""
        scene, sheet, chosen = self.scene, self.sheet, self.chosen
        right_column = chosen.close is not None or bool(chosen.curves)
        self.across = across = widths(size, right_column)
        self.font = font = across.font
        self.line = LINE * font
        stage = self._panel(Rect(across.stage_left, 0, across.stage_width, 1), chosen.view)
        names = film_words.detector_names(scene, stage, chosen.magnified)
        names += film_words.place_names(scene, stage, beyond=chosen.close)
        span = (across.stage_left, across.stage_right + across.axis / 2)
        self.names, homeless = pack(sheet, names, font, span, NAME_ROWS)
        self.close_names = self._close_names()
        self.phases = phases_for(scene, chosen.view, across.stage_width)
        self.close_phases = phases_for(scene, chosen.close, across.right_width) if chosen.close else None
        in_key = self.phases if self.phases is not None else self.close_phases
        where = "" if in_key is self.phases else " in the close-up"
        self.key = film_words.key_items(scene, chosen, phases=in_key, where=where, homeless=homeless)
        self.readouts = film_words.readout_items(chosen)
        self.key_at_foot = chosen.close is not None or not right_column
        rows = min(rows_needed(sheet, self.key, font, across.stage_width + across.axis), KEY_ROWS)
        self.clock_left = across.right_left if right_column else round(0.76 * size[0])
        self.caption_width = self.clock_left - across.stage_left - 2 * font
        sizes = (max(20 * size[1] / 720, 13), 0.9 * font)
        self.title, self.title_pixels = broken_into_lines(sheet, scene.title, sizes, self.caption_width)
        taken = [name.row + 1 for name in [*self.names, *self.close_names]]
        self.close_title_row = 1 if self.close_names else 0
        taken += [self.close_title_row + 1] if chosen.close else []
        self.layout: Layout = arrange(
            size,
            across,
            title_lines=len(self.title),
            title_pixels=self.title_pixels,
            name_rows=max(taken, default=0),
            close_up=chosen.close is not None,
            key_rows=max(rows, len(self.readouts)) if self.key_at_foot else 0,
        )

    def _close_names(self) -> list[PlacedName]:
        """Names of the regions inside the close-up, in the row below its title."""
        close, across = self.chosen.close, self.across
        if close is None:
            return []
        panel = self._panel(Rect(across.right_left, 0, across.right_width, 1), close)
        names = film_words.place_names(self.scene, panel, within=close)
        span = (across.right_left, across.right_left + across.right_width)
        return pack(self.sheet, names, self.font, span, 1)[0]

    def _panel(self, rect: Rect, stretch: tuple[float, float]) -> Panel:
        return Panel(rect, *stretch, *self.chosen.energies)

    def _draw_caption(self) -> None:
        sheet, scene, place, font = self.sheet, self.scene, self.layout, self.font
        left = self.across.stage_left
        for number, words in enumerate(self.title):
            y = place.title_y + number * 1.2 * self.title_pixels
            sheet.text(left, y, words, self.title_pixels, bold=True)
        said = sheet.fit(scene.subtitle, font, self.caption_width)
        sheet.text(left, place.subtitle_y, said, font, colour=QUIET)
        size = max(self.title_pixels, 1.3 * font)
        sheet.text(self.clock_left, place.title_y, "t =", size, bold=True)
        after = self.clock_left + sheet.measure("t =", size, bold=True) + 0.4 * size
        self.clock = sheet.text(after, place.title_y, self._time_text(0), size, bold=True, moving=True)
        said = sheet.fit(film_words.run_line(scene), font, sheet.width - self.clock_left - 0.5 * font)
        sheet.text(self.clock_left, place.run_y, said, font, colour=QUIET)

    def _time_text(self, frame: int) -> str:
        return with_unit(self.time_numbers(float(self.scene.times[frame])), self.scene.time_label)

    def _draw_packet(self) -> None:
        sheet, scene, chosen, font, place = self.sheet, self.scene, self.chosen, self.font, self.layout
        stage = self._panel(place.stage, chosen.view)
        self.carpet = Panel(place.carpet, *chosen.view, *chosen.span, downward=True)
        self.packets = [PacketPanel(sheet, scene, chosen, stage, phases=self.phases, fine=self.fine)]
        self.density_axis, self.left_room = draw_stage_axes(sheet, scene, self.packets[0], font, self.carpet)
        film_words.write_names(sheet, [*self.names, *self.close_names], place.stage.top, font, self.line)
        if chosen.close is not None:
            close = self._panel(place.beside, chosen.close)
            mark_close_up(sheet, stage, close)
            packet = PacketPanel(sheet, scene, chosen, close, phases=self.close_phases, fine=self.fine)
            self.packets.append(packet)
            bottom_axis(sheet, close, font, "x", scene.length_label, named=False)
            y = place.stage.top - 4 - (self.close_title_row + 0.28) * self.line
            sheet.text(close.rect.left, y, close_up_title(scene, stage, close), font, colour=QUIET)

    def _draw_carpet(self) -> None:
        chosen, rect = self.chosen, self.layout.chances
        self.chances = Panel(rect, 0.0, 1.0, *chosen.span, downward=True) if chosen.curves else None
        draw_time_axes(self.sheet, self.scene, self.carpet, self.chances, self.font, self.left_room)
        self.now = Now(self.sheet, self.carpet, self.chances, chosen, self.fine)

    def _draw_key(self) -> None:
        """Below everything, or beside the stage where there is no close-up; the running values lowest."""
        place, font, line = self.layout, self.font, self.line
        above, below = place.key, place.readouts
        if not self.key_at_foot:
            needed = round(len(self.readouts) * line)
            beside = place.beside
            above = Rect(beside.left, beside.top, beside.width, beside.height - needed)
            below = Rect(beside.left, above.bottom, beside.width, needed)
        self.energy_text = next(iter(draw_key(self.sheet, self.key, font, line, above).moving.values()), None)
        self.value_texts = draw_key(self.sheet, self.readouts, font, line, below).moving

    def _paint_in_full(self) -> None:
        """Carpet, path and probabilities as they are at the end, onto the pixels."""
        paint_carpet(self.sheet, self.scene, self.carpet, self.chosen.carpet, self.fine, self.pixels)
        if self.chances is not None:
            paint_curves(self.sheet, self.scene.times, self.chances, self.chosen, self.fine)

    def frame(self, number: int) -> Array:
        """The pixels of one frame, shape (height, width, 4), uint8: valid until the next call."""
        rect = self.carpet.rect
        now = int(np.clip(round(float(self.carpet.down(self.scene.times[number]))), rect.top, rect.bottom))
        np.copyto(self.pixels, self.empty)
        self.pixels[rect.top : now] = self.full[rect.top : now]
        for packet in self.packets:
            packet.paint(number, self.pixels)
        self.density_axis.paint(number)
        self.now.paint(number, now)
        self._paint_words(number)
        return self.pixels

    def _paint_words(self, number: int) -> None:
        changing = [(self.clock, self._time_text(number))]
        if self.energy_text is not None:
            changing.append((self.energy_text, film_words.energy_text(self.scene, self.chosen, number)))
        for index, text in self.value_texts.items():
            values = self.chosen.curves[index][1]
            changing.append((text, film_words.value_numbers(values)(float(values[number]))))
        for text, said in changing:
            text.set_text(said)
            self.sheet.paint(text)

    def texts(self) -> list[Text]:
        """Every visible text as the last frame drew it."""
        return self.sheet.texts()
