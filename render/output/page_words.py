"""The briefing page's words of one slot: the question, its answer with its range, three figures, the table's rows."""

from __future__ import annotations

import math
from dataclasses import dataclass

from render.output.events import fault_kind, slot_index, slot_title
from render.output.tables import break_out_words, last_pull_words
from render.output.texts import margin_at, sample
from render.output.words import Units, cue_words, fault_words, lateness_words, seconds
from render.types import Notice, Study


@dataclass(frozen=True, slots=True)
class Figure:
    """One of the three figures at the head of a page. tone: late | hand | mixed | plain, said in the words too."""

    label: str
    value: str
    note: str
    tone: str = "plain"


@dataclass(frozen=True, slots=True)
class SlotRow:
    """What one observer in one slot could have known; every cell as it is printed."""

    observer: str
    noticed: str
    cue: str
    left: str
    reaction: str
    against: str
    lowest: str
    tone: str


def spoken_slot(slot: str) -> str:
    """A slot inside a sentence: ``slot right``, ``the lead``."""
    return "the lead" if slot == "lead" else slot_title(slot).replace("Slot", "slot", 1)


def question(slot: str) -> str:
    """The one question of the page, for one slot."""
    return f"When could {_pilot(slot)} have known, and what was left then?"


def _pilot(slot: str) -> str:
    return "the lead" if slot == "lead" else f"the pilot in {spoken_slot(slot)}"


def _notices(study: Study, slot: str) -> tuple[Notice, ...]:
    return tuple(study.notices.get(slot, ()))


def span(first: float, last: float) -> str:
    """Two values as a range to a tenth: ``5.8 to 7.1 s``, or one where they are the same."""
    first, last = round(first, 1) + 0.0, round(last, 1) + 0.0
    return f"{first:.1f} s" if first == last else f"{first:.1f} to {last:.1f} s"


def tone_of(lateness_s: list[float | None]) -> str:
    """How the colour goes with latenesses: all too late, all in hand, or both; ``plain`` without any."""
    known = [round(x, 1) for x in lateness_s if x is not None]
    if not known:
        return "plain"
    if all(x > 0.0 for x in known):
        return "late"
    return "hand" if all(x <= 0.0 for x in known) else "mixed"


def lateness_span(lateness_s: list[float]) -> str:
    """Latenesses early to late as one range, the sign in words: ``2.7 to 6.2 s too late``."""
    values = [round(x, 1) + 0.0 for x in lateness_s]
    low, high = values[0], values[-1]
    if low > 0.0 and high > 0.0:
        return f"{span(low, high)} too late"
    if low <= 0.0 and high <= 0.0:
        return f"{span(-low, -high)} in hand"
    return " to ".join(f"{abs(x):.1f} s {'too late' if x > 0.0 else 'in hand'}" for x in (low, high))


def _noticed_clause(study: Study, slot: str) -> str:
    fault_s = study.faulted.fault_s or 0.0
    notes = _notices(study, slot)
    times = [n.time_s - fault_s for n in notes if n.time_s is not None]
    if not times:
        return "He could not have noticed before the flight ends"
    if len(times) == len(notes):
        return f"He could have noticed {span(times[0], times[-1])} after the fault"
    never = " and ".join(n.observer for n in notes if n.time_s is None)
    return f"He could have noticed {span(times[0], times[-1])} after the fault, a {never} observer not at all"


def answer(study: Study, slot: str) -> str:
    """The answer in one sentence, early to late observer; never a single value where there is a range."""
    units = Units(study.scene.film.units)
    k = slot_index(study, slot)
    last = study.margin.last_pull_floor_s[k]
    if study.faulted.fault_s is None:
        if last is None:
            return "Nothing fails in this scene and there is nothing to notice; the margin above the floor does not " \
                   "run out."
        return f"Nothing fails in this scene, but the margin above the floor runs out {seconds(last)} from the start."
    noticed = _noticed_clause(study, slot)
    if study.margin.no_pull_left[k]:
        return f"{noticed}; from the fault on the stick gives no pull, so nothing was left to act with."
    if last is None:
        lows = [n.clearance_m for n in _notices(study, slot) if n.clearance_m is not None]
        if not lows:
            return f"{noticed}; the margin above the floor does not run out in this flight."
        reach = _reach(min(lows), max(lows), units)
        return (f"{noticed}; the margin above the floor does not run out in this flight, and a break-out then has its "
                f"lowest point {reach}.")
    words = last_pull_words(study, slot, "floor")
    when = f"at {words.removesuffix(' after the fault')}" if words.endswith(" after the fault") else words
    pull = f"the last pull to clear the floor was {when}"
    late = [n.lateness_s for n in _notices(study, slot) if n.lateness_s is not None]
    if not late:
        return f"{noticed}; {pull}."
    return f"{noticed}, {pull}: with his reaction he breaks out {lateness_break(late)}."


def _reach(low_m: float, high_m: float, units: Units) -> str:
    """Two clearances as one range: ``between 208 and 216 ft above the floor``."""
    worst, best = units.clearance(low_m, "floor"), units.clearance(high_m, "floor")
    if worst == best:
        return worst
    if (low_m >= 0.0) == (high_m >= 0.0):
        return f"between {worst.split(' ')[0]} and {best}"
    return f"between {worst} and {best}"


