"""When each observer in each aircraft could have noticed, and by what: one flight pair in, notices out."""

from __future__ import annotations

from collections.abc import Mapping, Sequence

import numpy as np
from numpy.typing import NDArray

from render.frames import quat_rotate
from render.sight import cues as c
from render.sight.evidence import Evidence, first_notice, lead_evidence, wing_evidence
from render.sight.geometry import HeightAt, Mask, eye_position
from render.sight.observers import TABLE, source
from render.types import OBSERVERS, CueHistory, Flight, Notice
from scenes.model import Watch

SAMPLE_S = 0.04  # the eye needs no finer one; flights are stepped finer

Histories = Mapping[str, tuple[CueHistory, ...]]
Notices = Mapping[str, tuple[Notice, ...]]
Grid = NDArray[np.int_]


def notice_all(
    healthy: Flight,
    faulted: Flight,
    watch: Watch,
    height_at: HeightAt,
    last_pull_floor_s: Sequence[float | None] = (),
) -> tuple[Histories, Notices]:
    """Cue histories and notices (early, likely, late) of the lead and every wing, by name.

    Both flights share one even time axis and are the same until the fault. ``height_at``: ground height over
    the field datum. ``last_pull_floor_s``: (K,), for the lateness. Clearances are left None; the study flies
    them. Nothing is noticed before the fault, and nothing after the pilot's own or the lead's contact.
    Raises ValueError where the time axes differ.
    """
    names = faulted.names
    if faulted.fault_s is None:
        return {n: () for n in names}, {n: _never(k, last_pull_floor_s) for k, n in enumerate(names)}
    if healthy.time_s.shape != faulted.time_s.shape or np.any(healthy.time_s != faulted.time_s):
        raise ValueError("healthy and faulted flights need one time axis")
    grid = _grid(faulted.time_s, faulted.fault_s)
    coarse = faulted.time_s[grid]
    # By the lead's wing, which is level even where the path stands upright.
    wing_e = quat_rotate(faulted.quat_eb[0, 0], np.array([0.0, 1.0, 0.0]))
    display_line = float(np.arctan2(wing_e[1], wing_e[0]) - np.pi / 2.0)
    histories: dict[str, tuple[CueHistory, ...]] = {}
    notices: dict[str, tuple[Notice, ...]] = {}
    called = np.full(len(OBSERVERS), np.inf)
    for k, name in enumerate(names):
        counts = counting(coarse, healthy, faulted, k)
        if k == 0:
            h, f = healthy, faulted
            evidence = lead_evidence(
                h.load_factor[grid, 0], f.load_factor[grid, 0],
                h.load_factor_demand[grid, 0], f.load_factor_demand[grid, 0],
                h.stick_force_n[grid, 0], f.stick_force_n[grid, 0], coarse, counts,
            )  # fmt: skip
        else:
            seats = seat(healthy, k, grid), seat(faulted, k, grid)
            evidence = wing_evidence(*seats, coarse, counts, watch, height_at, display_line, called)
        when, leading = first_notice(coarse, evidence)
        if k == 0:
            called = when
        pull_s = last_pull_floor_s[k] if k < len(last_pull_floor_s) else None
        notices[name] = tuple(
            _notice(o, float(t), evidence.names[i], pull_s) for o, t, i in zip(OBSERVERS, when, leading, strict=True)
        )
        histories[name] = _shown(evidence, healthy, faulted, k, grid)
    return histories, notices


def counting(time_s: NDArray[np.float64], healthy: Flight, faulted: Flight, k: int) -> Mask:
    """Instants that count for aircraft k, bool: after the fault, before its own and the lead's contact."""
    ends = [faulted.contact_s[k], faulted.contact_s[0], healthy.contact_s[k], healthy.contact_s[0]]
    end_s = min((e for e in ends if e is not None), default=np.inf)
    fault_s = np.inf if faulted.fault_s is None else faulted.fault_s
    return np.asarray((time_s > fault_s) & (time_s < end_s))


def seat(flight: Flight, k: int, grid: Grid | slice = slice(None)) -> c.Seat:
    """What the pilot of aircraft k has at the instants of a grid."""
    lead, own = flight.airframes[0], flight.airframes[k]
    eye = eye_position(flight.pos_e_m[grid, 0], flight.quat_eb[grid, 0], lead.eye_forward_m, lead.eye_up_m)
    return c.Seat(
        flight.pos_e_m[grid, k], flight.vel_e_mps[grid, k], flight.quat_eb[grid, k], flight.rate_b_radps[grid, k],
        flight.load_factor[grid, k], flight.cas_mps[grid, k], flight.height_m[grid, k],
        own.eye_forward_m, own.eye_up_m, eye if k else None,
    )  # fmt: skip


def _grid(time_s: NDArray[np.float64], fault_s: float) -> Grid:
    """Indices of the samples worked on: about every 0.04 s from the last one before the fault on."""
    step = float(time_s[1] - time_s[0])
    start = max(int(np.searchsorted(time_s, fault_s, side="right")) - 1, 0)
    every = max(1, round(SAMPLE_S / step))
    # At least two samples, for the step; a fault in the last instant shows nothing anyway.
    return np.arange(min(start, max(time_s.size - 1 - every, 0)), time_s.size, every)


def _shown(evidence: Evidence, healthy: Flight, faulted: Flight, k: int, grid: Grid) -> tuple[CueHistory, ...]:
    """Histories on the flight's own time axis: zero up to the fault and from contact on."""
    time_s, coarse = faulted.time_s, faulted.time_s[grid]
    counts = counting(time_s, healthy, faulted, k)
    made = []
    for i, name in enumerate(evidence.names):
        difference = np.where(counts, np.interp(time_s, coarse, evidence.difference[i]), 0.0)
        sigma = {o: np.interp(time_s, coarse, evidence.sigma[i, j]) for j, o in enumerate(OBSERVERS)}
        made.append(CueHistory(name, difference, c.UNITS[name], sigma, source(name)))
    return tuple(made)


def _notice(observer: str, when_s: float, cue: str | None, last_pull_s: float | None) -> Notice:
    reaction = TABLE[observer].reaction.value
    if not np.isfinite(when_s):
        return Notice(observer, None, None, reaction, None, None, None)
    late = None if last_pull_s is None else when_s + reaction - last_pull_s
    return Notice(observer, when_s, cue, reaction, late, None, None)


def _never(k: int, last_pull_s: Sequence[float | None]) -> tuple[Notice, ...]:
    return tuple(_notice(o, np.inf, None, last_pull_s[k] if k < len(last_pull_s) else None) for o in OBSERVERS)
