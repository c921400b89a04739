"""The picture of a film and its frames.

Everything that stands still is drawn once. Carpet and probabilities are drawn once in full, and each frame
uncovers their rows down to its time; the packet is filled straight into the frame's pixels.
"""

from __future__ import annotations

import numpy as np
from matplotlib.text import Text

from . import choices, film_words
from .axes import bottom_axis, numbers_room, side_axis, side_name, side_ticks, spine, upright_grid
from .carpet import Now, paint_carpet, paint_curves
from .key import draw_key, rows_needed
from .layout import LINE, Layout, arrange, widths
from .names import PlacedName, pack
from .packet_panel import DensityAxis, PacketPanel
from .palette import CLOSE_UP, QUIET, phase_table
from .scene import Scene
from .sheet import Panel, Rect, Sheet, plain_matplotlib
from .titles import broken_into_lines
from .wording import axis_label, numbers_for, per, ticks, with_unit

Array = np.ndarray

SMALLEST = (640, 360)
PEAK_AT = 0.94  # of the room above the baseline
NAME_ROWS = 2
KEY_ROWS = 3


class Film:
    """The picture of a scene at a size, and its frames. Texts are where they stay; few of them change."""

    def __init__(self, scene: Scene, size: tuple[int, int]) -> None:
        if size[0] % 2 or size[1] % 2 or size[0] < SMALLEST[0] or size[1] < SMALLEST[1]:
            raise ValueError(
                f"a film has an even width and height from {SMALLEST[0]}x{SMALLEST[1]}, got {size}"
            )
        self.scene, self.fine = scene, max(size[1] / 720, 0.75)
        with plain_matplotlib():
            self.sheet = Sheet(size)
            self._choose()
            self._lay_out(size)
            self._draw_caption()
            self._draw_packet()
            self._draw_carpet_and_chances()
            self.pixels = self.sheet.draw()
            self.empty = self.pixels.copy()
            self._paint_in_full()
            self.full = self.pixels.copy()

    def _choose(self) -> None:
        scene = self.scene
        self.view = choices.view_of(scene)
        self.baseline = choices.baseline_energies(scene)
        self.energies = choices.energy_range(scene, self.view, self.baseline)
        self.highest = choices.highest_density(scene, self.view)
        self.magnified = choices.magnifications(scene, self.view, self.highest)
        self.carpet_scale = choices.carpet_scale(scene, self.view, self.highest)
        self.close = choices.close_up(scene, self.view, self.energies)
        self.curves = scene.probabilities[: film_words.MOST_CURVES]
        self.curve_powers = film_words.curve_powers(scene)
        self.curve_numbers = [film_words.value_numbers(v) for _, v in self.curves]
        first, last = float(scene.times[0]), float(scene.times[-1])
        self.span = (first, last if last > first else first + 1.0)
        self.time_numbers = film_words.time_numbers(scene.times)
        largest = float(np.abs(self.baseline).max())
        self.energy_numbers = numbers_for(largest, largest / 200)

    def _lay_out(self, size: tuple[int, int]) -> None:
        scene, sheet = self.scene, self.sheet
        right_column = self.close is not None or bool(self.curves)
        self.across = across = widths(size, right_column)
        self.font, self.line = across.font, LINE * across.font
        stage = self._panel(Rect(across.stage_left, 0, across.stage_width, 1), *self.view)
        names = film_words.detector_names(scene, stage, self.magnified)
        names += film_words.place_names(scene, stage, beyond=self.close)
        span = (across.stage_left, across.stage_right + across.axis / 2)
        self.names, homeless = pack(sheet, names, self.font, span, NAME_ROWS)
        self.close_names = self._close_names()
        self.stage_phases = self._phases(self.view, across.stage_width)
        close_phases = self._phases(self.close, across.right_width) if self.close else None
        self.close_phases = close_phases
        in_key = self.stage_phases if self.stage_phases is not None else close_phases
        only_close = self.stage_phases is None and close_phases is not None
        self.key = film_words.key_items(
            scene,
            self.carpet_scale,
            self.energy_numbers,
            self.baseline,
            phases=in_key,
            where=" in the close-up" if only_close else "",
            homeless=homeless,
        )
        self.readouts = film_words.readout_items(scene, self.curve_numbers, self.curve_powers)
        self.key_at_foot = self.close is not None or not right_column
        key_width = across.stage_width + across.axis
        rows = max(min(rows_needed(sheet, self.key, self.font, key_width), KEY_ROWS), len(self.readouts))
        unit = size[1] / 720
        self.clock_left = across.right_left if right_column else round(0.76 * size[0])
        largest = 20 * unit if unit > 0.7 else 13
        caption_width = self.clock_left - across.stage_left - 2 * self.font
        sizes = (largest, 0.9 * self.font)
        self.title, self.title_pixels = broken_into_lines(sheet, scene.title, sizes, caption_width)
        placed = [n.row for n in self.names] + ([self.close_title_row] if self.close else [])
        self.layout: Layout = arrange(
            size,
            across,
            title_lines=len(self.title),
            title_pixels=self.title_pixels,
            name_rows=max(placed, default=-1) + 1,
            close_up=self.close is not None,
            key_rows=rows if self.key_at_foot else 0,
        )
        self.caption_width = caption_width

    def _close_names(self) -> list[PlacedName]:
        """Names of the regions inside the close-up, in the row below its title."""
        if self.close is None:
            return []
        left, width = self.across.right_left, self.across.right_width
        panel = self._panel(Rect(left, 0, width, 1), *self.close)
        names = film_words.place_names(self.scene, panel, within=self.close)
        placed, _ = pack(self.sheet, names, self.font, (left, left + width), 1)
        self.close_title_row = 1 if placed else 0
        return placed

    def _panel(self, rect: Rect, low: float, high: float) -> Panel:
        return Panel(rect, low, high, *self.energies)

    def _phases(self, stretch: tuple[float, float], width: int) -> Array | None:
        """Phase colours where a wavelength spans enough pixels of a panel, else None."""
        if self.scene.phase is None or self.scene.wavelength is None:
            return None
        pixels = self.scene.wavelength / (stretch[1] - stretch[0]) * width
        return phase_table(pixels, choices.SHORTEST_WAVE) if pixels >= choices.SHORTEST_WAVE else None

    def _draw_caption(self) -> None:
        sheet, scene, place = self.sheet, self.scene, self.layout
        left = self.across.stage_left
        for number, words in enumerate(self.title):
            y = place.title_y + number * 1.2 * self.title_pixels
            sheet.text(left, y, words, self.title_pixels, bold=True)
        said = sheet.fit(scene.subtitle, self.font, self.caption_width)
        sheet.text(left, place.subtitle_y, said, self.font, colour=QUIET)
        size = max(self.title_pixels, 1.3 * self.font)
        sheet.text(self.clock_left, place.title_y, "t =", size, bold=True)
        after = self.clock_left + sheet.measure("t =", size, bold=True) + 0.4 * size
        self.clock = sheet.text(after, place.title_y, self._time_text(0), size, bold=True, moving=True)
        room = sheet.width - self.clock_left - 0.5 * self.font
        said = sheet.fit(film_words.run_line(scene), self.font, room)
        sheet.text(self.clock_left, place.run_y, said, self.font, colour=QUIET)

    def _time_text(self, frame: int) -> str:
        return with_unit(self.time_numbers(float(self.scene.times[frame])), self.scene.time_label)

    def _draw_packet(self) -> None:
        sheet, scene, font, place = self.sheet, self.scene, self.font, self.layout
        stage = self._panel(place.stage, *self.view)
        self.carpet = Panel(place.carpet, *self.view, *self.span, downward=True)
        room = float(np.min(stage.down(self.baseline))) - place.stage.top
        per_pixel = self.per_pixel = self.highest / (PEAK_AT * room)
        self.packets = [self._packet(stage, self.stage_phases, per_pixel)]
        density = ticks(0.0, room * per_pixel, max(int(room / (3 * font)), 1))
        self.density_axis = DensityAxis(sheet, self.packets[0], density, per_pixel, font)
        spine(sheet, stage)
        rooms = [numbers_room(sheet, shown, font) for shown in (density, side_ticks(self.carpet, font))]
        self.left_room = max(rooms)
        said = axis_label("density", per(scene.length_label), density.power)
        side_name(sheet, stage, said, font, room=self.left_room)
        right_room = numbers_room(sheet, side_ticks(stage, font), font)
        side_axis(sheet, stage, font, "potential", scene.energy_label, room=right_room, right=True)
        film_words.write_names(sheet, [*self.names, *self.close_names], place.stage.top, font, self.line)
        sheet.line([place.stage.left, place.stage.right], [place.stage.bottom] * 2, QUIET, 1)
        if self.close is None:
            return
        close = self._panel(place.beside, *self.close)
        sheet.rectangle(place.beside, CLOSE_UP, order=0.1)
        spot = [stage.across(x) for x in self.close]
        sheet.rectangle(
            Rect(int(spot[0]), place.stage.top, max(int(spot[1]) - int(spot[0]), 2), place.stage.height),
            CLOSE_UP,
            order=0.1,
        )
        self.packets.append(self._packet(close, self.close_phases, per_pixel))
        bottom_axis(sheet, close, font, "x", scene.length_label, named=False)
        self._name_close_up(close)

    def _packet(self, panel: Panel, phases: Array | None, per_pixel: float) -> PacketPanel:
        return PacketPanel(
            self.sheet,
            self.scene,
            panel,
            baseline=self.baseline,
            per_pixel=per_pixel,
            magnified=self.magnified,
            phases=phases,
            fine=self.fine,
        )

    def _name_close_up(self, close: Panel) -> None:
        sheet, font, rect = self.sheet, self.font, close.rect
        stage_scale = self.layout.stage.width / (self.view[1] - self.view[0])
        scale = rect.width / (close.x_high - close.x_low) / stage_scale
        y = rect.top - 4 - (self.close_title_row + 0.28) * self.line
        unit = f" [{self.scene.length_label}]" if self.scene.length_label else ""
        said = f"close-up \u00d7{scale:.0f}, x{unit}"
        sheet.text(rect.left, y, said, font, colour=QUIET)

    def _draw_carpet_and_chances(self) -> None:
        sheet, scene, font, place = self.sheet, self.scene, self.font, self.layout
        bottom_axis(sheet, self.carpet, font, "x", scene.length_label)
        side_axis(sheet, self.carpet, font, "time", scene.time_label, room=self.left_room)
        self.chances: Panel | None = None
        rects = [place.carpet]
        if self.curves:
            self.chances = chances = Panel(place.chances, 0.0, 1.0, *self.span, downward=True)
            most = 5 if place.chances.width > 20 * font else 2
            upright_grid(sheet, chances, most)
            bottom_axis(sheet, chances, font, "probability", None, most=most)
            spine(sheet, chances)
            rects.append(place.chances)
        self.now = Now(sheet, rects, self.chances, self.curves, self.curve_powers, self.fine)
        self._draw_key()

    def _draw_key(self) -> None:
        place, key, readouts = self.layout, self.key, self.readouts
        if self.key_at_foot:
            drawn = draw_key(self.sheet, key, self.font, self.line, place.key)
            values = draw_key(self.sheet, readouts, self.font, self.line, place.readouts)
        else:
            needed = round(len(readouts) * self.line)
            above = Rect(
                place.beside.left, place.beside.top, place.beside.width, place.beside.height - needed
            )
            below = Rect(above.left, above.bottom, above.width, needed)
            drawn = draw_key(self.sheet, key, self.font, self.line, above)
            values = draw_key(self.sheet, readouts, self.font, self.line, below)
        self.energy_text = next(iter(drawn.moving.values()), None)
        self.value_texts = values.moving

    def _paint_in_full(self) -> None:
        """Carpet, path and probabilities as they are at the end, onto the pixels."""
        paint_carpet(self.sheet, self.scene, self.carpet, self.carpet_scale, self.fine, self.pixels)
        if self.chances is not None:
            paint_curves(
                self.sheet, self.scene.times, self.chances, self.curves, self.curve_powers, self.fine
            )

    def frame(self, number: int) -> Array:
        """The pixels of one frame, shape (height, width, 4), uint8: valid until the next call."""
        self._paint(number)
        return self.pixels

    def _paint(self, number: int) -> None:
        sheet, scene = self.sheet, self.scene
        now = int(np.clip(round(self.carpet.down(scene.times[number])), self.layout.carpet.top, None))
        np.copyto(self.pixels, self.empty)
        past = slice(self.layout.carpet.top, now)
        self.pixels[past] = self.full[past]
        for packet in self.packets:
            packet.paint(number, self.pixels)
        self.density_axis.paint(number)
        self.now.paint(number, now)
        self.clock.set_text(self._time_text(number))
        sheet.paint(self.clock)
        if self.energy_text is not None:
            said = film_words.energy_text(scene, self.energy_numbers, float(self.baseline[number]))
            self.energy_text.set_text(said)
            sheet.paint(self.energy_text)
        for index, text in self.value_texts.items():
            text.set_text(self.curve_numbers[index](float(self.curves[index][1][number])))
            sheet.paint(text)

    def texts(self) -> list[Text]:
        """Every visible text as the last frame drew it."""
        return self.sheet.texts()
