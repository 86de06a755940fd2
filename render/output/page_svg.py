"""A small SVG writer for the page's charts: every text escaped, colours as classes with a light fallback.

Each shape carries its light colour as an attribute (what a printer without the page's style sheet draws) and a
class, by which the style sheet gives it the theme's colour.
"""

from __future__ import annotations

import math
from dataclasses import dataclass, field
from xml.sax.saxutils import escape, quoteattr

import numpy as np
from numpy.typing import ArrayLike

from render.frames import Array

# The page's light palette. Okabe-Ito hues, darkened until text in them has 4.5:1 and lines 3:1 on white.
INK, QUIET, FAINT, RULE = "#16202a", "#4d5a67", "#7b8794", "#d5dbe1"
LATE, HAND, SIGHT, TWIN, BLUE = "#b34700", "#00704f", "#7a5c00", "#6b7783", "#0068a8"
LATE_FILL, BACK, SIGHT_FILL = "#fbe9de", "#ffffff", "#e8d58a"
FONT = "DejaVu Sans, system-ui, sans-serif"


@dataclass
class Svg:
    """One drawing: parts are added in the order they are drawn."""

    width: float
    height: float
    title: str
    description: str
    name: str  # unique in the page: what the title's and description's ids are made of
    classes: str = ""
    data: dict[str, str] = field(default_factory=dict)
    _parts: list[str] = field(default_factory=list)

    def add(self, tag: str, text: str | None = None, /, **attributes: object) -> None:
        """One element; ``cls`` is its class, ``_`` in a name a hyphen."""
        inner = "" if text is None else escape(text)
        self._parts.append(f"<{tag}{_attributes(attributes)}>{inner}</{tag}>")

    def line(self, x1: float, y1: float, x2: float, y2: float, stroke: str, cls: str, **more: object) -> None:
        """A straight line."""
        self.add("line", x1=x1, y1=y1, x2=x2, y2=y2, stroke=stroke, cls=cls, **more)

    def rect(self, x: float, y: float, width: float, height: float, fill: str, cls: str, **more: object) -> None:
        """A rectangle; nothing if it has no width."""
        if width > 0 and height > 0:
            self.add("rect", x=x, y=y, width=width, height=height, fill=fill, cls=cls, **more)

    def text(self, x: float, y: float, words: str, cls: str = "t", fill: str = QUIET, size: float = 12,
             anchor: str = "start", **more: object) -> None:
        """A line of text on the base line y."""
        self.add("text", words, x=x, y=y, cls=cls, fill=fill, font_size=size, text_anchor=anchor, font_family=FONT,
                 **more)

    def curve(self, x: Array, y: Array, stroke: str, cls: str, width: float = 2, **more: object) -> None:
        """A broken line through the points, interrupted at NaN, thinned to what half a unit shows."""
        path = _path(x, y)
        if path:
            self.add("path", d=path, fill="none", stroke=stroke, stroke_width=width, stroke_linejoin="round", cls=cls,
                     **more)

    def raw(self, markup: str) -> None:
        """Markup made by this module's callers, as it stands."""
        self._parts.append(markup)

    def render(self) -> str:
        """The whole drawing, with its title and description for screen readers."""
        data = "".join(f" data-{key}={quoteattr(value)}" for key, value in self.data.items())
        return (
            f'<svg xmlns="http://www.w3.org/2000/svg" viewBox="0 0 {number(self.width)} {number(self.height)}" '
            f'width="{number(self.width)}" height="{number(self.height)}" role="img" '
            f'class={quoteattr(self.classes)} aria-labelledby="{self.name}-t {self.name}-d"{data}>'
            f'<title id="{self.name}-t">{escape(self.title)}</title>'
            f'<desc id="{self.name}-d">{escape(self.description)}</desc>{"".join(self._parts)}</svg>'
        )


def number(value: float) -> str:
    """A coordinate to a tenth, without a zero at its end."""
    return f"{value:.1f}".removesuffix(".0")


def _attributes(attributes: dict[str, object]) -> str:
    words = []
    for key, value in attributes.items():
        if value is None:
            continue
        name = {"cls": "class"}.get(key, key.replace("_", "-"))
        words.append(f" {name}={quoteattr(number(value) if isinstance(value, float) else str(value))}")
    return "".join(words)


def _path(x: Array, y: Array) -> str:
    parts: list[str] = []
    pen, last = "M", (math.inf, math.inf)
    count = len(x)
    for i, (a, b) in enumerate(zip(x.tolist(), y.tolist(), strict=True)):
        if not (math.isfinite(a) and math.isfinite(b)):
            pen, last = "M", (math.inf, math.inf)
            continue
        ends = i + 1 == count or not math.isfinite(float(y[i + 1]))
        if pen == "L" and not ends and math.hypot(a - last[0], b - last[1]) < 1.5:
            continue
        parts.append(f"{pen}{number(a)} {number(b)}")
        pen, last = "L", (a, b)
    return "".join(parts)


@dataclass(frozen=True, slots=True)
class Scale:
    """A linear map from values to drawing units."""

    v0: float
    v1: float
    p0: float
    p1: float

    def __call__(self, values: ArrayLike) -> Array:
        """Drawing units of values, same shape."""
        part = (np.asarray(values, dtype=float) - self.v0) / ((self.v1 - self.v0) or 1.0)
        return self.p0 + part * (self.p1 - self.p0)

    def at(self, value: float) -> float:
        """Drawing units of one value."""
        return float(self(value))


def ticks(low: float, high: float, most: int = 6) -> list[float]:
    """Round values from low to high, ``most`` at most, steps of 1, 2 or 5 times a power of ten."""
    if not high > low:
        return [low]
    raw = (high - low) / max(most - 1, 1)
    power = 10.0 ** math.floor(math.log10(raw))
    step = next(power * k for k in (1, 2, 5, 10) if power * k >= raw * (1 - 1e-9))
    first = math.ceil(low / step - 1e-9)
    last = math.floor(high / step + 1e-9)
    return [i * step + 0.0 for i in range(first, last + 1)]


def hatch(name: str, colour: str) -> str:
    """A pattern of diagonal stripes to fill with ``url(#name)``."""
    return (f'<defs><pattern id="{name}" width="6" height="6" patternUnits="userSpaceOnUse" '
            f'patternTransform="rotate(45)"><rect width="6" height="6" fill="{BACK}" class="back"/>'
            f'<rect width="3" height="6" fill="{colour}" class="react"/></pattern></defs>')
