"""The margin bar: seconds left before the last pull, what reaction eats of them, where it became visible.

    too late   |  seconds left
  =============|######//////==============|            # eaten by the likely reaction, / by early to late
     late    likely         early        now
The axis is the margin itself: zero is the last pull, left of it is too late. The bar's end runs left with
time; an observer's mark stands at the margin that is left when he could first notice, so a mark that lies
in or left of the reaction is a break-out too late.
"""

from __future__ import annotations

import itertools
import math
from dataclasses import dataclass

from PIL import Image, ImageDraw

from render.output.events import slot_index
from render.output.ink import (
    BACK,
    FAINT,
    ORANGE,
    PANEL,
    QUIET,
    SKY,
    VERMILION,
    WHITE,
    YELLOW,
    fit_text,
    font,
    hatch,
    mark,
    put_mark,
    put_words,
    spread,
    text_width,
)
from render.output.texts import OverlayTexts, margin_at
from render.types import OBSERVERS, Study

FULL_S, LATE_S = 8.0, 2.0  # the axis shows at least 8 s left and 2 s too late
FULL_MAX_S, LATE_MAX_S = 15.0, 8.0


@dataclass(frozen=True, slots=True)
class BarScale:
    """Where the bar's marks stand, in seconds of margin.

    notices: observer -> (time noticed, margin left then), the observers that notice; blind: those
    that never do; reaction_s: early, likely, late.
    """

    right_s: float
    left_s: float
    notices: dict[str, tuple[float, float]]
    blind: tuple[str, ...]
    reaction_s: tuple[float, ...]
    endless: bool


def bar_scale(study: Study, slot: str) -> BarScale:
    """The axis and marks of one slot's bar."""
    k = slot_index(study, slot)
    last = study.margin.last_pull_floor_s[k]
    found = {n.observer: n for n in study.notices.get(slot, ())}
    reaction = tuple(found[o].reaction_s for o in OBSERVERS if o in found)
    if last is None:
        return BarScale(FULL_S, -LATE_S, {}, (), reaction, True)
    notices = {}
    for observer, notice in found.items():
        if notice.time_s is not None:
            left = margin_at(study, slot, notice.time_s)
            notices[observer] = (notice.time_s, last - notice.time_s if math.isnan(left) else left)
    contact = study.faulted.contact_s[k]
    lows = [left for _, left in notices.values()] + ([last - contact] if contact is not None else [])
    highs = [left for _, left in notices.values()] + [max(reaction, default=0.0)]
    if study.faulted.fault_s is not None:
        highs.append(last - study.faulted.fault_s)
    right = min(max(FULL_S, math.ceil(max(highs) + 1.0)), FULL_MAX_S)
    left_s = -min(max(LATE_S, math.ceil(-min(lows, default=0.0) + 0.5)), LATE_MAX_S)
    blind = tuple(o for o in OBSERVERS if o in found and o not in notices)
    return BarScale(right, left_s, notices, blind, reaction, False)


