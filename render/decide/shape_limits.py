"""Loops held against their limits: closed at the base, flown by the lead alone, measured over the back half."""

from __future__ import annotations

import dataclasses
from collections.abc import Sequence
from dataclasses import dataclass

import numpy as np

from render.decide.brief import VERTICAL_DOWN, bottoms, compile_brief, lead_only
from render.decide.case_flights import compile_cases, shape_key
from render.decide.shape import TOP_RAD, Job
from render.errors import FlightError, LatepullError
from render.flight import records as r
from render.flight import script as s
from render.flight.closing import close_each, close_loops
from render.flight.inside import begin_at, crossing, demanding, fly_far
from render.flight.plan import DT_S, Plan
from render.frames import Array
from scenes.model import DEG, Scene

SAMPLES_RAD = np.arange(180.0, 346.0, 15.0) * DEG  # where the demand's slope and bend are measured
ONSET_OVER = max(1, round(0.2 / DT_S))  # steps over which an onset is measured
SLACK = 1e-6


@dataclass(frozen=True, slots=True)
class Limits:
    """What the back half has to keep."""

    load_factor: float  # greatest, flown
    onset_gps: float  # greatest change of the flown load factor, g per second, up or down
    slope_gprad: float  # greatest change of the demand over loop angle, between angles 15 deg apart
    bend_gprad2: float  # greatest change of that slope
    buffet: float = 1.0  # greatest lift, as a part of where buffet begins


@dataclass(frozen=True, slots=True)
class Pull:
    """What a back half shows when the lead flies it; why it can't, if it can't."""

    scale: float  # of the demand, so that it closes
    load_factor: float
    onset_gps: float
    slope_gprad: float
    bend_gprad2: float
    buffet: float
    speed_max_mps: float  # calibrated, on the way down
    down_height_m: float  # at vertical down, above the field
    down_cas_mps: float
    angle_rad: tuple[float, ...] = ()  # of the samples
    flown_load: tuple[float, ...] = ()
    lift: tuple[float, ...] = ()  # as a part of that where buffet begins
    demand: tuple[float, ...] = ()  # at SAMPLES_RAD
    error: str | None = None

    def excess(self, limits: Limits) -> float:
        """How far it is beyond its limits, relative, all of them added; 0 within them; infinity if not flown."""
        if self.error is not None:
            return np.inf
        return float(sum(
            max(getattr(self, f.name) / getattr(limits, f.name) - 1.0 - SLACK, 0.0) for f in dataclasses.fields(limits)
        ))


    def parts(self, limits: Limits) -> Array:
        """What the limits are set to as parts of them, sample by sample, (L,); empty if not flown.

        Nothing beyond 1 is within the limits but for what lies between samples.
        """
        if self.error is not None:
            return np.array([])
        slope = np.diff(self.demand) / np.diff(SAMPLES_RAD) / limits.slope_gprad
        bend = np.diff(slope) / (SAMPLES_RAD[1] - SAMPLES_RAD[0]) * limits.slope_gprad / limits.bend_gprad2
        return np.concatenate([
            np.array(self.flown_load) / limits.load_factor, np.array(self.lift) / limits.buffet, slope, -slope,
            bend, -bend, [self.load_factor / limits.load_factor, self.buffet / limits.buffet,
                          self.onset_gps / limits.onset_gps],
        ])


NOT_FLOWN = (np.nan,) * 8


def measure_pulls(job: Job, scenes: Sequence[Scene]) -> list[Pull]:
    """Close and fly each scene's loop, the lead alone over a ground far below, and measure its back half."""
    errors: dict[int, str] = {}
    alone = [dataclasses.replace(scene, formation=()) for scene in scenes]
    out: dict[int, Pull] = {}
    groups: dict[object, list[tuple[int, Plan]]] = {}
    for i, plan, _ in compile_cases(alone, job.airframe_of, errors):
        groups.setdefault(shape_key(plan, None), []).append((i, plan))
    for group in groups.values():
        plans = [plan for _, plan in group]
        longest_s = max(p.longest_s for p in plans)
        scale, why = close_each(plans, longest_s)
        raw = fly_far(plans, scale, longest_s)
        for b, (i, plan) in enumerate(group):
            reason = why[b]
            if reason is not None:
                errors[i] = reason
                continue
            try:
                out[i] = _measure(job, plan, raw, b, float(scale[b]))
            except FlightError as exc:
                errors[i] = str(exc)
    return [out[i] if i in out else Pull(*NOT_FLOWN[:1], *NOT_FLOWN[1:], np.nan, error=errors.get(i, "not flown"))
            for i in range(len(scenes))]


