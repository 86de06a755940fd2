"""The thin line of events under the picture, with the play position."""

from __future__ import annotations

from PIL import Image, ImageDraw

from render.output.events import Event, study_events
from render.output.ink import (
    BACK,
    FAINT,
    QUIET,
    SKY,
    VERMILION,
    WHITE,
    YELLOW,
    Colour,
    fit_text,
    font,
    mark,
    put_mark,
    spread,
    text_width,
)
from render.types import Study

COLOURS: dict[str, Colour] = {"fault": VERMILION, "contact": VERMILION}


def label_of(event: Event) -> str:
    """What a mark on the line is called: observers with what they noticed, last pulls with what they clear."""
    if event.kind.startswith("visible"):
        return f"{event.label}: {event.detail}"
    if event.kind == "last_pull_ground":
        return "(ground)"
    if event.kind == "last_pull_floor":
        return "last pull (floor)"
    return event.label


class Timeline:
    """The events of one slot between two instants; the line is drawn once, the play position each time."""

    def __init__(
        self, study: Study, slot: str, start_s: float, end_s: float, size: tuple[int, int], unit_px: float
    ) -> None:
        self._start_s, self._end_s, self._size, self._u = start_s, max(end_s, start_s + 1e-6), size, unit_px
        self._pad = 16 * unit_px
        self._y = round(29 * unit_px)
        self._events = [e for e in study_events(study, slot) if start_s <= e.time_s <= end_s]
        self._rest = self._resting(self._events)

    def x(self, time_s: float) -> float:
        """Pixel of an instant, held inside the line."""
        part = min(max((time_s - self._start_s) / (self._end_s - self._start_s), 0.0), 1.0)
        return self._pad + part * (self._size[0] - 2 * self._pad)

    def _resting(self, events: list[Event]) -> Image.Image:
        u = self._u
        image = Image.new("RGB", self._size, BACK)
        draw = ImageDraw.Draw(image)
        draw.line((self._pad, self._y, self._size[0] - self._pad, self._y), fill=FAINT, width=max(2, round(4 * u)))
        above = [e for e in events if not e.kind.startswith("visible")]
        below = [e for e in events if e.kind.startswith("visible")]
        self._labels(draw, above, 10 * u)
        self._labels(draw, below, 50 * u)
        for event in events:
            self._mark(image, draw, event, filled=False)
        return image

    def _labels(self, draw: ImageDraw.ImageDraw, events: list[Event], y: float) -> None:
        u = self._u
        face = font(15.5 * u)
        words = [fit_text(label_of(e), face, self._size[0] / max(len(events), 1) - 8 * u) for e in events]
        widths = [float(text_width(w, face)) for w in words]
        lefts = spread([self.x(e.time_s) for e in events], widths, 6 * u, self._size[0] - 6 * u, 12 * u)
        for event, left, word in zip(events, lefts, words, strict=True):
            colour = YELLOW if event.kind.startswith("visible") else QUIET
            draw.text((left, y), word, fill=colour, font=face, anchor="lm")

    def _mark(self, image: Image.Image, draw: ImageDraw.ImageDraw, event: Event, *, filled: bool) -> None:
        u, x, y = self._u, self.x(event.time_s), self._y
        if event.kind.startswith("visible"):
            put_mark(image, mark(event.kind, round(15 * u), YELLOW, filled), x, y)
        elif event.kind in ("fault", "contact"):
            put_mark(image, mark(event.kind, round(17 * u), COLOURS[event.kind], filled), x, y)
        else:
            heavy = event.kind == "last_pull_floor"
            half, thick = (10 * u, 4 * u) if heavy else (7 * u, 2 * u)
            draw.line((x, y - half, x, y + half), fill=WHITE if heavy else QUIET, width=max(1, round(thick)))

    def draw(self, time_s: float) -> Image.Image:
        """The line at one instant, as an image of the area's size."""
        u = self._u
        image = self._rest.copy()
        draw = ImageDraw.Draw(image)
        x = self.x(time_s)
        draw.line((self._pad, self._y, x, self._y), fill=SKY, width=max(2, round(4 * u)))
        for event in self._events:
            if event.time_s <= time_s:
                self._mark(image, draw, event, filled=True)
        rim = round(7 * u)
        draw.ellipse((x - rim, self._y - rim, x + rim, self._y + rim), fill=WHITE)
        return image
