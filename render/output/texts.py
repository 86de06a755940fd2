"""What the overlay says at one instant, as exact strings; nothing is drawn here."""

from __future__ import annotations

import math
from dataclasses import dataclass

from render.frames import Array
from render.output.events import slot_index, slot_title
from render.output.words import Units, seconds
from render.types import Study


@dataclass(frozen=True, slots=True)
class OverlayTexts:
    """The strings of one frame and the margin behind them.

    margin_s: seconds left against the floor; NaN where it does not run out. state: ``left``,
    ``gone``, ``endless`` (does not run out), ``no_pull`` (the aircraft's escape does nothing) or ``contact``.
    """

    slot: str
    title: str
    since_fault: str
    height: str
    speed: str
    margin_label: str
    margin_value: str
    margin_note: str
    margin_s: float
    state: str


def sample(time_s: Array, values: Array, at_s: float) -> float:
    """A history's value at an instant, linear between samples, held at the ends.

    Beside a NaN the nearer sample counts, so that a margin's first or last value isn't lost.
    """
    i = min(max(int(time_s.searchsorted(at_s)), 1), len(time_s) - 1)
    t0, t1, v0, v1 = (float(x) for x in (time_s[i - 1], time_s[i], values[i - 1], values[i]))
    part = min(max((at_s - t0) / (t1 - t0), 0.0), 1.0)
    if math.isnan(v0) or math.isnan(v1):
        return v0 if part < 0.5 else v1
    return v0 + part * (v1 - v0)


def margin_at(study: Study, slot: str, time_s: float) -> float:
    """Seconds left against the floor at an instant; NaN where it does not run out, negative once gone.

    Where the history has no value after the last pull (after contact), the time since it counts on.
    """
    k = slot_index(study, slot)
    left = sample(study.margin.time_s, study.margin.seconds_floor_s[:, k], time_s)
    last = study.margin.last_pull_floor_s[k]
    if math.isnan(left) and last is not None and time_s >= last:
        return last - time_s
    return left


def overlay_texts(study: Study, slot: str, time_s: float) -> OverlayTexts:
    """Every string the overlay prints for a slot at a study instant (s from the start of the script).

    Height is above the ground underneath, speed calibrated; raises KeyError for an unknown slot.
    """
    k = slot_index(study, slot)
    flight = study.faulted
    units = Units(study.scene.film.units)
    label, value, note, margin_s, state = _margin_texts(study, slot, time_s, units)
    return OverlayTexts(
        slot=slot_title(slot),
        title=study.scene.title,
        since_fault=_fault_text(flight.fault_s, time_s),
        height=f"{units.height_calm(sample(flight.time_s, flight.height_agl_m[:, k], time_s))} above ground",
        speed=units.speed(sample(flight.time_s, flight.cas_mps[:, k], time_s)),
        margin_label=label,
        margin_value=value,
        margin_note=note,
        margin_s=margin_s,
        state=state,
    )


def _fault_text(fault_s: float | None, time_s: float) -> str:
    if fault_s is None:
        return "no fault in this scene"
    since = round(time_s - fault_s, 1) + 0.0
    if since < 0.0:
        return f"{seconds(-since)} before the fault"
    return f"{seconds(since)} after the fault"


def _margin_texts(study: Study, slot: str, time_s: float, units: Units) -> tuple[str, str, str, float, str]:
    k = slot_index(study, slot)
    margin_s = margin_at(study, slot, time_s)
    contact = study.faulted.contact_s[k]
    if contact is not None and time_s >= contact:
        return "the flight ends", "ground contact", "", margin_s, "contact"
    if study.margin.no_pull_left[k] and study.faulted.fault_s is not None and time_s >= study.faulted.fault_s:
        return "the stick does nothing", "no pull left", "", margin_s, "no_pull"
    note = _pull_now(study, slot, time_s, units)
    floor = units.length(study.scene.floor_m)
    if math.isnan(margin_s):
        return f"time to clear the floor ({floor})", "does not run out", note, margin_s, "endless"
    if margin_s < 0.0:
        return "last pull gone since", seconds(-margin_s), note, margin_s, "gone"
    return "left before the last pull", seconds(margin_s), note, margin_s, "left"


def _pull_now(study: Study, slot: str, time_s: float, units: Units) -> str:
    """What an escape that began now would do, in metres or feet, against floor and ground."""
    k = slot_index(study, slot)
    floor = sample(study.margin.time_s, study.margin.clearance_floor_m[:, k], time_s)
    ground = sample(study.margin.time_s, study.margin.clearance_ground_m[:, k], time_s)
    if math.isnan(floor) or math.isnan(ground):
        return ""
    if floor >= 0.0:
        return f"a pull now clears the floor by {units.height_calm(floor)}"
    if ground >= 0.0:
        return f"a pull now ends {units.height_calm(-floor)} below the floor"
    return "a pull now does not clear the ground"
