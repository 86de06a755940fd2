"""A map in two sentences: what happens at the scene's own amount, and what is worst and what would do."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

from render.decide.cases import CUES
from render.decide.map import Map, Outcome, same_slots
from render.decide.values import Axis

Outcomes = NDArray[np.int64]
Mask = NDArray[np.bool_]

# what a fault that comes at a place, or a flight with a value, does
DOES = {
    Outcome.CLEARS: "clears by itself",
    Outcome.ALL_IN_TIME: "leaves time even for the late observer",
    Outcome.LIKELY_IN_TIME: "leaves time for the early and the likely observer, not for the late one",
    Outcome.EARLY_IN_TIME: "leaves time for the early observer alone",
    Outcome.TOO_LATE: "shows too late even for the early observer",
    Outcome.UNKNOWN: "can't be flown",
}
SHORT = {
    Outcome.CLEARS: "clear by themselves",
    Outcome.ALL_IN_TIME: "leave time for all three observers",
    Outcome.LIKELY_IN_TIME: "leave time for the early and the likely observer",
    Outcome.EARLY_IN_TIME: "leave time for the early observer alone",
    Outcome.TOO_LATE: "are too late even for the early observer",
    Outcome.UNKNOWN: "can't be flown",
}
SHOWS = {
    "tilt": "the horizon's tilt", "turning": "the turning of the view", "flow": "the flow of the ground",
    "closing": "the ground coming up", "growth": "the ground growing", "lead": "the lead moving in his view",
    "load": "the g he feels", "felt rate": "the pitch rate he feels", "gauge": "a look at the gauges",
    "call": "the lead's call", "stick force": "the stick force",
}
MOST_RUNS = 4


def map_sentences(found: Map) -> list[tuple[str, str, str]]:
    """For each group of slots that fare alike: their names in words, and two sentences."""
    out = []
    for group in same_slots(found):
        names = " and ".join(found.cases.names[k] for k in group)
        out.append((f"{names[:1].upper()}{names[1:]}", own_sentence(found, group[0]), whole_sentence(found, group[0])))
    return out


def amount_words(axis: Axis, index: int, more: str = "") -> str:
    """The start of a sentence that says the value of the y axis; more: such as `` or more``."""
    text, value = f"{axis.text(index)}{more}", axis.values[index]
    if axis.path == "fault.fraction":
        return f"With {text} of the control left" if value > 0.0 else f"With nothing{more} of the control left"
    if axis.path == "fault.rate":
        return f"With a surface as quick as {text}"
    if axis.path == "fault.over":
        return f"With a surface that drifts to its no-load angle in {text}"
    if axis.path == "script.0.level.speed":
        return f"Entered at {text}"
    return f"With {axis.path} at {text}"


def place_words(axis: Axis, first: int, last: int) -> str:
    """Where on the x axis, with the noun the sentence goes on about."""
    if first == last:
        at = axis.text(first)
    else:
        at = f"{axis.text(first).removesuffix(axis.unit).rstrip()} to {axis.text(last)}"
    if axis.path == "fault.at.loop_angle":
        return f"a fault at {at} of the loop"
    if axis.path.startswith("fault.at."):
        return f"a fault at {at} ({axis.path.rsplit('.', 1)[1].replace('_', ' ')})"
    return f"a flight with {axis.path} {'from ' if first != last else 'at '}{at}"


def runs(row: Outcomes) -> list[tuple[Outcome, int, int]]:
    """Outcomes along an axis, (X,), as runs: outcome, first and last index."""
    found: list[tuple[Outcome, int, int]] = []
    for i, value in enumerate(row):
        if found and found[-1][0] == value:
            found[-1] = (found[-1][0], found[-1][1], i)
        else:
            found.append((Outcome(int(value)), i, i))
    return found


def own_row(found: Map) -> int:
    """The row of the map nearest to the scene's own amount; the first if it is not on the map."""
    own = found.here[1]
    return 0 if own is None else int(np.argmin(np.abs(np.array(found.y.shown()) - own)))