def lateness_break(late: list[float]) -> str:
    """``lateness_span`` as it goes on after ``he breaks out``: with 22.0 to 19.0 s in hand, 2.7 to 6.2 s too late."""
    words = lateness_span(late)
    if tone_of(list(late)) == "hand":
        return f"with {words}"
    return f"anywhere from {words}" if tone_of(list(late)) == "mixed" else words


def figures(study: Study, slot: str) -> tuple[Figure, ...]:
    """The three figures an instructor reads first: could notice, last pull, break-out against it."""
    units = Units(study.scene.film.units)
    k = slot_index(study, slot)
    floor = units.length(study.scene.floor_m)
    last = study.margin.last_pull_floor_s[k]
    pull = Figure("Last pull", "does not run out" if last is None else _when(study, last),
                  f"to clear the floor ({floor}); to clear the ground: {last_pull_words(study, slot, 'ground')}")
    if study.margin.no_pull_left[k] and study.faulted.fault_s is not None:
        pull = Figure("Last pull", "no pull left", "from the fault on the stick does nothing", "late")
    fault_s = study.faulted.fault_s
    if fault_s is None:
        low = float(study.faulted.height_agl_m[study.faulted.time_s >= study.faulted.events.get("top", 0.0), k].min())
        return (Figure("Could notice", "nothing fails", "no fault in this scene"), pull,
                Figure("Lowest point", units.length(low), "above the ground, as flown"))
    notes = _notices(study, slot)
    times = [n.time_s - fault_s for n in notes if n.time_s is not None]
    cues = list(dict.fromkeys(cue_words(n.cue) for n in notes if n.time_s is not None))
    never = [n.observer for n in notes if n.time_s is None]
    by = f"after the fault; by: {', '.join(cues)}" if cues else "before the flight ends"
    noticed = Figure("Could notice", span(times[0], times[-1]) if times else "never",
                     by + (f"; {' and '.join(never)} observer: never" if never and times else ""))
    return noticed, pull, _against(study, slot, notes, units)


def _when(study: Study, at_s: float) -> str:
    fault_s = study.faulted.fault_s
    if fault_s is None:
        return seconds(at_s)
    return seconds(at_s - fault_s) if at_s >= fault_s else f"{seconds(fault_s - at_s)} before"


def _against(study: Study, slot: str, notes: tuple[Notice, ...], units: Units) -> Figure:
    if study.margin.no_pull_left[slot_index(study, slot)]:
        return Figure("Break-out", "does nothing", "there is no pull to break out with", "late")
    late = [n.lateness_s for n in notes]
    known = [x for x in late if x is not None]
    reactions = [n.reaction_s for n in notes]
    react = f"with {span(min(reactions), max(reactions))} reaction"
    if known:
        never = [n.observer for n in notes if n.time_s is None]
        more = f"; {' and '.join(never)} observer: never" if never else ""
        return Figure("Break-out comes", lateness_span(known), react + more, tone_of(list(late)))
    lows = [n.clearance_m for n in notes if n.clearance_m is not None]
    if not lows:
        return Figure("Break-out comes", "-", "nobody notices" if not any(n.time_s for n in notes) else react)
    low, high = min(lows), max(lows)
    if low < 0.0:
        return Figure("Break-out's lowest point", units.clearance(low, "floor"), f"{react}, the worst of the three",
                      "late" if high < 0.0 else "mixed")
    value = units.length(low)
    if units.length(high) != value:
        value = f"{value.removesuffix(' ' + units.length_unit)} to {units.length(high)}"
    return Figure("Break-out's lowest point", value, f"above the floor, {react}", "hand")


def slot_rows(study: Study, slot: str) -> tuple[SlotRow, ...]:
    """The three observers of one slot, cell by cell; empty where nothing fails."""
    fault_s = study.faulted.fault_s
    if fault_s is None:
        return ()
    units = Units(study.scene.film.units)
    rows = []
    for n in _notices(study, slot):
        seen = n.time_s is not None
        if seen and study.margin.no_pull_left[slot_index(study, slot)]:
            rows.append(SlotRow(n.observer, seconds((n.time_s or 0.0) - fault_s), cue_words(n.cue), "no pull left",
                                seconds(n.reaction_s), "-", "a pull does nothing", "plain"))
            continue
        rows.append(SlotRow(
            observer=n.observer,
            noticed=seconds(n.time_s - fault_s) if n.time_s is not None else "never",
            cue=cue_words(n.cue) if seen else "-",
            left=left_words(margin_at(study, slot, n.time_s)) if n.time_s is not None else "-",
            reaction=seconds(n.reaction_s), against=lateness_words(n.lateness_s),
            lowest=break_out_words(study, slot, n, units), tone=tone_of([n.lateness_s]),
        ))  # fmt: skip
    return tuple(rows)


def left_words(margin_s: float) -> str:
    """What was left at an instant: ``2.4 s left``, ``gone 1.9 s ago``, ``does not run out``."""
    if math.isnan(margin_s):
        return "does not run out"
    return f"{seconds(margin_s)} left" if margin_s >= 0.0 else f"gone {seconds(-margin_s)} ago"


def fault_line(study: Study) -> str:
    """What fails and where, in a line."""
    flight = study.faulted
    if flight.fault_s is None:
        return "No fault in this scene."
    units = Units(study.scene.film.units)
    words = fault_words(fault_kind(study))
    height = units.length(sample(flight.time_s, flight.height_agl_m[:, 0], flight.fault_s))
    speed = units.speed(sample(flight.time_s, flight.cas_mps[:, 0], flight.fault_s))
    return f"{words[0].upper()}{words[1:]} at {height} above ground and {speed}."
