"""The gate card's words: figures with their units, what they mean, assumptions and cautions; nothing is drawn here.

A gate height is where a figure of the model lies, never a leave to fly: no word here may sound like one.
"""

from __future__ import annotations

import math
from collections.abc import Mapping
from typing import Any

import numpy as np

from render.decide.gate_sheet import GateSheet
from render.decide.gates import Gate
from render.output.words import CAUTION, FOOT_M, KNOT_MPS, Units, cue_words, seconds
from render.sight.observers import TABLE
from render.types import OBSERVERS

PLACES = {"top": "top", "vertical_down": "vertical down"}
LIKELY = OBSERVERS.index("likely")
STEP = 10  # heights on the card are rounded to this, upward


def rounded_up(units: Units, height_m: float) -> str:
    """A least height, rounded up to ten units: ``7,120 ft``; a dash where there is none."""
    if not math.isfinite(height_m):
        return "none"
    return f"{math.ceil(units.length_value(height_m) / STEP - 1e-6) * STEP:,} {units.length_unit}"


def _nearest(units: Units, height_m: float) -> str:
    return units.height_calm(height_m) if math.isfinite(height_m) else "none"


def _figure(units: Units, height_m: float) -> str:
    return rounded_up(units, height_m).removesuffix(f" {units.length_unit}")


def wanted(sheet: GateSheet) -> str:
    """What the seconds are counted to: ``1.5 s left when his hand moves``."""
    return f"{seconds(sheet.want_s)} left when his hand moves" if sheet.from_hand else (
        f"{seconds(sheet.want_s)} left when he notices")


def headline(sheet: GateSheet, name: str) -> tuple[str, str]:
    """How the loop as briefed stands to one gate, short, and its tone: short | level | over | none."""
    units, gate = Units(sheet.scene.film.units), sheet.gates[name]
    need = gate.noticed_m[gate.flown, LIKELY]
    if not math.isfinite(need):
        return f"{PLACES[name].capitalize()}: no height leaves {seconds(sheet.want_s)}", "none"
    lack = units.length_value(need - gate.flown_height_m)
    amount = f"{abs(round(lack / STEP) * STEP):,} {units.length_unit}"
    if round(lack / STEP) == 0:
        return f"{PLACES[name].capitalize()}: at the height that leaves {seconds(sheet.want_s)}", "level"
    if lack > 0.0:
        return f"{PLACES[name].capitalize()}: {amount} too low to leave {seconds(sheet.want_s)}", "short"
    return f"{PLACES[name].capitalize()}: {amount} above the height that leaves {seconds(sheet.want_s)}", "over"


def held_words(sheet: GateSheet, name: str) -> str:
    """What the worst freeze of the loop as briefed, from a gate on, leaves the likely observer."""
    worst = sheet.held[name]
    left, deg = float(worst.least_s[0, LIKELY]), float(np.degrees(worst.at_rad[0, LIKELY]))
    when = "his hand moves" if sheet.from_hand else "he notices"
    place = f"from the {PLACES[name]} on" if name == "top" else f"from {PLACES[name]} on"
    if math.isinf(left) and left > 0.0:
        return f"{place}: whatever the freeze, the aircraft stay above the floor by themselves."
    if math.isinf(left):
        return f"{place}: at {deg:.0f} deg; nothing shows it to the likely pilot before the floor is broken."
    cue = cue_words(worst.cue[0][LIKELY])
    if left < 0.0:
        return f"{place}: at {deg:.0f} deg; {when} {seconds(-left)} after the last pull (likely, by {cue})."
    return f"{place}: at {deg:.0f} deg; {seconds(left)} left when {when} (likely, by {cue})."


def rows(sheet: GateSheet, name: str) -> list[tuple[str, str]]:
    """The figures of one gate at the speed the loop has there: what, how high."""
    units, gate = Units(sheet.scene.film.units), sheet.gates[name]
    i = gate.flown
    base = units.length(sheet.briefed.base_m)
    unit = units.length_unit
    each = [_figure(units, float(h)) for h in gate.noticed_m[i]]
    band = each[0] if len(set(each)) == 1 else " / ".join(each)
    who = "all three observers" if len(set(each)) == 1 else "early / likely / late"
    return [
        ("this loop", units.height_calm(gate.flown_height_m)),
        (f"closes at {base}, briefed pull", _nearest(units, float(gate.briefed_m[i]))),
        (f"closes at {base}, limit pull ({sheet.airframe.n_max:.1f} g)", _nearest(units, float(gate.limit_m[i]))),
        (f"any freeze leaves {seconds(sheet.want_s)}: {who}", f"{band} {unit}".replace(f"none {unit}", "none")),
    ]