class MarginBar:
    """The bar of one slot, its resting pictures made once; ``draw`` costs well under a millisecond."""

    def __init__(self, study: Study, slot: str, size: tuple[int, int], unit_px: float) -> None:
        """size: of the area in pixels; unit_px: one pixel of the 720-line design."""
        self._scale = bar_scale(study, slot)
        self._size, self._u = size, unit_px
        self._pad = 22 * unit_px
        self._y0, self._y1 = round(34 * unit_px), round(76 * unit_px)
        self._too_late: tuple[float, float] | None = None
        self._rest = self._resting()
        width, height = size[0], self._y1 - self._y0
        self._left = self._full(width, height)
        self._gone = hatch((width, height), VERMILION, BACK, 16 * unit_px, 0.72)

    def x(self, left_s: float) -> float:
        """Pixel of a margin, held inside the axis."""
        s = self._scale
        part = (min(max(left_s, s.left_s), s.right_s) - s.left_s) / (s.right_s - s.left_s)
        return self._pad + part * (self._size[0] - 2 * self._pad)

    def _full(self, width: int, height: int) -> Image.Image:
        """The bar as it looks when everything is left: reaction in orange, hatched over its range, the rest blue."""
        image = Image.new("RGB", (width, height), SKY)
        if self._scale.endless or not self._scale.reaction_s:
            return image
        early, likely, late = (self.x(r) for r in (self._scale.reaction_s * 3)[:3])
        zero = self.x(0.0)
        stripes = hatch((max(round(late - zero), 1), height), ORANGE, SKY, 11 * self._u, 0.5)
        image.paste(stripes, (round(zero), 0))
        draw = ImageDraw.Draw(image)
        draw.rectangle((zero, 0, likely, height), fill=ORANGE)
        dark = hatch((max(round(likely - early), 1), height), (150, 96, 0), ORANGE, 11 * self._u, 0.3)
        image.paste(dark, (round(early), 0))
        draw.line((likely, 0, likely, height), fill=BACK, width=max(1, round(3 * self._u)))
        return image

    def _resting(self) -> Image.Image:
        u, scale = self._u, self._scale
        image = Image.new("RGB", self._size, BACK)
        draw = ImageDraw.Draw(image)
        small = font(16 * u)
        draw.rectangle((self._pad, self._y0, self._size[0] - self._pad, self._y1), fill=PANEL)
        if scale.endless:
            return image
        zero = self.x(0.0)
        dead = hatch((round(zero - self._pad), self._y1 - self._y0), (66, 52, 46), PANEL, 16 * u, 0.5)
        image.paste(dead, (round(self._pad), self._y0))
        # in the widest room between the marks of the observers
        edges = sorted([self._pad, zero, *(self.x(left) for _, left in scale.notices.values() if left < 0)])
        room, spot = max((b - a, (a + b) / 2) for a, b in itertools.pairwise(edges))
        half = text_width("too late", font(17 * u)) / 2
        self._too_late = (spot - half, spot + half) if room > 2 * half + 8 * u else None
        self._reaction_frame(image, draw, zero)
        below = self._y1 + 5 * u
        step = 1 if scale.right_s - scale.left_s <= 8 else 2
        for value in range(math.ceil(scale.left_s), int(scale.right_s) + 1):
            if value % step == 0 and value != 0:
                x = self.x(value)
                draw.line((x, self._y1, x, self._y1 + 4 * u), fill=FAINT, width=max(1, round(2 * u)))
                label = f"{value} s" if value > 0 else f"{-value} s"
                draw.text((x, below), label, fill=QUIET, font=small, anchor="ma")
        draw.line((zero, self._y0 - 4 * u, zero, self._y1 + 6 * u), fill=WHITE, width=max(2, round(4 * u)))
        draw.text((zero, below + 3 * u), "last pull", fill=WHITE, font=font(16 * u, True), anchor="ma")
        end = self._size[0] - self._pad
        self._notes(image, draw, end)
        return image

    def _reaction_frame(self, image: Image.Image, draw: ImageDraw.ImageDraw, zero: float) -> None:
        """What reaction takes, as it stays visible once the bar has run past it: a frame, stripes up to late."""
        if not self._scale.reaction_s:
            return
        early, likely, late = (self.x(r) for r in (self._scale.reaction_s * 3)[:3])
        height = self._y1 - self._y0
        stripes = hatch((max(round(late - early), 1), height), (96, 80, 44), PANEL, 11 * self._u, 0.4)
        image.paste(stripes, (round(early), self._y0))
        line = max(1, round(2 * self._u))
        draw.rectangle((zero, self._y0, likely, self._y1 - 1), outline=ORANGE, width=line)

    def _notes(self, image: Image.Image, draw: ImageDraw.ImageDraw, end: float) -> None:
        """Words over the bar: who could notice where, with the marks hollow until that moment."""
        u, face = self._u, font(16 * self._u)
        title = "when it could be noticed"
        draw.text((end, 14 * u), title, fill=QUIET, font=face, anchor="rm")
        rows = [(-math.inf, observer, f"{observer}: never") for observer in reversed(self._scale.blind)]
        rows += sorted((left, observer, observer) for observer, (_, left) in self._scale.notices.items())
        size = round(16 * u)
        widths = [text_width(words, face) + size + 6 * u for _, _, words in rows]
        room = end - text_width(title, face) - 18 * u
        lefts = spread([self.x(left) for left, _, _ in rows], widths, 2 * u, room, 14 * u)
        for (left, observer, word), edge in zip(rows, lefts, strict=True):
            x = self.x(left)
            if left > -math.inf:
                draw.line((edge + size / 2, 22 * u, x, self._y0), fill=YELLOW, width=max(1, round(2 * u)))
                draw.line((x, self._y0, x, self._y1), fill=YELLOW, width=max(1, round(2 * u)))
            put_mark(image, mark(f"visible_{observer}", size, YELLOW, filled=False), edge + size / 2, 14 * u)
            draw.text((edge + size + 5 * u, 14 * u), word, fill=YELLOW, font=face, anchor="lm")

    def draw(self, texts: OverlayTexts, time_s: float) -> Image.Image:
        """The bar at one instant, as an image of the area's size."""
        image = self._rest.copy()
        draw = ImageDraw.Draw(image)
        u, left = self._u, texts.margin_s
        zero = self.x(0.0)
        if self._scale.endless:
            image.paste(self._left.crop((0, 0, self._size[0] - round(2 * self._pad), self._left.height)),
                        (round(self._pad), self._y0))
            draw.text((self._size[0] / 2, (self._y0 + self._y1) / 2), "does not run out", fill=BACK,
                      font=font(24 * u, True), anchor="mm")
            return image
        if math.isnan(left):
            left = self._scale.right_s
        x = self.x(left)
        if left >= 0:
            image.paste(self._left.crop((round(zero), 0, round(x), self._left.height)), (round(zero), self._y0))
        else:
            image.paste(self._gone.crop((round(x), 0, round(zero), self._gone.height)), (round(x), self._y0))
        if self._too_late is not None and self._too_late[1] < x - 4 * u:  # the bar has not come so far
            put_words(image, self._too_late[0], (self._y0 + self._y1) / 2, "too late", font(17 * u), QUIET)
        self._moving(image, draw, x, zero, left, time_s)
        return image

    def _moving(
        self, image: Image.Image, draw: ImageDraw.ImageDraw, x: float, zero: float, left: float, time_s: float
    ) -> None:
        u, middle = self._u, (self._y0 + self._y1) / 2
        bold = font(17 * u, True)
        likely = self.x(self._scale.reaction_s[1]) if len(self._scale.reaction_s) > 1 else zero
        if left > 0 and min(x, likely) - zero > text_width("reaction", bold) + 10 * u:
            put_words(image, (zero + likely - text_width("reaction", bold)) / 2, middle, "reaction", bold, BACK)
        marked = any(time_s >= noticed_s and left_then < 0 for noticed_s, left_then in self._scale.notices.values())
        if left < 0 and not marked and zero - x > text_width("too late", bold) + 10 * u:
            draw.text(((zero + x) / 2, middle), "too late", fill=WHITE, font=bold, anchor="mm",
                      stroke_width=max(1, round(3 * u)), stroke_fill=BACK)
        for observer, (noticed_s, margin_then) in self._scale.notices.items():
            at = self.x(margin_then)
            if time_s >= noticed_s:
                put_mark(image, mark(f"visible_{observer}", round(28 * u), BACK), at, middle)
                put_mark(image, mark(f"visible_{observer}", round(19 * u), YELLOW), at, middle)
            else:
                draw.line((at, self._y0, at, self._y1), fill=YELLOW, width=max(1, round(2 * u)))
        draw.line((zero, self._y0 - 4 * u, zero, self._y1 + 6 * u), fill=WHITE, width=max(2, round(4 * u)))
        draw.line((x, self._y0 - 3 * u, x, self._y1 + 3 * u), fill=WHITE, width=max(2, round(5 * u)))
        if left > self._scale.right_s:
            word = fit_text("more than shown", bold, self._size[0])
            draw.text((x - 10 * u, middle), word, fill=BACK, font=bold, anchor="rm")
