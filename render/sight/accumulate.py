"""Detector B: a leaky accumulator over the technique scatter (section 6.3 of NOTICING.md).

It answers "in how many of 100 passes would he have known in time", which detector A can't. Each pass draws
one technique offset per cue (never averaged away), a lapse, and noise; evidence gathers as

    dx = (-x / tau_L + d) dt + dW,  x >= 0,    d = max over cues of max(0, |D| - 1.75 sigma_tech) / (W K / g)

and he knows when x reaches the bound. The bound is set so that the healthy twin, flown with the same scatter,
raises at most 2 % false alarms a pass; their rate on fresh passes is given beside every result.

Unlike detector A it doesn't order the observers by construction: a finer sense alarms sooner on technique too,
so its bound is higher. The form is published (Markkula et al 2021, Nesti et al 2017); tau_L is a guess, and
so is the scatter.
"""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from render.frames import Array
from render.sight.evidence import Evidence
from render.sight.geometry import Mask
from render.sight.observers import TABLE, VISUAL, Observer

LEAK_S = 1.0  # guess
DEAD_SIGMAS = 1.75  # 6.3
FALSE_ALARMS = 0.02  # 6.3
LAPSE_ENDS_S = 2.0  # section 8: peripheral cues off until time to contact < 2 s
CALIBRATION_PASSES = 10_000  # the bound rests on the highest 200 of them


@dataclass(frozen=True, slots=True, eq=False)
class Passes:
    """Many passes of one scene, one observer: when he knew, (N,), infinity where never."""

    time_s: Array
    bound: float
    false_alarms: float  # share of fresh healthy passes that reach the bound


def known_times(
    time_s: Array,
    faulted: Evidence,
    healthy_time_s: Array,
    healthy: Evidence,
    observer: str = "likely",
    passes: int = 500,
    seed: int = 1,
) -> Passes:
    """When he knew, in each of many passes; evidence of one flight (no leading axis).

    ``healthy``: the twin against itself (all differences zero), over the whole pass; both time axes (T,) even
    and of one step. Seeded and reproducible.
    """
    who = TABLE[observer]
    draws = np.random.default_rng(np.random.SeedSequence([seed, 0]))
    bound = bound_for(np.max(_run(healthy_time_s, healthy, who, CALIBRATION_PASSES, draws), axis=-1))
    fresh = np.random.default_rng(np.random.SeedSequence([seed, 1]))
    alarms = np.max(_run(healthy_time_s, healthy, who, CALIBRATION_PASSES, fresh), axis=-1) >= bound
    flown = np.random.default_rng(np.random.SeedSequence([seed, 2]))
    gathered = _run(time_s, faulted, who, passes, flown)
    return Passes(first_reach(time_s, gathered, bound), bound, float(np.mean(alarms)))


def bound_for(peaks: Array, rate: float = FALSE_ALARMS) -> float:
    """The least bound that at most this share of healthy peaks (N,) reach."""
    ordered = np.sort(peaks)[::-1]
    return float(np.nextafter(ordered[int(np.floor(rate * ordered.size))], np.inf))


def first_reach(time_s: Array, gathered: Array, bound: float) -> Array:
    """When the evidence (..., T) first reaches the bound, (...); infinity if never."""
    reached = gathered >= bound
    return np.where(np.any(reached, axis=-1), time_s[np.argmax(reached, axis=-1)], np.inf)


def drive(difference: Array, sensory: Array, technique: Array, offset: Array, there: Mask) -> Array:
    """The rate d at which evidence comes in, (N, T), per square root of a second.

    difference, sensory, technique: (C, T); offset: (N, C) of the pass, in sigmas; there: (N, C, T) or
    broadcastable, false where a cue can't be had (eyes inside, lapse, outside the flight). The largest
    cue counts (6.4).
    """
    seen = np.abs(difference + offset[:, :, None] * technique) - DEAD_SIGMAS * technique
    return np.asarray(np.max(np.maximum(seen, 0.0) / sensory * there, axis=1))


def accumulate(drive_: Array, step_s: float, noise: Array, leak_s: float = LEAK_S) -> Array:
    """Evidence x (..., T) behind a drive (..., T) and unit normal noise (..., T), starting at 0.

    Exact for a constant drive over a step without noise; the noise enters with its variance over a step.
    """
    keep = np.exp(-step_s / leak_s)
    gain, spread = leak_s * (1.0 - keep), np.sqrt(0.5 * leak_s * (1.0 - keep**2))
    x = np.empty_like(drive_)
    now = np.zeros(drive_.shape[:-1])
    # The floor at zero makes this a loop; the passes go through it side by side.
    for i in range(drive_.shape[-1]):
        now = np.maximum(keep * now + gain * drive_[..., i] + spread * noise[..., i], 0.0)
        x[..., i] = now
    return x


def _run(time_s: Array, evidence: Evidence, who: Observer, passes: int, draws: np.random.Generator) -> Array:
    names = evidence.names
    column = list(TABLE).index(who.name)
    technique = evidence.technique
    # What is left of the effective noise without technique: the sense alone.
    sensory = np.sqrt(evidence.sigma[:, column] ** 2 - technique**2)
    # The eye sees the lead move by an arcminute; what it is worth is set by how he is followed (1.51:
    # sigma = max(eye, technique)). Without this the hair's breadth beyond the dead zone would drive everything.
    followed = np.array([n == "lead" for n in names])[:, None]
    sensory = np.where(followed, np.maximum(sensory, technique), sensory)
    offset = draws.normal(size=(passes, len(names)))
    lapses = draws.random(passes) < who.lapse.value
    noise = draws.normal(size=(passes, time_s.size))
    peripheral = np.array([n in VISUAL and n != "lead" for n in names])
    late = evidence.time_to_ground_s > LAPSE_ENDS_S  # (T,)
    gathered = np.empty((passes, time_s.size))
    step_s = float(time_s[1] - time_s[0])
    for at in range(0, passes, 250):  # in chunks: (250, C, T) at a time
        part = slice(at, min(at + 250, passes))
        shut = lapses[part, None, None] & peripheral[:, None] & late
        flow_in = drive(evidence.difference, sensory, technique, offset[part], evidence.there & ~shut)
        gathered[part] = accumulate(flow_in, step_s, noise[part])
    return gathered