def jump(gate: Gate) -> bool:
    """Whether from the likely gate on every freeze ends above the floor by itself, at the speed the loop has."""
    return bool(np.isinf(gate.there_s[gate.flown, LIKELY]))


def base_words(sheet: GateSheet) -> str:
    """The base height that the loop, lifted as a whole, would need."""
    units = Units(sheet.scene.film.units)
    early, likely, late = (float(b) for b in sheet.base_m)
    now = units.length(sheet.briefed.base_m)
    if not math.isfinite(likely):
        return f"the same loop, lifted: none; {sheet.base_none}; now {now}."
    return (f"the same loop, lifted: {rounded_up(units, likely)} (early {_figure(units, early)}, late "
            f"{_figure(units, late)}); now {now}.")


def float_words(sheet: GateSheet) -> str:
    """The largest float over the top."""
    floats = sheet.floats

    def one(key: str) -> str:
        x = floats[key]
        if x.none:
            return "none at all"
        return f"{'more than ' if x.whole else ''}{seconds(x.longer_s)} ({x.less_g:.2f} g less)"

    return (f"extra time over the top: {one('briefed')} before the briefed pull breaks the floor; {one('limit')} "
            f"before the limit pull no longer closes; {one('likely')} that still leaves {seconds(sheet.want_s)} "
            "(likely).")


def day_words(sheet: GateSheet) -> list[str]:
    """What another day adds to the gates, a line for each day."""
    units = Units(sheet.scene.film.units)
    names = {"hotter": "10 degC warmer", "higher": "field 1,000 ft higher"}

    def change(value_m: float) -> str:
        if not math.isfinite(value_m):
            return "none"
        return f"{round(units.length_value(value_m) / STEP) * STEP:+,}"

    lines = []
    for day, title in names.items():
        each = "; ".join(f"{PLACES[g]} {change(sheet.days[day][g][0])} to close, {change(sheet.days[day][g][2])} for a "
                         f"freeze" for g in sheet.gates)
        lines.append(f"{title}, {units.length_unit}: {each} (likely).")
    return lines


def extras(sheet: GateSheet) -> list[tuple[str, list[str]]]:
    """What stands beside the gates: a few words, and the lines they head."""
    return [
        ("Worst freeze", [held_words(sheet, name) for name in sheet.gates]),
        ("Base height", [base_words(sheet)]),
        ("Largest float", [float_words(sheet)]),
        ("Another day", day_words(sheet)),
    ]


def assumptions(sheet: GateSheet) -> list[str]:
    """What the figures rest on."""
    scene, units = sheet.scene, Units(sheet.scene.film.units)
    reaction = " / ".join(f"{TABLE[o].reaction.value:.1f}" for o in OBSERVERS)
    day = scene.day
    air = "standard air" if day.temperature_k is None else f"{day.temperature_k - 273.15:.0f} degC"
    invented = "an invented airframe" if sheet.airframe.invented else "the airframe's figures as entered"
    return [
        f"Heights above the field, calibrated speeds; field {units.length(day.field_elevation_m)}, {air}. Heights "
        f"that a freeze needs are rounded up. Floor {units.length(scene.floor_m)} as the scene says.",
        f"{sheet.airframe.title}: {invented}, limit {sheet.airframe.n_max:.1f} g. Break-out "
        f"{scene.break_out.load_factor:.1f} g at {scene.break_out.onset_gps:.1f} g/s. Limit pull: to that limit or "
        "buffet; no formation follows it.",
        f"Freeze: the lead's stabilator stops at any point from the gate to 350 deg, and he does nothing else. "
        f"The wings follow until they act. Reaction {reaction} s.",
        "Early, likely and late are three observers with published, remembered and guessed thresholds (see the "
        "briefing page): a range, not a forecast of one pilot.",
        "Other faults, birds, wind shear, instrument error and a lead who tries something else are not in it.",
    ]


