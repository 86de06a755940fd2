"""A scatter study in words and for a program; nothing is drawn here."""

from __future__ import annotations

from collections.abc import Mapping
from typing import Any

import numpy as np

from render.decide.cases import GATE_COLUMNS, GATES
from render.decide.scatter import ScatterStudy, Share, SlotScatter
from render.frames import Array
from render.output.events import slot_title
from render.output.words import CAUTION, KNOT_MPS, Units, cue_words, seconds
from render.sight.observers import TECHNIQUE
from render.types import OBSERVERS

GATE_WORDS = {"entry": "entry", "vertical_up": "vertical up", "top": "top", "vertical_down": "vertical down",
              "bottom": "bottom"}
ANGLES = ("tilt", "lead")
RATES = ("turning", "felt rate")


def of_100(share: Share) -> str:
    """A share as passes of 100 with its interval: ``12 (9 to 16) of 100``."""
    if share.of == 0:
        return "no pass"
    return f"{_count(share.per_100)} ({_count(100.0 * share.low)} to {_count(100.0 * share.high)}) of 100"


def _count(per_100: float) -> str:
    """Passes of 100: whole numbers, a tenth where a rare thing would round to none or all."""
    if 0.0 < per_100 < 1.0 or 99.0 < per_100 < 100.0:
        return f"{per_100:.1f}"
    return f"{per_100:.0f}"


def headline(slot: SlotScatter) -> tuple[str, str]:
    """The one sentence of a slot, and its tone: short | mixed | over."""
    late = slot.too_late.per_100
    name = slot_title(slot.slot)
    if slot.by_itself.count == slot.by_itself.of:
        return f"{name}: stays above the floor by itself in every pass flown", "over"
    need = slot.in_time.count + slot.too_late.count
    said = f"{name}: knew in time in {of_100(slot.in_time)} passes"
    if slot.by_itself.count:
        said += f"; needed nothing in {_count(slot.by_itself.per_100)}"
    return said, "short" if late >= 50.0 else ("mixed" if need else "over")


def in_hand_words(slot: SlotScatter) -> str:
    """Median and range of what was left, in words."""
    values = slot.in_hand_s
    if len(values) == 0:
        return ""
    low, mid, high = (float(v) for v in np.quantile(values, (0.05, 0.5, 0.95), method="nearest"))

    def one(value: float) -> str:
        if value == np.inf:
            return "not needed"
        if value == -np.inf:
            return "never knew"
        return f"{seconds(value)} in hand" if value >= 0.0 else f"{seconds(-value)} too late"

    return f"the middle pass {one(mid)}; 5 of 100 worse than {one(low)}, 5 better than {one(high)}"


def gate_spread(study: ScatterStudy, gate: str) -> tuple[Array, Array]:
    """Mean and standard deviation of height m, speed m/s and load factor at a gate, over the passes that came there."""
    rows = study.gates[:, GATES.index(gate), 1:]
    rows = rows[np.all(np.isfinite(rows), axis=1)]
    if len(rows) < 2:
        return np.full(3, np.nan), np.full(3, np.nan)
    return np.mean(rows, axis=0), np.std(rows, axis=0, ddof=1)


def gate_lines(study: ScatterStudy) -> list[str]:
    """Height, speed and g at each gate, with their spread."""
    units = Units(study.scene.film.units)
    scale = KNOT_MPS if units.name == "feet" else 1.0 / 3.6
    lines = [f"  {'':<14}{f'height, {units.length_unit}':>18}{f'speed, {units.speed_unit}':>16}{'load factor, g':>18}"]
    for gate, name in GATE_WORDS.items():
        mean, sd = gate_spread(study, gate)
        if not np.all(np.isfinite(mean)):
            continue
        height = f"{units.length_value(mean[0]):,.0f} +/- {units.length_value(sd[0]):,.0f}"
        lines.append(f"  {name:<14}{height:>18}{f'{mean[1] / scale:.0f} +/- {sd[1] / scale:.1f}':>16}"
                     f"{f'{mean[2]:.1f} +/- {sd[2]:.2f}':>18}")
    return lines


def technique_words(study: ScatterStudy, slot: SlotScatter) -> str:
    """The technique scatter that the accumulator used, cue by cue, beside the table's guesses."""
    if not slot.technique:
        return "The technique scatter of each cue is the table's guess."
    parts = []
    for cue, value in slot.technique.items():
        guess = TECHNIQUE[cue].value
        if cue in ANGLES or cue in RATES:
            unit = "deg" if cue in ANGLES else "deg/s"
            parts.append(f"{cue_words(cue)} {np.degrees(value):.1f} {unit} ({np.degrees(guess):.0f})")
        else:
            parts.append(f"{cue_words(cue)} {100.0 * value:.0f} % ({100.0 * guess:.0f})")
    used = "these stand in place of the guesses" if study.measured else "the larger of the two counts"
    return f"Technique scatter of these passes (the table's guess): {', '.join(parts)}; {used}."


