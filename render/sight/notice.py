"""When each observer in each aircraft could have noticed, and by what: one flight pair in, notices out."""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from render.frames import Array
from render.sight import cues as c
from render.sight import detect
from render.sight.geometry import HeightAt, Mask, eye_position
from render.sight.looks import eyes_inside, last_read
from render.sight.observers import TABLE, VISUAL, effective_sigma, source
from render.types import OBSERVERS, CueHistory, Flight, Notice
from scenes.model import Watch

SAMPLE_S = 0.04  # the eye needs no finer one; flights are stepped finer
UNHEARD = 1e9  # noise before a call: nothing to hear

Histories = Mapping[str, tuple[CueHistory, ...]]
Notices = Mapping[str, tuple[Notice, ...]]


def notice_all(
    healthy: Flight,
    faulted: Flight,
    watch: Watch,
    height_at: HeightAt,
    last_pull_floor_s: Sequence[float | None] = (),
) -> tuple[Histories, Notices]:
    """Cue histories and notices (early, likely, late) of the lead and every wing.

    Both flights share one time axis and are the same until the fault. ``height_at``: ground height over the
    field datum. ``last_pull_floor_s``: (K,), for the lateness. Clearances are left None; the study flies them.
    Nothing is noticed before the fault, and nothing after the pilot's own or the lead's contact.
    """
    names = faulted.names
    if faulted.fault_s is None:
        return {n: () for n in names}, {n: _never(i, last_pull_floor_s) for i, n in enumerate(names)}
    if healthy.time_s.shape != faulted.time_s.shape or np.any(healthy.time_s != faulted.time_s):
        raise ValueError("healthy and faulted flights need one time axis")
    grid = _grid(faulted.time_s, faulted.fault_s)
    coarse = faulted.time_s[grid]
    histories: dict[str, tuple[CueHistory, ...]] = {}
    notices: dict[str, tuple[Notice, ...]] = {}
    called = np.full(len(OBSERVERS), np.inf)
    for k, name in enumerate(names):
        found = _lead(healthy, faulted, grid) if k == 0 else _wing(healthy, faulted, grid, k, watch, height_at)
        ends = [faulted.contact_s[k], faulted.contact_s[0], healthy.contact_s[k], healthy.contact_s[0]]
        end_s = min((e for e in ends if e is not None), default=np.inf)
        counts = (coarse > faulted.fault_s) & (coarse < end_s)
        ready = [_ready(n, cue, counts) for n, cue in found.items()]
        if k > 0 and watch.call_after_s is not None:
            ready.append(_call(coarse, called, watch.call_after_s, counts))
        # (cues, observers, T) at once
        difference = np.stack([r.difference for r in ready])[:, None]
        when = detect.notice(coarse, difference, np.stack([r.sigma for r in ready]))
        first = np.argmin(when, axis=0)  # of cues at the same instant the first listed leads
        earliest = np.min(when, axis=0)
        if k == 0:
            called = earliest
        pull_s = _pull(last_pull_floor_s, k)
        notices[name] = tuple(
            _notice(o, float(t), ready[i].name, pull_s) for o, t, i in zip(OBSERVERS, earliest, first, strict=True)
        )
        histories[name] = tuple(_shown(r, faulted.time_s, coarse, faulted.fault_s, end_s) for r in ready)
    return histories, notices


@dataclass(frozen=True, slots=True, eq=False)
class _Ready:
    """A cue ready for the detector: difference (T,), sigma (observers, T)."""

    name: str
    difference: Array
    sigma: Array


def _grid(time_s: Array, fault_s: float) -> NDArray[np.int_]:
    """Indices of the samples worked on: about every 0.04 s from the last one before the fault on."""
    step = float(time_s[1] - time_s[0])
    start = max(int(np.searchsorted(time_s, fault_s, side="right")) - 1, 0)
    return np.arange(start, time_s.size, max(1, round(SAMPLE_S / step)))


def _seat(flight: Flight, k: int, grid: NDArray[np.int_]) -> c.Seat:
    lead, own = flight.airframes[0], flight.airframes[k]
    eye = eye_position(flight.pos_e_m[grid, 0], flight.quat_eb[grid, 0], lead.eye_forward_m, lead.eye_up_m)
    return c.Seat(
        flight.pos_e_m[grid, k], flight.vel_e_mps[grid, k], flight.quat_eb[grid, k], flight.rate_b_radps[grid, k],
        flight.load_factor[grid, k], flight.cas_mps[grid, k], flight.height_m[grid, k],
        own.eye_forward_m, own.eye_up_m, eye if k else None,
    )  # fmt: skip


