"""Which study instant each frame of a film shows: the run, holds, slow motion, the card at the end."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from render.errors import LatepullError
from render.frames import Array
from render.output.events import Event, slot_index, study_events
from render.output.words import seconds
from render.types import Study, freeze_arrays
from scenes.model import Captions

CARD_S = 5.0
BEFORE_S, AFTER_S = 3.0, 2.0  # shown before the top or the fault, and after the bottom
MIN_PX, MAX_PX = 32, 7680


@dataclass(frozen=True, slots=True)
class Hold:
    """The picture stands still at an instant for a while, with words."""

    time_s: float
    for_s: float
    caption: str


@dataclass(frozen=True, slots=True)
class Slow:
    """From one instant to another the film runs ``times`` slower than life."""

    start_s: float
    end_s: float
    times: float


@dataclass(frozen=True, slots=True, eq=False)
class Shot:
    """One film: F frames, of one slot; the last ones may be the card.

    size_px: width and height, even; rate_fps: frames a second. card: no study instant is shown (time_s then
    holds the last one).
    """

    slot: str
    time_s: Array  # (F,) study instant of each frame
    caption: tuple[str, ...]  # (F,) words of a held or slow picture, "" without
    card: NDArray[np.bool_]  # (F,)
    rate_fps: float
    size_px: tuple[int, int]
    start_s: float  # ends of the timeline
    end_s: float

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def __len__(self) -> int:
        return len(self.time_s)


def even_size(width: int, height: int) -> tuple[int, int]:
    """The size made even, as H.264 with yuv420p wants it; raises LatepullError for one it can't take at all."""
    for name, value in (("width", width), ("height", height)):
        if not MIN_PX <= value <= MAX_PX:
            raise LatepullError(f"film size {width}x{height}: the {name} must be {MIN_PX} to {MAX_PX} pixels")
    return width + width % 2, height + height % 2


def default_range(study: Study, slot: str) -> tuple[float, float]:
    """First and last instant of the default film, s.

    From shortly before the top (or the fault, if that is earlier; or the start) to the slot's contact, to 2 s
    after the bottom, or without a loop to the lead's contact or the end.
    """
    flight, k = study.faulted, slot_index(study, slot)
    first, last = float(flight.time_s[0]), float(flight.time_s[-1])
    marks = [t for t in (flight.events.get("top"), flight.fault_s) if t is not None]
    start = max(first, min(marks, default=first) - BEFORE_S)
    contact = flight.contact_s[k]
    if contact is not None:
        return start, min(contact, last)
    # the loop's own bottom where the flight has one: level flight after it may sink a foot further
    lowest = flight.events.get("bottom")
    if lowest is not None:
        return start, min(lowest + AFTER_S, last)
    # no loop: to the lead's end, or the flight's
    ends = flight.contact_s[0]
    return start, last if ends is None else min(ends, last)


def key_events(study: Study, slot: str) -> tuple[Event, ...]:
    """The moments worth a hold or a still: fault, visible to the three observers, last pull (floor)."""
    wanted = ("fault", "visible_early", "visible_likely", "visible_late", "last_pull_floor")
    return tuple(e for e in study_events(study, slot) if e.kind in wanted)


def event_caption(event: Event, fault_s: float | None, words: Captions | None = None) -> str:
    """What a held picture says of its moment; words: the scene's own, where it has them."""
    own = "" if words is None else str(getattr(words, event.kind.removeprefix("visible_").removesuffix("_floor"), ""))
    if own:
        return own.replace("{seconds}", f"{event.time_s - (fault_s or 0.0):.1f}")
    since = "" if fault_s is None else f", {seconds(event.time_s - fault_s)} after the fault"
    if event.kind == "fault":
        return f"The fault: {event.detail}"
    if event.kind.startswith("visible"):
        return f"{event.label.capitalize()} observer could notice: {event.detail}{since}"
    return f"Last pull to clear the floor{since}"


