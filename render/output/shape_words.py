"""What a search for a pull found, in words and as plain data; chart, command and files say the same."""

from __future__ import annotations

import math
from typing import Any

import numpy as np

from render.decide.shape import LIKELY, Frozen
from render.decide.shape_limits import Limits, Pull
from render.decide.shape_search import FINER, Shape, Trade
from render.output.words import CAUTION, Units, seconds
from render.types import OBSERVERS
from scenes.model import Loop


def late_words(value_s: float) -> str:
    """A worst lateness in words."""
    if np.isneginf(value_s):
        return "every freeze clears the floor by itself"
    if np.isposinf(value_s):
        return "never noticed before it is too late"
    return f"too late by {seconds(value_s)}" if value_s > 0.0 else f"{seconds(-value_s)} in hand"


def worst_words(value_s: float) -> str:
    """The likely observer's worst freeze as a clause."""
    if np.isneginf(value_s):
        return "every freeze clears the floor by itself"
    if np.isposinf(value_s):
        return "the likely observer never notices the worst freeze in time"
    if value_s > 0.0:
        return f"the worst freeze shows {seconds(value_s)} too late for the likely observer"
    return f"the worst freeze leaves the likely observer {seconds(-value_s)}"


def short_late(value_s: float) -> str:
    """The same for a table."""
    if np.isneginf(value_s):
        return "clears"
    if not np.isfinite(value_s):
        return "never" if np.isposinf(value_s) else "not flown"
    return f"{round(value_s, 1) + 0.0:+.1f} s"


def chosen(shape: Shape) -> Trade | None:
    """The best of the trade; None: keep the loop as it was."""
    return None if shape.best is None else shape.trade[shape.best]


def worst_at(frozen: Frozen) -> float:
    """The freeze point that leaves the likely observer the least, degrees; NaN if all clear."""
    late = np.where(np.isnan(frozen.lateness_s[:, LIKELY]), np.inf, frozen.lateness_s[:, LIKELY])
    return math.nan if np.all(frozen.clears) else float(np.degrees(frozen.freeze_rad[int(np.argmax(late))]))


def headline(shape: Shape) -> str:
    """One sentence: what was found."""
    best, before = chosen(shape), worst_words(float(shape.start.worst_s[LIKELY]))
    if best is None or best.frozen is None or best.pull is None:
        return f"Nothing better found within the limits; the loop stays as it is: {before}."
    after = worst_words(float(best.frozen.worst_s[LIKELY]))
    return f"Pulled otherwise, at {best.pull.load_factor:.1f} g at most: {after}. As it was: {before}."


def limits_words(limits: Limits) -> str:
    """The limits in words."""
    degree = math.pi / 180.0
    return (f"at most {limits.load_factor:.2f} g, {limits.onset_gps:.2f} g/s, {limits.slope_gprad * degree:.3f} g per "
            f"degree of loop, that changing by {limits.bend_gprad2 * degree**2:.4f} per degree, lift "
            f"{100.0 * limits.buffet:.0f} % of that at which buffet begins")


def pull_words(pull: Pull, units: Units) -> str:
    """What a pull asks, in words."""
    return (f"{pull.load_factor:.2f} g, {pull.onset_gps:.2f} g/s, lift {100.0 * pull.buffet:.0f} % of buffet, top "
            f"speed {units.speed(pull.speed_max_mps)}, vertical down at {units.length(pull.down_height_m)}")