def _measure(job: Job, plan: Plan, raw: object, b: int, scale: float) -> Pull:
    from render.flight.batch import Raw

    assert isinstance(raw, Raw)
    a, y = raw.a[b, :, 0], raw.y[b, :, 0]
    if raw.status[b, 0, 0] != r.OK:
        raise FlightError(f"the loop of '{plan.scene.name}' leaves the model's range on its way")
    rows = np.flatnonzero((a[:, r.A_STEP] == job.loop) & (a[:, r.A_LOOP] >= TOP_RAD))
    if rows.size < 2 * ONSET_OVER or raw.mem[b, s.M_SCRIPT_END_S] < 0.0:
        raise FlightError(f"the loop of '{plan.scene.name}' is not flown to its end")
    load, angle = a[rows, r.A_N], a[rows, r.A_LOOP]
    demand = np.interp(SAMPLES_RAD, angle, a[rows, r.A_NCMD])
    slope = np.diff(demand) / np.diff(SAMPLES_RAD)
    onset = np.abs(load[ONSET_OVER:] - load[:-ONSET_OVER]) / (ONSET_OVER * DT_S)
    af = plan.airframes[0]
    lift = af.lift_slope * (y[rows, r.ALPHA] - af.alpha_zero_rad) / af.cl_buffet
    down = crossing(plan, raw, b, VERTICAL_DOWN)
    shown = np.arange(180.0, 358.0, 2.0) * DEG
    return Pull(
        scale, float(load.max()), float(onset.max()), float(np.abs(slope).max()),
        float(np.abs(np.diff(slope)).max() / (SAMPLES_RAD[1] - SAMPLES_RAD[0])), float(lift.max()),
        float(a[rows, r.A_CAS].max()), down.height_m, down.cas_mps, tuple(float(x) for x in shown),
        tuple(float(x) for x in np.interp(shown, angle, load)), tuple(float(x) for x in np.interp(shown, angle, lift)),
        tuple(float(x) for x in demand),
    )


def own_limits(pull: Pull, *, load_factor: float | None = None, onset_gps: float | None = None,
               slope_gprad: float | None = None, bend_gprad2: float | None = None) -> Limits:
    """Limits as given; those not given are what the scene's own loop already asks of its formation."""
    return Limits(
        pull.load_factor if load_factor is None else load_factor,
        pull.onset_gps if onset_gps is None else onset_gps,
        pull.slope_gprad if slope_gprad is None else slope_gprad,
        pull.bend_gprad2 if bend_gprad2 is None else bend_gprad2,
        max(1.0, pull.buffet),
    )


def least_load_factor(job: Job, most: float) -> float:
    """Load factor that closes the loop when it is pulled all the way from the top, to 0.01 g.

    Raises LatepullError if ``most`` doesn't close it either.
    """
    plan = lead_only(compile_brief(job.scene, job.airframe_of))
    scale = close_loops([plan], plan.longest_s)
    top = crossing(plan, fly_far([plan], scale, plan.longest_s), 0, TOP_RAD)
    from render.decide.brief import base_of

    base_m = base_of(job.scene)

    def miss(loads: Array) -> Array:
        begun = [demanding(begin_at(plan, top), float(n)) for n in loads]
        low = bottoms(begun, fly_far(begun, np.ones(len(loads)), 60.0))
        missed: Array = np.where(np.isnan(low), -np.inf, low) - base_m
        return missed

    loads = np.linspace(1.5, most, 24)
    missed = miss(loads)
    if missed[-1] < 0.0:
        low = f"{(missed[-1] + base_m) / 0.3048:.0f} ft" if np.isfinite(missed[-1]) else "far below the field"
        raise LatepullError(
            f"--max-g: read {most:.2f} g, and the loop of '{job.scene.name}' can't close at {base_m / 0.3048:.0f} ft "
            f"with it: pulled at {most:.2f} g all the way from the top, short of buffet, it bottoms at {low}"
        )
    fails = np.flatnonzero(missed < 0.0)
    if fails.size == 0:
        return float(loads[0])
    lo, hi = loads[fails[-1]], loads[fails[-1] + 1]
    fine = np.arange(lo, hi + 0.01, 0.01)
    fine = fine[fine <= most]
    holds = np.flatnonzero(miss(fine) >= 0.0)
    return float(fine[holds[0]]) if holds.size else float(hi)
