"""One scene of a page: everything its template prints, and what its script reads."""

from __future__ import annotations

from dataclasses import dataclass
from typing import Any

import numpy as np
from markupsafe import Markup

from render.output.card import card_texts
from render.output.events import study_events
from render.output.page_chart import margin_chart
from render.output.page_films import Pictures, study_key
from render.output.page_sources import Assumption, Threshold, assumptions, thresholds, weakest, works
from render.output.page_strips import PathView, plan_path, side_path, strip_chart, strip_plans
from render.output.page_words import (
    Figure,
    SlotRow,
    answer,
    fault_line,
    figures,
    question,
    slot_rows,
    spoken_slot,
)
from render.output.tables import GATES, last_pull_words
from render.output.texts import overlay_texts, sample
from render.output.words import Units, lateness_words, seconds
from render.types import Study


@dataclass(frozen=True, slots=True)
class Moment:
    """A moment to jump to: study instant, when (after the fault) and what, in words."""

    time_s: float
    at: str
    words: str
    tone: str


@dataclass(frozen=True, slots=True)
class SlotTable:
    """One slot's part of the table."""

    title: str
    last_pull: str
    rows: tuple[SlotRow, ...]


@dataclass(frozen=True, slots=True)
class Picture:
    """A picture by its address in the page, and its words."""

    ref: str
    caption: str


@dataclass(frozen=True, slots=True)
class InlineFilm:
    """A film inside the page: its element's id and its bytes as text."""

    id: str
    base64: str


@dataclass(frozen=True, slots=True)
class Refs:
    """Where a scene's files are for the page: addresses, or ``#id`` of a film inside it."""

    annotated: str
    plain: str
    stills: tuple[Picture, ...]
    extras: tuple[Picture, ...]
    inline_films: tuple[InlineFilm, ...] = ()


@dataclass(frozen=True, slots=True, eq=False)
class SceneView:
    """What the template of one scene prints."""

    number: int
    title: str
    seat: str
    fault: str
    question: str
    answer: str
    figures: tuple[Figure, ...]
    annotated: str
    plain: str
    size: tuple[int, int]
    chart_wide: Markup
    chart_narrow: Markup
    moments: tuple[Moment, ...]
    slots: tuple[SlotTable, ...]
    stills: tuple[Picture, ...]
    strips: tuple[Markup, ...]
    side: Markup
    plan: Markup
    has_twin: bool
    twin_words: str
    axis_words: str
    extras: tuple[Picture, ...]
    gates: tuple[tuple[str, str, str, str], ...]
    weakest: str
    assumptions: tuple[Assumption, ...]
    thresholds: tuple[Threshold, ...]
    works: tuple[tuple[str, str], ...]
    viewing: str
    source: str
    data: dict[str, Any]
    inline_films: tuple[InlineFilm, ...]


def scene_view(study: Study, slot: str, pictures: Pictures, refs: Refs, number: int) -> SceneView:
    """Everything of one scene; number: its place in the page from 1."""
    shot = pictures.shot
    span = (shot.start_s, shot.end_s)
    shown_s = shot.time_s[~shot.card]
    side = side_path(study, slot, *span, shot.time_s, f"s{number}-side")
    plan = plan_path(study, slot, *span, shot.time_s, f"s{number}-plan")
    texts, fault_s = card_texts(study, slot), study.faulted.fault_s
    found = moments(study, slot, *span)
    data = {
        "name": study.scene.name, "title": study.scene.title, "slot": slot, "seat": spoken_slot(slot),
        "key": f"{study_key(study)[:24]}-{slot}", "rate": shot.rate_fps, "card": len(shown_s),
        "times": [round(float(t), 4) for t in shot.time_s], "fault": fault_s,
        "lastPull": study.margin.last_pull_floor_s[study.faulted.names.index(slot)],
        "likely": next((n.time_s for n in study.notices.get(slot, ()) if n.observer == "likely"), None),
        "moments": [m.time_s for m in found], "texts": frame_texts(study, slot, shown_s),
        "paths": {"side": _path_data(side), "plan": _path_data(plan)},
        "films": {"annotated": refs.annotated, "plain": refs.plain,
                  "words": {kind: "the film" if ref.startswith("#") else ref
                            for kind, ref in (("annotated", refs.annotated), ("plain", refs.plain))}},
    }  # fmt: skip
    briefed = study.scene.briefed is not None
    return SceneView(
        number=number, title=study.scene.title, seat=spoken_slot(slot), fault=fault_line(study),
        question=question(slot), answer=answer(study, slot), figures=figures(study, slot),
        annotated="" if refs.annotated.startswith("#") else refs.annotated,
        plain="" if refs.plain.startswith("#") else refs.plain, size=shot.size_px,
        chart_wide=Markup(margin_chart(study, slot, *span, f"s{number}-wide", wide=True)),
        chart_narrow=Markup(margin_chart(study, slot, *span, f"s{number}-narrow", wide=False)),
        moments=found, slots=_slots(study, slot), stills=refs.stills,
        strips=tuple(Markup(strip_chart(study, slot, plan_, *span, f"s{number}-{plan_.key}"))
                     for plan_ in strip_plans(study, slot)),
        side=_view(side, "side"), plan=_view(plan, "plan"), has_twin=study.healthy is not study.faulted,
        twin_words="as briefed" if briefed else "without the fault",
        axis_words="Seconds after the fault." if fault_s is not None else "Seconds from the start of the script.",
        extras=refs.extras, gates=gates(study), weakest=weakest(study, slot), assumptions=assumptions(study, slot),
        thresholds=thresholds(study, slot), works=works(study, slot), viewing=texts.viewing, source=texts.source,
        data=data, inline_films=refs.inline_films,
    )  # fmt: skip