def shape_text(shape: Shape) -> str:
    """Everything as text: the sentence, limits, demand, freeze points before and after, the trade."""
    units, best = Units(shape.job.scene.film.units), chosen(shape)
    out = [shape.job.scene.title, "", headline(shape), "", f"limits: {limits_words(shape.limits)}"]
    if not shape.within:
        out.append("the loop as it was does not keep these limits itself")
    out.append(f"as it was: {pull_words(shape.start_pull, units)}")
    if best is not None and best.pull is not None and best.scene is not None:
        step = best.scene.script[shape.job.loop]
        assert isinstance(step, Loop)
        back = [(math.degrees(a), n) for a, n in zip(step.angle_rad, step.load_factor, strict=True) if a > math.pi]
        out += [f"found:     {pull_words(best.pull, units)}",
                "demand:    " + ", ".join(f"{a:.0f} deg {n:.2f} g" for a, n in back)]
    after = shape.start if best is None or best.frozen is None else best.frozen
    out += ["", "lateness of early / likely / late by freeze point (the worse slot; + is too late; clears: the floor",
            "is never reached if nobody acts), and the lowest height above the floor then",
            f"{'freeze at':>10}  {'as it was':<28}{'':>9}  {'found' if best else 'the same':<28}"]
    before_at = {round(float(a), 6): i for i, a in enumerate(shape.start.freeze_rad)}
    for i, angle in enumerate(after.freeze_rad):
        j = before_at.get(round(float(angle), 6))
        if j is None or j % FINER:
            continue
        rows = []
        for frozen, k in ((shape.start, j), (after, i)):
            late = " / ".join(short_late(v) for v in frozen.lateness_s[k])
            rows.append(f"{late:<28}{units.length(frozen.clear_m[k]) if np.isfinite(frozen.clear_m[k]) else '-':>9}")
        out.append(f"{math.degrees(angle):>6.0f} deg  {rows[0]}  {rows[1]}")
    out += ["", "trade: greatest g allowed | flown | top speed | vertical down | worst early / likely / late"]
    for item in shape.trade:
        if item.pull is None or item.frozen is None:
            out.append(f"  {item.limits.load_factor:.2f} g | no pull was found that keeps every limit")
            continue
        late = " / ".join(short_late(v) for v in item.frozen.worst_s)
        out.append(f"  {item.limits.load_factor:.2f} g | {item.pull.load_factor:.2f} g | "
                   f"{units.speed(item.pull.speed_max_mps)} | {units.length(item.pull.down_height_m)} | {late}")
    out += ["", f"{shape.cases:,} freezes and pulls flown, seed {shape.seed}. A freeze, at the entry, in the air and "
            "with the station keeping of the scene alone; other faults are not looked at.", CAUTION]
    return "\n".join(out) + "\n"


def _number(value: float) -> float | str | None:
    if np.isnan(value):
        return None
    return float(value) if np.isfinite(value) else ("clears" if value < 0 else "never")


def _pull(pull: Pull | None) -> dict[str, Any] | None:
    if pull is None:
        return None
    return {"load_factor_max": pull.load_factor, "onset_max_gps": pull.onset_gps, "slope_max_gprad": pull.slope_gprad,
            "bend_max_gprad2": pull.bend_gprad2, "lift_of_buffet_max": pull.buffet, "speed_max_mps": pull.speed_max_mps,
            "vertical_down": {"height_m": pull.down_height_m, "speed_mps": pull.down_cas_mps}, "scale": pull.scale}


def _frozen(frozen: Frozen | None) -> dict[str, Any] | None:
    if frozen is None:
        return None
    return {
        "worst_lateness_s": {o: _number(v) for o, v in zip(OBSERVERS, frozen.worst_s, strict=True)},
        "freezes": [
            {"loop_angle_deg": round(math.degrees(a), 3), "clear_m": _number(c), "error": e,
             "lateness_s": {o: _number(v) for o, v in zip(OBSERVERS, row, strict=True)}}
            for a, c, row, e in zip(frozen.freeze_rad, frozen.clear_m, frozen.lateness_s, frozen.error, strict=True)
        ],
    }


def plain_shape(shape: Shape) -> dict[str, Any]:
    """Everything as plain data for shape.json: SI, units in key names; "clears" and "never" stand for no number."""
    limits = shape.limits

    def demand(item: Trade) -> dict[str, float] | None:
        if item.scene is None:
            return None
        step = item.scene.script[shape.job.loop]
        assert isinstance(step, Loop)
        return {f"{math.degrees(a):.6g}": n for a, n in zip(step.angle_rad, step.load_factor, strict=True)}

    return {
        "scene": shape.job.scene.name, "caution": CAUTION, "sentence": headline(shape),
        "limits": {"load_factor": limits.load_factor, "onset_gps": limits.onset_gps, "slope_gprad": limits.slope_gprad,
                   "bend_gprad2": limits.bend_gprad2, "lift_of_buffet": limits.buffet},
        "start": {"within_limits": shape.within, "pull": _pull(shape.start_pull), **(_frozen(shape.start) or {})},
        "trade": [{"load_factor_allowed": t.limits.load_factor, "demand_g_by_deg": demand(t), "pull": _pull(t.pull),
                   **(_frozen(t.frozen) or {})} for t in shape.trade],
        "best": shape.best, "cases": shape.cases, "seed": shape.seed,
    }
