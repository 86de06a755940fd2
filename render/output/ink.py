"""Colours, fonts and small marks that every drawn output shares."""

from __future__ import annotations

from functools import lru_cache
from importlib.util import find_spec
from pathlib import Path

from PIL import Image, ImageDraw, ImageFont

from render.errors import MachineError

Colour = tuple[int, int, int]

# Okabe & Ito, "Color Universal Design" (2008): eight colours that people with any common colour
# blindness tell apart; values from memory, checked in the tests by simulated red-green blindness.
ORANGE: Colour = (230, 159, 0)
SKY: Colour = (86, 180, 233)
GREEN: Colour = (0, 158, 115)
YELLOW: Colour = (240, 228, 66)
BLUE: Colour = (0, 114, 178)
VERMILION: Colour = (213, 94, 0)

BACK: Colour = (17, 21, 26)
PANEL: Colour = (44, 51, 60)
FAINT: Colour = (112, 122, 134)
QUIET: Colour = (178, 187, 197)
WHITE: Colour = (245, 247, 250)

Font = ImageFont.FreeTypeFont


@lru_cache(maxsize=64)
def font(size_px: float, bold: bool = False) -> Font:
    """DejaVu Sans as matplotlib ships it (Latin, Greek, Cyrillic); at least 9 px.

    Found without importing matplotlib, which would cost a film's workers a third of a second each.
    Raises MachineError if matplotlib is not installed whole.
    """
    spec = find_spec("matplotlib")
    name = "DejaVuSans-Bold.ttf" if bold else "DejaVuSans.ttf"
    path = Path(spec.origin or "").parent / "mpl-data" / "fonts" / "ttf" / name if spec else Path(name)
    try:
        return ImageFont.truetype(str(path), max(9, round(size_px)), layout_engine=ImageFont.Layout.BASIC)
    except OSError as exc:
        raise MachineError(f"the font {name} of matplotlib is missing; install matplotlib again") from exc


@lru_cache(maxsize=1024)
def text_width(text: str, face: Font) -> int:
    """Width of a line of text in whole pixels."""
    return int(face.getlength(text) + 0.999)


@lru_cache(maxsize=1024)
def _word(word: str, face: Font) -> tuple[Image.Image, float]:
    """A word's mask and advance; its middle line is the mask's middle. Cached: running figures repeat their words."""
    advance = face.getlength(word)
    image = Image.new("L", (int(advance) + 4, 2 * round(face.size)), 0)
    ImageDraw.Draw(image).text((1, image.height / 2), word, fill=255, font=face, anchor="lm")
    return image, advance


def put_words(
    image: Image.Image, x: float, y: float, text: str, face: Font, colour: Colour, *, right: bool = False
) -> None:
    """Write a line centred on y, from x (or up to x if ``right``): a tenth of the cost of drawing running text anew."""
    space = _word(" ", face)[1]
    words = [_word(word, face) for word in text.split(" ")]
    if right:
        x -= sum(advance for _, advance in words) + space * (len(words) - 1)
    for mask, advance in words:
        image.paste(colour, (round(x) - 1, round(y) - mask.height // 2), mask)
        x += advance + space


def fit_text(text: str, face: Font, width_px: float) -> str:
    """The text, cut at its end with an ellipsis if it is wider than ``width_px``."""
    if face.getlength(text) <= width_px:
        return text
    while text and face.getlength(text + "…") > width_px:
        text = text[:-1]
    return text.rstrip() + "…"


def wrap_text(text: str, face: Font, width_px: float) -> list[str]:
    """The text in lines of at most ``width_px`` (a longer single word stands alone)."""
    lines: list[str] = []
    for word in text.split():
        if lines and face.getlength(f"{lines[-1]} {word}") <= width_px:
            lines[-1] += f" {word}"
        else:
            lines.append(word)
    return lines


def spread(centres: list[float], widths: list[float], lo: float, hi: float, gap: float) -> list[float]:
    """Left edges of labels near their centres, in order, without overlap and within lo..hi where they fit.

    One pass right, one pass back left: the order of the centres is kept.
    """
    left = [c - w / 2 for c, w in zip(centres, widths, strict=True)]
    edge = lo
    for i, width in enumerate(widths):
        left[i] = max(left[i], edge)
        edge = left[i] + width + gap
    edge = hi
    for i in reversed(range(len(widths))):
        left[i] = min(left[i], edge - widths[i])
        edge = left[i] - gap
    return left


# Marks as polygons in a unit square, y down: told apart by shape, not by colour alone.
_POLYGONS: dict[str, tuple[tuple[float, float], ...]] = {
    "visible_early": ((0.5, 0.05), (0.97, 0.92), (0.03, 0.92)),
    "visible_late": ((0.1, 0.1), (0.9, 0.1), (0.9, 0.9), (0.1, 0.9)),
    "fault": ((0.5, 0.0), (1.0, 0.5), (0.5, 1.0), (0.0, 0.5)),
    "aircraft": ((1.0, 0.5), (0.08, 0.9), (0.3, 0.5), (0.08, 0.1)),
}
_CROSS = ((0.12, 0.12, 0.88, 0.88), (0.12, 0.88, 0.88, 0.12))


@lru_cache(maxsize=512)
def mark(kind: str, size_px: int, colour: Colour, filled: bool = True, turn_deg: int = 0) -> Image.Image:
    """A small antialiased mark as an RGBA image (drawn four times as large, then reduced).

    kind: visible_early (triangle) | visible_likely (disc) | visible_late (square) | fault (diamond) |
    contact (cross) | aircraft (dart, pointing right at turn 0, up at 90).
    """
    big = size_px * 4
    image = Image.new("RGBA", (big, big), (*colour, 0))
    draw = ImageDraw.Draw(image)
    line = max(4, round(big * 0.13))
    ink, inside = (*colour, 255), ((*colour, 255) if filled else (*BACK, 255))
    if kind == "contact":
        for x0, y0, x1, y1 in _CROSS:
            draw.line((x0 * big, y0 * big, x1 * big, y1 * big), fill=ink, width=round(line * 1.6))
    elif kind == "visible_likely":
        draw.ellipse((line / 2, line / 2, big - line / 2, big - line / 2), fill=inside, outline=ink, width=line)
    else:
        points = [(x * (big - 1), y * (big - 1)) for x, y in _POLYGONS[kind]]
        draw.polygon(points, fill=inside)
        draw.line([*points, points[0], points[1]], fill=ink, width=line, joint="curve")
    if turn_deg:
        image = image.rotate(turn_deg, resample=Image.Resampling.BICUBIC)
    return image.resize((size_px, size_px), Image.Resampling.LANCZOS)


def put_mark(image: Image.Image, sprite: Image.Image, x: float, y: float) -> None:
    """Paste a mark centred at (x, y)."""
    image.paste(sprite, (round(x - sprite.width / 2), round(y - sprite.height / 2)), sprite)


def hatch(size: tuple[int, int], colour: Colour, back: Colour, pitch_px: float, part: float = 0.5) -> Image.Image:
    """Diagonal stripes of ``colour`` on ``back``; ``part`` is the coloured share."""
    scale = 3
    width, height = size[0] * scale, size[1] * scale
    image = Image.new("RGB", (max(width, 1), max(height, 1)), back)
    draw = ImageDraw.Draw(image)
    pitch = pitch_px * scale
    thick = max(1, round(pitch * part / 2**0.5))
    x = -float(height)
    while x < width + height:
        draw.line((x, height, x + height, 0), fill=colour, width=thick)
        x += pitch
    return image.resize((max(size[0], 1), max(size[1], 1)), Image.Resampling.LANCZOS)