def key_holds(study: Study, slot: str, for_s: float = 2.5) -> tuple[Hold, ...]:
    """Holds at all key moments of a slot."""
    fault_s, words = study.faulted.fault_s, study.scene.film.captions
    return tuple(Hold(e.time_s, for_s, event_caption(e, fault_s, words)) for e in key_events(study, slot))


def plan_shot(
    study: Study,
    slot: str,
    *,
    start_s: float | None = None,
    end_s: float | None = None,
    rate_fps: float | None = None,
    size_px: tuple[int, int] | None = None,
    holds: tuple[Hold, ...] = (),
    slow: tuple[Slow, ...] = (),
    card_s: float = CARD_S,
    draft: bool = False,
) -> Shot:
    """Plan a film of a slot from ``start_s`` to ``end_s`` (defaults: ``default_range``), then the card.

    rate and size default to the scene's; draft: half size and half rate. Holds and slow stretches outside the
    range are left out. Raises KeyError (slot) and LatepullError (range, rate, size).
    """
    begin, finish = default_range(study, slot)
    first, last = float(study.faulted.time_s[0]), float(study.faulted.time_s[-1])
    begin, finish = (begin if start_s is None else start_s), (finish if end_s is None else end_s)
    if not (first <= begin < finish <= last + 1e-9):
        raise LatepullError(
            f"film from {begin:g} s to {finish:g} s: the flight runs from {first:g} s to {last:g} s, "
            "and a film must begin before it ends"
        )
    film = study.scene.film
    rate = float(film.rate_fps if rate_fps is None else rate_fps)
    if not 1.0 <= rate <= 120.0:
        raise LatepullError(f"film rate {rate:g}: 1 to 120 frames a second are wanted")
    width, height = (film.width_px, film.height_px) if size_px is None else size_px
    if draft:
        rate, width, height = rate / 2, width // 2, height // 2
    film_t, study_t, notes = _pieces(begin, finish, holds, slow)
    count = max(1, round(film_t[-1] * rate) + 1)
    at = np.arange(count) / rate
    time = np.interp(at, film_t, study_t)
    captions = [next((words for t0, t1, words in notes if t0 <= t < t1), "") for t in at]
    cards = round(card_s * rate)
    return Shot(
        slot=slot,
        time_s=np.concatenate((time, np.full(cards, time[-1]))),
        caption=(*captions, *([""] * cards)),
        card=np.concatenate((np.zeros(count, bool), np.ones(cards, bool))),
        rate_fps=rate,
        size_px=even_size(width, height),
        start_s=begin,
        end_s=finish,
    )


def _pieces(
    begin: float, finish: float, holds: tuple[Hold, ...], slow: tuple[Slow, ...]
) -> tuple[list[float], list[float], list[tuple[float, float, str]]]:
    """Film time against study time as a broken line, and the captions as (from, to, words) in film time."""
    held = sorted((h for h in holds if begin <= h.time_s <= finish), key=lambda h: h.time_s)
    cuts = {begin, finish, *(h.time_s for h in held)}
    cuts |= {t for s in slow for t in (s.start_s, s.end_s) if begin < t < finish}
    film_t, study_t = [0.0], [begin]
    notes: list[tuple[float, float, str]] = []
    points = sorted(cuts)
    for i, point in enumerate(points):
        for hold in held:
            if hold.time_s == point:
                notes.append((film_t[-1], film_t[-1] + hold.for_s, hold.caption))
                film_t.append(film_t[-1] + hold.for_s)
                study_t.append(point)
        if i + 1 < len(points):
            middle = (point + points[i + 1]) / 2
            times = next((s.times for s in slow if s.start_s <= middle <= s.end_s), 1.0)
            span = (points[i + 1] - point) * times
            if times != 1.0:
                notes.append((film_t[-1], film_t[-1] + span, f"slow motion: {times:g} times slower than life"))
            film_t.append(film_t[-1] + span)
            study_t.append(points[i + 1])
    return film_t, study_t, notes
