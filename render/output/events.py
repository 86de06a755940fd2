"""The moments of a study that outputs name: what happened when, as one slot lives it."""

from __future__ import annotations

from dataclasses import dataclass

from render.output.words import cue_words, fault_words
from render.types import OBSERVERS, Study

FLIGHT_WORDS = {
    "vertical_up": "vertical up",
    "top": "top",
    "vertical_down": "vertical down",
    "bottom": "bottom",
}


@dataclass(frozen=True, slots=True)
class Event:
    """One moment: its kind (a key for the mark that is drawn), time from the start of the script, words.

    kind: vertical_up | top | vertical_down | bottom | fault | visible_early | visible_likely |
    visible_late | last_pull_floor | last_pull_ground | contact.
    """

    kind: str
    time_s: float
    label: str
    detail: str = ""


def slot_index(study: Study, slot: str) -> int:
    """Which aircraft a slot (or ``lead``) is; raises KeyError with the known names."""
    names = study.faulted.names
    if slot not in names:
        raise KeyError(f"no slot {slot!r} in this study; it has {', '.join(names)}")
    return names.index(slot)


def fault_kind(study: Study) -> str:
    """What failed, a key of ``words.FAULT_WORDS``: the scene's fault, or that the lead departed from the briefed."""
    return study.scene.fault.kind if study.scene.fault is not None else "departed"


def slot_title(slot: str) -> str:
    """How a slot is called in outputs: ``Slot right``, ``Lead``."""
    words = slot.replace("_", " ")
    return "Lead" if slot == "lead" else f"Slot {words}"


def study_events(study: Study, slot: str) -> tuple[Event, ...]:
    """All moments of one slot in the order of time.

    Points of the loop are those of the faulted flight's lead; what comes after this slot's contact is left out.
    """
    k = slot_index(study, slot)
    flight, margin = study.faulted, study.margin
    found = [
        Event(key, flight.events[key], words) for key, words in FLIGHT_WORDS.items() if key in flight.events
    ]
    if flight.fault_s is not None:
        kind = fault_kind(study)
        found.append(Event("fault", flight.fault_s, "fault", fault_words(kind)))
    for notice in study.notices.get(slot, ()):
        if notice.time_s is not None and notice.observer in OBSERVERS:
            found.append(
                Event(f"visible_{notice.observer}", notice.time_s, notice.observer, cue_words(notice.cue))
            )
    for over, times in (("floor", margin.last_pull_floor_s), ("ground", margin.last_pull_ground_s)):
        last = times[k]
        if last is not None:
            found.append(Event(f"last_pull_{over}", last, "last pull", f"against the {over}"))
    contact = flight.contact_s[k]
    if contact is not None:
        found = [event for event in found if event.time_s <= contact]
        found.append(Event("contact", contact, "contact"))
    return tuple(sorted(found, key=lambda event: event.time_s))
