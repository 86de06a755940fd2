"""The plain card at a film's end: the figures, the caution, scene and versions, viewing distance."""

from __future__ import annotations

import math
from dataclasses import dataclass, replace

import numpy as np
from PIL import Image, ImageDraw

from render.output.events import slot_index, slot_title
from render.output.ink import BACK, FAINT, QUIET, WHITE, YELLOW, fit_text, font, mark, put_mark, text_width, wrap_text
from render.output.overlay import Frame
from render.output.tables import last_pull_words
from render.output.words import CAUTION, Units, cue_words, lateness_words, seconds
from render.picture.camera import PANINI_FROM_RAD
from render.types import Study


@dataclass(frozen=True, slots=True)
class CardTexts:
    """Everything the card says. observers: (observer, when and by what, lateness) rows."""

    title: str
    slot: str
    figures: tuple[tuple[str, str], ...]  # (what, value)
    observers: tuple[tuple[str, str, str], ...]
    caution: str
    viewing: str
    source: str


# What a picture's note says where no viewing distance makes its angles a wing pilot's.
NOT_A_SEAT = ("not at true size", "seen from")
UNTRUE = "Angles in this picture are not those that the wing pilot sees."


def viewing_widths(field_rad: float) -> float:
    """Viewing distance at which a picture's angles are true, in picture widths: 1 / (2 tan(field/2)).

    field_rad: horizontal field, 0..pi. Above 100 deg the picture is the Pannini projection (d = 1), true about its
    middle only: half its width is there 2 sin(field/2) / (1 + cos(field/2)) distances, which is 2 tan(field/4).
    """
    half = math.tan(field_rad / 2.0) if field_rad <= PANINI_FROM_RAD else 2.0 * math.tan(field_rad / 4.0)
    return 1.0 / (2.0 * half)


def card_texts(study: Study, slot: str, note: str = "") -> CardTexts:
    """The card's words for one slot; note: what the picture shows, where that is not what the seat sees."""
    units = Units(study.scene.film.units)
    k = slot_index(study, slot)
    fault_s = study.faulted.fault_s
    floor = units.length(study.scene.floor_m)
    figures = [
        (f"Last pull to clear the floor ({floor})", last_pull_words(study, slot, "floor")),
        ("Last pull to clear the ground", last_pull_words(study, slot, "ground")),
    ]
    contact = study.faulted.contact_s[k]
    if contact is not None:
        base, of = (0.0, "from the start") if fault_s is None else (fault_s, "after the fault")
        figures.append(("Ground contact if nobody acts", f"{seconds(contact - base)} {of}"))
    else:
        low = float(study.faulted.height_agl_m[study.faulted.time_s >= (fault_s or 0.0), k].min())
        figures.append(("Lowest height if nobody acts", f"{units.length(low)} above ground"))
    observers = []
    for notice in study.notices.get(slot, ()) if fault_s is not None else ():
        if notice.time_s is None:
            observers.append((notice.observer, "never noticed", ""))
        else:
            since = seconds(notice.time_s - (fault_s or 0.0))
            when = f"could notice {since} after the fault, by {cue_words(notice.cue)}"
            late = lateness_words(notice.lateness_s)
            late = "" if late == "-" else f"{late} with {seconds(notice.reaction_s)} reaction"
            observers.append((notice.observer, when, late))
    field_deg = math.degrees(study.scene.film.field_rad)
    versions = ", ".join(f"{name} {version}" for name, version in study.versions.items())
    return CardTexts(
        title=study.scene.title,
        slot=slot_title(slot),
        figures=tuple(figures),
        observers=tuple(observers),
        caution=CAUTION,
        viewing=UNTRUE if any(words in note for words in NOT_A_SEAT) else (
            f"Angles are true from {viewing_widths(study.scene.film.field_rad):.2f} picture widths away "
            f"(field {field_deg:.0f} deg{', in its middle' if field_deg > math.degrees(PANINI_FROM_RAD) else ''})."
        ),
        source=f"Scene: {study.scene.name}. {versions}.",
    )


def card_frame(
    study: Study, slot: str, size_px: tuple[int, int], *, plain: bool = False, note: str = ""
) -> Frame:
    """The card as a frame (h, w, 3); plain: without title and figures, for pilots who should call it themselves."""
    texts = card_texts(study, slot, note)
    if plain:
        versions = texts.source.partition(". ")[2]
        texts = replace(texts, title="What did you see, and when?", figures=(), observers=(), source=versions)
    width, height = size_px
    u = height / 720.0
    image = Image.new("RGB", size_px, BACK)
    draw = ImageDraw.Draw(image)
    left, right = 70 * u, width - 70 * u
    big, bold, body, small = font(34 * u, True), font(25 * u, True), font(25 * u), font(20 * u)
    draw.text((left, 68 * u), fit_text(texts.title, big, right - left), fill=WHITE, font=big, anchor="lm")
    draw.text((left, 112 * u), texts.slot, fill=QUIET, font=body, anchor="lm")
    y = 172 * u
    tab = left + 580 * u
    for what, value in texts.figures:
        draw.text((left, y), fit_text(what, body, 560 * u), fill=QUIET, font=body, anchor="lm")
        draw.text((tab, y), fit_text(value, bold, right - tab), fill=WHITE, font=bold, anchor="lm")
        y += 40 * u
    y += 14 * u
    for observer, when, late in texts.observers:
        put_mark(image, mark(f"visible_{observer}", round(20 * u), YELLOW), left + 10 * u, y)
        words = f"{observer} observer"
        draw.text((left + 32 * u, y), words, fill=YELLOW, font=body, anchor="lm")
        x = left + 32 * u + max(text_width(words, body) + 20 * u, 220 * u)
        text = f"{when}:" if late else when
        draw.text((x, y), fit_text(text, body, right - x), fill=WHITE, font=body, anchor="lm")
        if late:
            y += 34 * u
            draw.text((x, y), fit_text(late, bold, right - x), fill=WHITE, font=bold, anchor="lm")
        y += 40 * u
    lines = [line for part in texts.caution.split(". ") for line in wrap_text(part, small, right - left)]
    lines[0] += "."
    lines += wrap_text(texts.viewing, small, right - left) + wrap_text(texts.source, small, right - left)[:2]
    y = height - 34 * u - (len(lines) - 1) * 28 * u
    draw.line((left, y - 26 * u, right, y - 26 * u), fill=FAINT, width=max(1, round(2 * u)))
    for i, line in enumerate(lines):
        draw.text((left, y + i * 28 * u), line, fill=WHITE if i < len(lines) - 2 else QUIET, font=small, anchor="lm")
    return np.array(image)