def _view(path: PathView, name: str) -> Markup:
    return Markup(path.svg.replace("<svg ", f'<svg data-view="{name}" ', 1))


def _path_data(path: PathView) -> dict[str, list[float]]:
    return {"x": np.round(path.x, 1).tolist(), "y": np.round(path.y, 1).tolist()}


def frame_texts(study: Study, slot: str, times_s: np.ndarray[Any, np.dtype[np.float64]]) -> list[list[str]]:
    """Since the fault, height, speed, margin's label and value of each frame, as the overlay prints them."""
    found = []
    for time_s in times_s:
        texts = overlay_texts(study, slot, float(time_s))
        found.append([texts.since_fault, texts.height, texts.speed, texts.margin_label, texts.margin_value])
    return found


def moments(study: Study, slot: str, start_s: float, end_s: float) -> tuple[Moment, ...]:
    """The moments of a slot inside the film, in the order of time."""
    fault_s = study.faulted.fault_s
    late = {n.observer: n.lateness_s for n in study.notices.get(slot, ())}
    found = []
    for event in study_events(study, slot):
        if not start_s <= event.time_s <= end_s + 1e-6:
            continue
        at = event.time_s - (fault_s or 0.0)
        words, tone = event.label.capitalize(), "plain"
        if event.kind.startswith("visible_"):
            words = f"{event.label.capitalize()} observer could notice: {event.detail}"
            if (lateness := late.get(event.label)) is not None:
                words += f"; {lateness_words(lateness)}"
                tone = "late" if round(lateness, 1) > 0.0 else "hand"
        elif event.kind == "fault":
            words = f"Fault: {event.detail}"
        elif event.kind.startswith("last_pull"):
            words = f"Last pull {event.detail}"
        elif event.kind == "contact":
            words = "Ground contact"
        sign = "-" if round(at, 1) < 0 else ""
        found.append(Moment(round(event.time_s, 4), sign + seconds(abs(at)), words, tone))
    return tuple(found)


def _slots(study: Study, slot: str) -> tuple[SlotTable, ...]:
    """The page's own slot first, then the other wings, then the lead."""
    if study.faulted.fault_s is None:
        return ()
    names = [slot, *(n for n in study.faulted.names if n not in (slot, "lead")), *(["lead"] if slot != "lead" else [])]
    found = []
    for name in names:
        title = spoken_slot(name)
        pull = last_pull_words(study, name, "floor")
        if study.margin.no_pull_left[study.faulted.names.index(name)]:
            pull = "none, the stick does nothing from the fault on"
        rows = slot_rows(study, name)
        found.append(SlotTable(title[0].upper() + title[1:], pull, rows))
    return tuple(found)


def gates(study: Study) -> tuple[tuple[str, str, str, str], ...]:
    """The lead's points of the loop in the healthy (or briefed) flight: height, speed, load factor."""
    flight, units = study.healthy, Units(study.scene.film.units)
    rows = []
    for key, words in GATES.items():
        if key not in flight.events:
            continue
        height, speed, load = (sample(flight.time_s, values[:, 0], flight.events[key])
                               for values in (flight.height_agl_m, flight.cas_mps, flight.load_factor))
        rows.append((words, units.length(height), units.speed(speed), f"{round(load, 1) + 0.0:.1f} g"))
    return tuple(rows)