def own_sentence(found: Map, slot: int) -> str:
    """What happens along the x axis at the scene's own amount."""
    j = own_row(found)
    parts = runs(found.outcome[:, j, slot])
    start = amount_words(found.y, j)
    if len(parts) == 1:
        return f"{start}, {place_words(found.x, 0, len(found.x.values) - 1)} {DOES[parts[0][0]]}, wherever it lies."
    if len(parts) <= MOST_RUNS:
        told = [f"{place_words(found.x, first, last)} {DOES[outcome]}" for outcome, first, last in parts]
        told = [told[0], *(t.replace("a fault at", "one at", 1).replace("a flight with", "one with", 1)
                           for t in told[1:])]
        return f"{start}, {', '.join(told[:-1])}, and {told[-1]}."
    count = len(found.x.values)
    told = []
    for outcome in reversed(Outcome):
        n = int(np.count_nonzero(found.outcome[:, j, slot] == outcome))
        if n:
            told.append(f"{n} {SHORT[outcome]}")
    return f"{start}, of {count} points along the map {', '.join(told)}."


def whole_sentence(found: Map, slot: int) -> str:
    """The worst on the whole map, and from which amount on nothing is to be feared."""
    outcome = found.outcome[:, :, slot]
    flown = outcome != Outcome.UNKNOWN
    if not flown.any():
        return "No point of the map can be flown."
    bad = flown & (outcome != Outcome.CLEARS)
    if not bad.any():
        return "At every point of the map the formation clears the floor by itself."
    return f"{_worst(found, slot, bad)}; {_enough(found, outcome, flown)}."


def _worst(found: Map, slot: int, bad: Mask) -> str:
    late = np.where(bad, found.grid("lateness_s")[:, :, slot, 1], np.nan)
    pull = found.grid("last_pull_floor_s")[:, :, slot]
    never = bad & np.isnan(late) & np.isfinite(pull)
    if never.any():
        count = int(np.count_nonzero(never))
        return (f"At {count} of {late.size} points the likely observer notices nothing before it is over, "
                f"first at {_point(found, never)}")
    i, j = np.unravel_index(int(np.nanargmax(late)), late.shape)
    worst = float(late[i, j])
    cue = int(found.grid("cue")[i, j, slot, 1])
    who = f"the likely observer, to whom {SHOWS[CUES[cue]]} shows it," if cue >= 0 else "the likely observer"
    place = f"{found.x.text(int(i))} and {found.y.text(int(j))}"
    if worst > 0.0:
        return f"At worst, at {place}, {who} is {worst:.1f} s too late"
    return f"At worst, at {place}, {who} has {-worst:.1f} s in hand"


def _point(found: Map, mask: Mask) -> str:
    i, j = (int(v[0]) for v in np.nonzero(mask))
    return f"{found.x.text(i)} and {found.y.text(j)}"


def _enough(found: Map, outcome: Outcomes, flown: Mask) -> str:
    """From which end of the y axis on every point clears by itself."""
    clear = np.all((outcome == Outcome.CLEARS) | ~flown, axis=0) & flown.any(axis=0)
    if not clear.any():
        return "no row of the map clears by itself at all its points"
    count = len(clear)
    up = count - int(np.argmin(clear[::-1])) if not clear.all() else 0
    down = int(np.argmin(clear)) if not clear.all() else count
    so = "the formation clears by itself"
    so += " wherever the fault comes" if found.x.path.startswith("fault.at.") else " all along"
    if clear[-1]:
        words = amount_words(found.y, up, " or more" if up < count - 1 else "")
    elif clear[0]:
        words = amount_words(found.y, down - 1, " or less" if down > 1 else "")
    else:
        words = f"At {', '.join(found.y.text(int(j)) for j in np.flatnonzero(clear))}"
    return f"{words[0].lower()}{words[1:]} {so}"