def plain_sheet(sheet: GateSheet) -> Mapping[str, Any]:
    """All figures for a program: SI, units in the key names, null where there is none."""
    def column(values: Any) -> Any:
        array = np.asarray(values, dtype=float)
        return [column(v) for v in array] if array.ndim else (float(array) if np.isfinite(array) else None)

    gates = {
        name: {
            "speed_mps": column(g.speed_mps), "this_loop": {"speed_mps": float(g.speed_mps[g.flown]),
                                                            "height_m": g.flown_height_m},
            "closes_briefed_m": column(g.briefed_m), "closes_limit_m": column(g.limit_m),
            "any_freeze_m": {o: column(g.noticed_m[:, i]) for i, o in enumerate(OBSERVERS)},
            "any_freeze_none": g.none or None,
            "left_at_gate_s": {o: column(g.there_s[:, i]) for i, o in enumerate(OBSERVERS)},
            "worst_freeze_deg": {o: column(np.degrees(g.worst_rad[:, i])) for i, o in enumerate(OBSERVERS)},
            "this_loop_left_s": {o: column(sheet.held[name].least_s[0, i]) for i, o in enumerate(OBSERVERS)},
            "this_loop_worst_freeze_deg": {o: float(np.degrees(sheet.held[name].at_rad[0, i]))
                                           for i, o in enumerate(OBSERVERS)},
        }
        for name, g in sheet.gates.items()
    }
    return {
        "scene": sheet.scene.name, "caution": CAUTION, "want_s": sheet.want_s,
        "counted_to": "his hand moves" if sheet.from_hand else "he notices",
        "floor_m": sheet.scene.floor_m, "base_m": sheet.briefed.base_m, "gates": gates,
        "base_needed_m": {o: column(b) for o, b in zip(OBSERVERS, sheet.base_m, strict=True)},
        "largest_float": {k: {"less_g": column(x.less_g), "longer_s": column(x.longer_s), "largest_tried": x.whole}
                          for k, x in sheet.floats.items()},
        "other_days": {day: {g: dict(zip(("closes_briefed_m", "closes_limit_m", "any_freeze_likely_m"),
                                         column(change), strict=True)) for g, change in of.items()}
                       for day, of in sheet.days.items()},
    }


def sheet_text(sheet: GateSheet) -> str:
    """The card as lines of text."""
    units = Units(sheet.scene.film.units)
    unit = units.length_unit
    lines = [sheet.scene.title, f"Gates that leave {wanted(sheet)}, after any freeze of the lead's stabilator from "
             "there on.", ""]
    for name, gate in sheet.gates.items():
        speed = units.speed(float(gate.speed_mps[gate.flown]))
        lines.append(f"{headline(sheet, name)[0]} (at {speed}).")
        lines += [f"  {what:<52} {value}" for what, value in rows(sheet, name)]
        if gate.none:
            lines.append(f"  No such height at some speed: {gate.none}.")
        if jump(gate):
            lines.append("  From the likely gate on, every freeze ends above the floor by itself.")
        each = [f"{float(v) / KNOT_MPS:.0f} kt" if units.name == "feet" else units.speed(float(v))
                for v in gate.speed_mps]
        lines.append("  " + f"{'speed':<26}" + "".join(f"{s:>10}" for s in each))
        for what, column in (("closes, briefed pull", gate.briefed_m), ("closes, limit pull", gate.limit_m)):
            each = [_nearest(units, float(h)).removesuffix(f" {unit}") for h in column]
            lines.append(f"  {what:<26}" + "".join(f"{h:>10}" for h in each))
        for i, o in enumerate(OBSERVERS):
            each = [_figure(units, float(h)) for h in gate.noticed_m[:, i]]
            lines.append(f"  {f'any freeze, {o}':<26}" + "".join(f"{h:>10}" for h in each))
        lines.append("")
    for head, said in extras(sheet):
        lines += [f"{head if i == 0 else '':<15}{text}" for i, text in enumerate(said)]
    lines += ["", *assumptions(sheet), CAUTION]
    return "\n".join(lines) + "\n"


__all__ = ["FOOT_M", "assumptions", "base_words", "day_words", "float_words", "headline", "held_words", "jump",
           "extras", "plain_sheet", "rounded_up", "rows", "sheet_text", "wanted"]
