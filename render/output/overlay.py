"""The overlay drawn onto a frame: a strip with margin bar and timeline, a caption, a side elevation.

Only these rectangles are touched (a composite over the whole frame would cost 12 ms of the budget at
1280x720, the strips cost about 2). Sizes are those of a 720-line picture, scaled by the picture's height.
"""

from __future__ import annotations

from collections.abc import Callable

import numpy as np
from numpy.typing import NDArray
from PIL import Image, ImageDraw

from render.output.bar import MarginBar
from render.output.ink import (
    BACK,
    ORANGE,
    QUIET,
    SKY,
    VERMILION,
    WHITE,
    YELLOW,
    Colour,
    Font,
    fit_text,
    font,
    put_words,
    text_width,
)
from render.output.side_view import SideView
from render.output.texts import OverlayTexts, overlay_texts
from render.output.timeline import Timeline
from render.types import Study

Frame = NDArray[np.uint8]

STATE_COLOURS: dict[str, Colour] = {"left": SKY, "endless": SKY}
ENDED = ("gone", "no_pull", "contact")  # nothing is left: white on a block of vermilion
GAP = "   "
STRIP, BAR_HEIGHT, TEXT_WIDTH = 178, 114, 348  # of a 720-line picture


def strip_px(height_px: int) -> int:
    """Height of the strip at the bottom of a frame, px."""
    return round(STRIP * height_px / 720.0)