def _wing(
    healthy: Flight, faulted: Flight, grid: NDArray[np.int_], k: int, watch: Watch, height_at: HeightAt
) -> dict[str, c.Cue]:
    time_s = faulted.time_s[grid]
    seat_h, seat_f = _seat(healthy, k, grid), _seat(faulted, k, grid)
    start = faulted.vel_e_mps[0, 0]
    line = float(np.arctan2(start[1], start[0]))
    found = c.visual_cues(
        c.view(seat_h, height_at, line, watch.look_at), c.view(seat_f, height_at, line, watch.look_at)
    )
    found |= c.felt_cues(seat_h, seat_f, float(time_s[1] - time_s[0]))
    found = _late(found, time_s)
    if watch.gauges_every_s is not None:
        out = ~eyes_inside(time_s, watch)
        for name in VISUAL:
            cue = found[name]
            found[name] = c.Cue(cue.difference * out, cue.eccentricity_rad, cue.widening)
        found["gauge"] = c.Cue(last_read(time_s, c.gauge_reading(seat_h, seat_f), watch))
    return found


def _lead(healthy: Flight, faulted: Flight, grid: NDArray[np.int_]) -> dict[str, c.Cue]:
    h, f = healthy, faulted
    found = c.lead_cues(
        h.load_factor[grid, 0], f.load_factor[grid, 0], h.load_factor_demand[grid, 0], f.load_factor_demand[grid, 0],
        h.stick_force_n[grid, 0], f.stick_force_n[grid, 0],
    )  # fmt: skip
    return _late(found, f.time_s[grid])


def _late(found: dict[str, c.Cue], time_s: Array) -> dict[str, c.Cue]:
    """Each cue by its delay later."""
    step = float(time_s[1] - time_s[0])
    return {
        name: c.Cue(detect.delayed(cue.difference, step, c.delay_of(name)), cue.eccentricity_rad, cue.widening)
        for name, cue in found.items()
    }


def _shown(cue: _Ready, time_s: Array, coarse_s: Array, fault_s: float, end_s: float) -> CueHistory:
    """A cue on the flight's own time axis: zero up to the fault and from contact on."""
    counts = (time_s > fault_s) & (time_s < end_s)
    difference = np.where(counts, np.interp(time_s, coarse_s, cue.difference), 0.0)
    sigma = {o: np.interp(time_s, coarse_s, s) for o, s in zip(OBSERVERS, cue.sigma, strict=True)}
    return CueHistory(cue.name, difference, c.UNITS[cue.name], sigma, source(cue.name))


def _ready(name: str, cue: c.Cue, counts: Mask) -> _Ready:
    sigma = [effective_sigma(name, TABLE[o], cue.eccentricity_rad, cue.widening) for o in OBSERVERS]
    return _Ready(name, cue.difference * counts, np.stack([np.broadcast_to(s, counts.shape) for s in sigma]))


def _call(time_s: Array, called: Array, after_s: float, counts: Mask) -> _Ready:
    """The lead's call as a cue: heard from when the same sort of observer in the lead would have spoken.

    The dwell of the detector stands for the time it takes to understand it.
    """
    heard = called + after_s  # (3,)
    difference = np.where(time_s >= np.min(heard), 1.0, 0.0) * counts
    noise = np.array([float(effective_sigma("call", TABLE[o], None)) for o in OBSERVERS])
    sigma = np.where(time_s >= heard[:, None], noise[:, None], UNHEARD)
    return _Ready("call", difference, sigma)


def _pull(last_pull_s: Sequence[float | None], k: int) -> float | None:
    return last_pull_s[k] if k < len(last_pull_s) else None


def _notice(observer: str, when_s: float, cue: str | None, last_pull_s: float | None) -> Notice:
    reaction = TABLE[observer].reaction.value
    if not np.isfinite(when_s):
        return Notice(observer, None, None, reaction, None, None, None)
    late = None if last_pull_s is None else when_s + reaction - last_pull_s
    return Notice(observer, when_s, cue, reaction, late, None, None)


def _never(k: int, last_pull_s: Sequence[float | None]) -> tuple[Notice, ...]:
    return tuple(_notice(o, np.inf, None, _pull(last_pull_s, k)) for o in OBSERVERS)
