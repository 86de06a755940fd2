"""The overlay drawn onto a frame: a strip with margin bar and timeline, a caption, a side elevation.

Only these rectangles are touched (a composite over the whole frame would cost 12 ms of the budget at
1280x720, the strips cost about 2). Sizes are those of a 720-line picture, scaled by the picture's height.
"""

from __future__ import annotations

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
    fit_text,
    font,
    text_width,
)
from render.output.side_view import SideView
from render.output.texts import OverlayTexts, overlay_texts
from render.output.timeline import Timeline
from render.types import Study

Frame = NDArray[np.uint8]

STATE_COLOURS: dict[str, Colour] = {
    "left": SKY, "endless": SKY, "gone": VERMILION, "no_pull": VERMILION, "contact": VERMILION,
}  # fmt: skip
STRIP, BAR_HEIGHT, TEXT_WIDTH = 178, 114, 348  # of a 720-line picture


class Overlay:
    """The overlay of one slot's film; holds its resting pictures, ``draw`` writes into a frame."""

    def __init__(
        self, study: Study, slot: str, size_px: tuple[int, int], start_s: float, end_s: float, note: str = ""
    ) -> None:
        """size_px: width and height of the frames; start_s, end_s: the timeline's ends; note: a line to stay shown."""
        self._study, self._slot, self._size, self._note = study, slot, size_px, note
        width, height = size_px
        self._u = u = height / 720.0
        self._text_width = round(TEXT_WIDTH * u)
        strip, bar = round(STRIP * u), round(BAR_HEIGHT * u)
        self._strip_y, self._bar_height, self._line_height = height - strip, bar, strip - bar
        self._bar = MarginBar(study, slot, (width - self._text_width - round(14 * u), bar), u)
        reactions = [n.reaction_s for n in study.notices.get(slot, ()) if n.observer == "likely"]
        self._reaction_s = reactions[0] if reactions else 0.0
        self._line = Timeline(study, slot, start_s, end_s, (width, strip - bar), u)
        side = (round(250 * u), round(216 * u))
        self._side = SideView(study, slot, start_s, end_s, side, u)
        self._side_at = (width - side[0] - round(14 * u), round(14 * u))

    def draw(self, frame: Frame, time_s: float, caption: str = "") -> None:
        """Draw the overlay of a study instant into a frame (h, w, 3), in place; caption: words of a held picture."""
        texts = overlay_texts(self._study, self._slot, time_s)
        u = self._u
        y = self._strip_y
        width = self._size[0]
        frame[y : y + self._bar_height, : self._text_width] = np.asarray(self._figure(texts))
        bar = np.asarray(self._bar.draw(texts, time_s))
        frame[y : y + self._bar_height, self._text_width : self._text_width + bar.shape[1]] = bar
        frame[y : y + self._bar_height, self._text_width + bar.shape[1] :] = BACK
        frame[y + self._bar_height :, :width] = np.asarray(self._line.draw(time_s))
        _put(frame, self._caption(texts), round(14 * u), round(14 * u))
        _put(frame, self._side.draw(time_s), *self._side_at)
        if caption:
            banner = self._banner(caption)
            _put(frame, banner, (width - banner.width) // 2, y - banner.height - round(14 * u))

    def _figure(self, texts: OverlayTexts) -> Image.Image:
        """The big number with its words."""
        u = self._u
        image = Image.new("RGB", (self._text_width, self._bar_height), BACK)
        draw = ImageDraw.Draw(image)
        colour = STATE_COLOURS[texts.state]
        if texts.state == "left" and texts.margin_s < self._reaction_s:
            colour = ORANGE  # what is left is less than the likely reaction takes
        room = self._text_width - 26 * u
        draw.text((16 * u, 18 * u), texts.margin_label, fill=WHITE, font=font(19 * u), anchor="lm")
        big = font(58 * u, True)
        if big.getlength(texts.margin_value) > room:
            big = font(58 * u * room / big.getlength(texts.margin_value), True)
        draw.text((14 * u, 57 * u), texts.margin_value, fill=colour, font=big, anchor="lm")
        note = font(17 * u)
        if note.getlength(texts.margin_note) > room:
            note = font(17 * u * room / note.getlength(texts.margin_note))
        draw.text((16 * u, 99 * u), texts.margin_note, fill=WHITE, font=note, anchor="lm")
        return image

    def _caption(self, texts: OverlayTexts) -> Image.Image:
        """Slot and scene, time since the fault, height and speed."""
        u = self._u
        small, bold, plain = font(18 * u), font(26 * u, True), font(22 * u)
        room = self._size[0] * 0.62
        title = fit_text(f"{texts.slot} · {texts.title}", small, room)
        second = f"{texts.height}   {texts.speed}"
        widths = [text_width(title, small), text_width(texts.since_fault, bold) + text_width(second, plain) + 28 * u]
        rows = 2
        if self._note:
            widths.append(text_width(self._note, small))
            rows = 3
        # to whole steps of 40 px, so that the panel doesn't breathe with the digits
        width = int(-(-(max(widths) + 28 * u) // (40 * u)) * (40 * u))
        width, height = min(width, self._size[0] - round(28 * u)), round((28 + 24 * rows) * u)
        image = Image.new("RGB", (width, height), BACK)
        draw = ImageDraw.Draw(image)
        draw.text((14 * u, 19 * u), title, fill=QUIET, font=small, anchor="lm")
        draw.text((14 * u, 51 * u), texts.since_fault, fill=WHITE, font=bold, anchor="lm")
        draw.text((image.width - 14 * u, 52 * u), second, fill=WHITE, font=plain, anchor="rm")
        if self._note:
            draw.text((14 * u, 80 * u), self._note, fill=YELLOW, font=small, anchor="lm")
        return image

    def _banner(self, caption: str) -> Image.Image:
        u = self._u
        face = font(28 * u, True)
        words = fit_text(caption, face, self._size[0] * 0.9)
        image = Image.new("RGB", (text_width(words, face) + round(36 * u), round(52 * u)), WHITE)
        ImageDraw.Draw(image).text((image.width / 2, image.height / 2), words, fill=BACK, font=face, anchor="mm")
        return image


def _put(frame: Frame, image: Image.Image, x: int, y: int) -> None:
    """Copy an image into a frame with its corner at (x, y), cut at the frame's edges."""
    height, width = frame.shape[:2]
    picture = np.asarray(image)[: height - y, : width - x]
    frame[y : y + picture.shape[0], x : x + picture.shape[1]] = picture