def scatter_line(study: ScatterStudy) -> str:
    """What the team's scatter was taken to be."""
    units, s = Units(study.scene.film.units), study.scatter
    where = "measured from recordings" if study.measured else "as the scene says"

    def knots(v: float) -> str:
        return f"{v / KNOT_MPS:.1f} kt" if units.name == "feet" else f"{v * 3.6:.0f} km/h"

    return (
        f"Scatter, one sigma, {where}: entry {knots(s.entry_speed_mps)} and {units.length(s.entry_height_m)}, g "
        f"{100 * s.load_factor:.1f} %, base {units.length(s.base_m)}, power {100 * s.power:.0f} %, wind "
        f"{knots(s.wind_mps)}, place {s.station_m:.1f} m, attention {100 * s.attention:.0f} %, reaction "
        f"{100 * s.reaction:.0f} %."
    )


def slot_lines(study: ScatterStudy, slot: SlotScatter) -> list[str]:
    """One slot's figures."""
    observers = ", ".join(f"{o} {_count(x.per_100)}" for o, x in zip(OBSERVERS, slot.observers_in_time, strict=True))
    lines = [
        f"{headline(slot)[0]}.",
        f"  Stays above the floor by itself: {of_100(slot.by_itself)}; too late: {of_100(slot.too_late)}.",
        f"  Meets the ground if nobody acts: {of_100(slot.contact_idle)}; if he breaks out when he knows: "
        f"{of_100(slot.contact_acting)}.",
        f"  Of what was left: {in_hand_words(slot)}.",
        f"  False alarms, of 100 passes in which nothing fails: {100.0 * slot.false_alarms:.1f}.",
        f"  By fixed thresholds (in time or not needed, of 100): {observers}.",
        f"  {technique_words(study, slot)}",
    ]
    if slot.influences:
        most = ", ".join(f"{i.name} {i.rank:+.2f} ({i.low:+.2f} to {i.high:+.2f})" for i in slot.influences[:5])
        lines.append(f"  What goes with more left (rank correlation): {most}.")
    return lines


def study_text(study: ScatterStudy) -> str:
    """The study as lines of text."""
    lines = [study.scene.title, f"{len(study.gates)} passes flown, seed {study.seed}. {scatter_line(study)}", ""]
    if study.not_flown:
        lines += [f"{len(study.not_flown)} more passes could not be flown, the first: {study.not_flown[0]}", ""]
    lines += ["The passes without the fault, mean and one sigma:", *gate_lines(study),
              f"  Meet the ground with nothing failing: {of_100(study.contact_healthy)}.", ""]
    for slot in study.slots:
        lines += [*slot_lines(study, slot), ""]
    lines += [
        "In brackets: the interval that holds the true share in 95 of 100 such studies (Clopper-Pearson); it covers "
        "the chance of the draw, not the doubt in the model.",
        "He knows when gathered evidence reaches a bound set so that at most 2 of 100 passes without a fault alarm "
        "him.",
        CAUTION,
    ]
    return "\n".join(lines) + "\n"


def plain_study(study: ScatterStudy) -> Mapping[str, Any]:
    """All figures for a program: SI, units in the key names."""
    def plain(share: Share) -> dict[str, float]:
        return {"count": share.count, "of": share.of, "low": share.low, "high": share.high}

    def finite(value: float) -> float | None:
        return float(value) if np.isfinite(value) else None

    gates = {}
    for gate in GATES:
        mean, sd = gate_spread(study, gate)
        gates[gate] = {c: {"mean": finite(m), "sd": finite(s)} for c, m, s in
                       zip(GATE_COLUMNS[1:], mean, sd, strict=True)}
    slots = {}
    for slot in study.slots:
        known = slot.in_hand_s[np.isfinite(slot.in_hand_s)]
        slots[slot.slot] = {
            "by_itself": plain(slot.by_itself), "in_time": plain(slot.in_time), "too_late": plain(slot.too_late),
            "contact_if_nobody_acts": plain(slot.contact_idle), "contact_if_he_breaks_out": plain(slot.contact_acting),
            "false_alarms_per_pass": slot.false_alarms, "bound": slot.bound,
            "in_hand_s": {q: finite(np.quantile(known, p)) if known.size else None for q, p in
                          (("q05", 0.05), ("q50", 0.5), ("q95", 0.95))},
            "never_knew": int(np.sum(slot.in_hand_s == -np.inf)),
            "fixed_thresholds_in_time": {o: plain(x) for o, x in zip(OBSERVERS, slot.observers_in_time, strict=True)},
            "technique": dict(slot.technique),
            "rank_correlation": {i.name: {"rank": i.rank, "low": i.low, "high": i.high} for i in slot.influences},
        }
    return {
        "scene": study.scene.name, "caution": CAUTION, "seed": study.seed, "passes": study.passes,
        "flown": len(study.gates), "measured": study.measured, "gates": gates,
        "contact_healthy": plain(study.contact_healthy), "slots": slots,
    }


def passes_csv(study: ScatterStudy) -> str:
    """One row a pass that was flown: the gates, and what each slot had in hand; SI, the unit in each header.

    ``inf``: nothing was needed; ``-inf``: he never knew.
    """
    head = [f"{gate}_{column}" for gate in GATES for column in GATE_COLUMNS]
    head += [f"{slot.slot}_in_hand_s" for slot in study.slots]
    rows = np.column_stack([study.gates.reshape(len(study.gates), -1), *(s.in_hand_s for s in study.slots)])
    lines = [",".join(head)]
    lines += [",".join("" if v != v else f"{v:.9g}" for v in row) for row in rows.tolist()]
    return "\n".join(lines) + "\n"
