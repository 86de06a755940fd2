"""What a team's own technique does to each cue: healthy passes against the pass as briefed, matched at one point."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Sequence

import numpy as np

from render.decide.brief import compile_brief
from render.decide.left import one_seat
from render.decide.seats import seats
from render.errors import FlightError
from render.flight import records as r
from render.flight import script as s
from render.flight.batch import Raw
from render.flight.closing import close_each
from render.flight.inside import crossing, fly_far
from render.flight.plan import DT_S, Plan
from render.frames import Array
from render.sight.evidence import Evidence, wing_evidence
from render.sight.notice import SAMPLE_S
from scenes.airframe import Airframe
from scenes.model import Level, Scene
from terrain.ground import Ground

EVERY = max(1, round(SAMPLE_S / DT_S))
TOGETHER = 20


def heading_of(scene: Scene) -> float:
    """The heading a scene begins with, rad: what the ground patches are laid about."""
    first = scene.script[0]
    return first.heading_rad if isinstance(first, Level) and first.heading_rad is not None else 0.0


def technique_scatter(
    nominal: Scene, nominal_scale: float, passes: Sequence[Scene], at_s: float,
    airframe_of: Callable[[str], Airframe], ground: Ground,
) -> tuple[dict[str, float], ...]:
    """For each slot, what each cue of healthy passes differs by from the pass as briefed: cue -> one sigma.

    Root mean square over the passes at each instant from the point to the bottom (``at_s`` in the nominal pass; the
    same loop angle in the others if it lies in the loop), of that the median over the instants: where the g is let
    go at the end, a second sooner or later is no technique. Passes that can't be flown are left out.
    """
    whole = compile_brief(nominal, airframe_of)
    plans, scales = _closed([compile_brief(p, airframe_of) for p in passes])
    own = fly_far([whole], np.array([nominal_scale]), whole.longest_s)
    angle = float(own.a[0, round(at_s / DT_S), 0, r.A_LOOP])
    end = min(round(own.mem[0, s.M_SCRIPT_END_S] / DT_S), own.y.shape[1] - 1)
    begin = round(at_s / DT_S)
    end = begin + max(int(np.argmax(own.y[0, begin : end + 1, 0, r.D])), 2 * EVERY)
    count = max((end - begin) // EVERY, 2)
    time_s: Array = np.arange(count, dtype=np.float64) * (EVERY * DT_S)
    sums: list[dict[str, tuple[Array, Array]]] = [{} for _ in nominal.formation]
    for at in range(0, len(plans), TOGETHER):
        part = plans[at : at + TOGETHER]
        raw = fly_far(part, scales[at : at + TOGETHER], whole.longest_s)
        starts = [_start(p, raw, b, angle, begin) for b, p in enumerate(part)]
        for k in range(1, len(whole.airframes)):
            seen = _against(whole, own, begin, part, raw, starts, k, time_s, ground, heading_of(nominal))
            for c, name in enumerate(seen.names):
                there = seen.there[:, c]
                total, n = sums[k - 1].get(name, (np.zeros(count), np.zeros(count)))
                sums[k - 1][name] = (total + np.sum(np.where(there, seen.difference[:, c], 0.0) ** 2, axis=0),
                                     n + np.sum(there, axis=0))
    return tuple({name: _typical(total, n) for name, (total, n) in slot.items()} for slot in sums)


def _closed(plans: Sequence[Plan]) -> tuple[list[Plan], Array]:
    """The plans whose loops close, and the scales of their back halves."""
    scale, why = close_each(plans, plans[0].longest_s)
    good = [i for i, reason in enumerate(why) if reason is None]
    return [plans[i] for i in good], scale[good]


def _typical(total: Array, n: Array) -> float:
    """The median over the instants at which at least half of the passes have the cue."""
    usable = n >= max(float(np.max(n)) / 2.0, 1.0)
    return float(np.median(np.sqrt(total[usable] / n[usable]))) if np.any(usable) else 0.0


def _start(plan: Plan, raw: Raw, b: int, angle_rad: float, begin: int) -> int:
    """The step at which a pass is at the point: by its loop angle inside the loop, else by the clock."""
    if not 0.0 < angle_rad < 2.0 * np.pi - 0.01:
        return begin
    try:
        return round(crossing(plan, raw, b, angle_rad).time_s / DT_S)
    except FlightError:
        return begin


def _against(
    whole: Plan, own: Raw, begin: int, plans: Sequence[Plan], raw: Raw, starts: Sequence[int], k: int, time_s: Array,
    ground: Ground, line_rad: float,
) -> Evidence:
    """Evidence of passes against the nominal one from the point on, (B, C, T), everything counting."""
    steps = np.arange(len(time_s)) * EVERY
    last = own.y.shape[1] - 1
    mine = np.minimum(np.asarray(starts)[:, None] + steps, last)
    rows = np.arange(len(plans))[:, None]
    healthy = np.minimum(begin + steps, last)
    seat_h = one_seat(seats(whole, own.y[:, healthy], own.a[:, healthy], k))
    winds = np.stack([p.wind_e_mps for p in plans])
    seat_f = seats(plans[0], raw.y[rows, mine], raw.a[rows, mine], k, winds)
    watch = dataclasses.replace(whole.scene.watch, gauges_every_s=None, call_after_s=None)
    everywhere = np.ones((len(plans), len(time_s)), dtype=bool)
    return wing_evidence(seat_h, seat_f, time_s, everywhere, watch, ground.height_at, line_rad)


def healthy_evidence(
    nominal: Scene, scale: float, airframe_of: Callable[[str], Airframe], ground: Ground
) -> tuple[tuple[Array, Evidence], ...]:
    """For each slot, the healthy pass against itself from the loop's entry to the script's end: times and evidence."""
    plan = compile_brief(nominal, airframe_of)
    raw = fly_far([plan], np.array([scale]), plan.longest_s)
    end = round(raw.mem[0, s.M_SCRIPT_END_S] / DT_S)
    begin = int(np.argmax(raw.a[0, :, 0, r.A_LOOP] > 0.0))
    steps = np.arange(begin, max(end, begin + 2 * EVERY), EVERY)
    time_s: Array = steps * DT_S
    everywhere = np.ones(len(steps), dtype=bool)
    out = []
    for k in range(1, len(plan.airframes)):
        seat = one_seat(seats(plan, raw.y[:, steps], raw.a[:, steps], k))
        seen = wing_evidence(seat, seat, time_s, everywhere, plan.scene.watch, ground.height_at, heading_of(nominal))
        out.append((time_s, seen))
    return tuple(out)