class Overlay:
    """The overlay of one slot's film; holds its resting pictures, ``draw`` writes into a frame."""

    def __init__(
        self, study: Study, slot: str, size_px: tuple[int, int], start_s: float, end_s: float, note: str = "",
        caption_bottom_px: int | None = None,
    ) -> None:
        """size_px: width and height of the frames; start_s, end_s: the timeline's ends; note: a line to stay shown;
        caption_bottom_px: the row above which the caption lies (None: at the top).
        """
        self._study, self._slot, self._size, self._note = study, slot, size_px, note
        width, height = size_px
        self._u = u = height / 720.0
        self._text_width = round(TEXT_WIDTH * u)
        self._panel = self._caption_panel(study, slot)
        edge = round(14 * u)
        self._caption_at = edge, (edge if caption_bottom_px is None else caption_bottom_px - self._panel.height - edge)
        strip, bar = strip_px(height), round(BAR_HEIGHT * u)
        self._strip_y, self._bar_height, self._line_height = height - strip, bar, strip - bar
        self._bar = MarginBar(study, slot, (width - self._text_width - round(14 * u), bar), u)
        reactions = [n.reaction_s for n in study.notices.get(slot, ()) if n.observer == "likely"]
        self._reaction_s = reactions[0] if reactions else 0.0
        self._line = Timeline(study, slot, start_s, end_s, (width, strip - bar), u)
        side = (round(250 * u), round(216 * u))
        self._side = SideView(study, slot, start_s, end_s, side, u)
        self._side_at = (width - side[0] - round(14 * u), round(14 * u))
        # the last pictures: figures change ten times a second, frames come more often
        self._figure_of, self._caption_of = _Last(self._figure), _Last(self._caption)

    def draw(self, frame: Frame, time_s: float, caption: str = "") -> None:
        """Draw the overlay of a study instant into a frame (h, w, 3), in place; caption: words of a held picture."""
        texts = overlay_texts(self._study, self._slot, time_s)
        u = self._u
        y = self._strip_y
        width = self._size[0]
        frame[y : y + self._bar_height, : self._text_width] = self._figure_of(
            texts.margin_label, texts.margin_value, texts.margin_note, self._ink(texts), texts.state in ENDED
        )
        bar = np.asarray(self._bar.draw(texts, time_s))
        frame[y : y + self._bar_height, self._text_width : self._text_width + bar.shape[1]] = bar
        frame[y : y + self._bar_height, self._text_width + bar.shape[1] :] = BACK
        frame[y + self._bar_height :, :width] = np.asarray(self._line.draw(time_s))
        caption_words = f"{texts.height}{GAP}{texts.speed}"
        _put(frame, self._caption_of(texts.since_fault, caption_words), *self._caption_at)
        _put(frame, np.asarray(self._side.draw(time_s)), *self._side_at)
        if caption:
            banner = self._banner(caption)
            _put(frame, np.asarray(banner), (width - banner.width) // 2, y - banner.height - round(14 * u))

    def _ink(self, texts: OverlayTexts) -> Colour:
        """The colour of the big number."""
        if texts.state == "left" and texts.margin_s < self._reaction_s:
            return ORANGE  # what is left is less than the likely reaction takes
        return STATE_COLOURS.get(texts.state, WHITE)

    def _figure(self, label: str, value: str, note: str, colour: Colour, ended: bool) -> Image.Image:
        """The big number with its words."""
        u = self._u
        image = Image.new("RGB", (self._text_width, self._bar_height), BACK)
        if ended:
            # a block of colour under white figures: told apart by shape too, and bright in every kind of eye
            width = text_width(value, self._fitted(value, 58 * u, True)) + 20 * u
            ImageDraw.Draw(image).rectangle((8 * u, 32 * u, 8 * u + width, 85 * u), fill=VERMILION)
        rows = (
            (16, 18, label, 19.0, False, WHITE),
            (14, 57, value, 58.0, True, colour),
            (16, 99, note, 17.0, False, WHITE),
        )
        for x, y, text, size, bold, ink in rows:
            if text.startswith("a pull now ") and text_width(text, self._fitted(text, size * u, bold)) > self._room:
                text = text.removeprefix("a pull now ")  # in a small draft the letters can't shrink further
            put_words(image, x * u, y * u, text, self._fitted(text, size * u, bold), ink)
        return image

    @property
    def _room(self) -> float:
        return self._text_width - 26 * self._u

    def _fitted(self, text: str, size: float, bold: bool) -> Font:
        """The font, smaller where the text would not fit beside the bar."""
        room = self._room
        width = text_width(text, font(size, bold))
        return font(size if width <= room else size * room / width, bold)

    def _caption_panel(self, study: Study, slot: str) -> Image.Image:
        """The caption's resting picture, wide enough for any figures, with slot, scene and note."""
        u, small = self._u, font(18 * self._u)
        texts = overlay_texts(study, slot, float(study.faulted.time_s[0]))
        title = fit_text(f"{texts.slot} · {texts.title}", small, self._size[0] * 0.62)
        widest = text_width("88.8 s before the fault", font(26 * u, True))
        widest += text_width(f"88,888 ft above ground{GAP}888 km/h", font(22 * u))
        width = max(widest + round(24 * u), text_width(title, small), text_width(self._note, small))
        rows = 3 if self._note else 2
        size = (min(width + round(28 * u), self._size[0] - round(28 * u)), round((28 + 24 * rows) * u))
        image = Image.new("RGB", size, BACK)
        put_words(image, 14 * u, 19 * u, title, small, QUIET)
        if self._note:
            put_words(image, 14 * u, 80 * u, self._note, small, YELLOW)
        return image

    def _caption(self, since_fault: str, figures: str) -> Image.Image:
        """Time since the fault, height and speed, on the caption's panel."""
        u = self._u
        image = self._panel.copy()
        put_words(image, 14 * u, 51 * u, since_fault, font(26 * u, True), WHITE)
        put_words(image, image.width - 14 * u, 52 * u, figures, font(22 * u), WHITE, right=True)
        return image

    def _banner(self, caption: str) -> Image.Image:
        u = self._u
        face = font(28 * u, True)
        words = fit_text(caption, face, self._size[0] * 0.9)
        image = Image.new("RGB", (text_width(words, face) + round(36 * u), round(52 * u)), WHITE)
        ImageDraw.Draw(image).text((image.width / 2, image.height / 2), words, fill=BACK, font=face, anchor="mm")
        return image


class _Last:
    """A drawing that is made anew only when its words change; gives its pixels (h, w, 3)."""

    def __init__(self, make: Callable[..., Image.Image]) -> None:
        self._make = make
        self._words: tuple[object, ...] | None = None
        self._pixels: Frame | None = None

    def __call__(self, *words: object) -> Frame:
        if self._pixels is None or words != self._words:
            self._words, self._pixels = words, np.asarray(self._make(*words))
        return self._pixels


def _put(frame: Frame, picture: Frame, x: int, y: int) -> None:
    """Copy a picture into a frame with its corner at (x, y), cut at the frame's edges."""
    height, width = frame.shape[:2]
    picture = picture[: height - y, : width - x]
    frame[y : y + picture.shape[0], x : x + picture.shape[1]] = picture
