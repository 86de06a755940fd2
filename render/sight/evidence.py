"""All cues of one pilot against the noise of the three observers, ready for a detector; for one flight or thousands.

Leading axes (...) are free: none for one flight, (B,) for a batch on one time axis or each on its own. Work it in
chunks: a view takes about 12 kB per instant and case.
"""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np

from render.frames import Array
from render.sight import cues as c
from render.sight import detect
from render.sight.geometry import HeightAt, Mask
from render.sight.looks import eyes_inside, last_read
from render.sight.observers import TABLE, TECHNIQUE, VISUAL, effective_sigma
from render.types import OBSERVERS
from scenes.model import Watch

UNHEARD = 1e9  # noise before a call: nothing to hear


@dataclass(frozen=True, slots=True, eq=False)
class Evidence:
    """C cues of one pilot: difference (..., C, T), sigma (..., C, 3, T) for the three observers."""

    names: tuple[str, ...]
    difference: Array
    sigma: Array
    technique: Array  # (..., C, T) the part of sigma that is scatter from flight to flight
    there: Mask  # (..., C, T) where the cue can be had at all
    time_to_ground_s: Array  # (..., T) first order; infinity for the lead, whose cues are not of the ground


def wing_evidence(
    healthy: c.Seat,
    faulted: c.Seat,
    time_s: Array,
    counts: Mask,
    watch: Watch,
    height_at: HeightAt,
    display_line_rad: float | Array,
    called_s: Array | None = None,
    healthy_view: c.View | None = None,
) -> Evidence:
    """What a wing pilot has to go by. The healthy seat may lack the batch axis: one twin for many faults.

    time_s: even, (T,) or (..., T), all of one step; counts: (..., T), true between the fault and contact;
    display_line_rad: the azimuth the ground patches are laid about; called_s: (..., 3), when the lead's three
    observers notice (infinity: never).
    healthy_view: its view if it is at hand already, to save half the work.
    """
    step = _step_s(time_s)
    if healthy_view is None:
        healthy_view = c.view(healthy, height_at, display_line_rad, watch.look_at)
    faulted_view = c.view(faulted, height_at, display_line_rad, watch.look_at)
    found = c.visual_cues(healthy_view, faulted_view)
    found = _late(found | c.felt_cues(healthy, faulted, step), step)
    if watch.gauges_every_s is not None:
        outside = ~eyes_inside(time_s, watch)
        for name in VISUAL:
            cue = found[name]
            found[name] = replace(cue, difference=cue.difference * outside, there=cue.there & outside)
        found["gauge"] = c.Cue(last_read(time_s, c.gauge_reading(healthy, faulted), watch))
    ready = _ready(found, counts, faulted_view.time_to_ground_s)
    if called_s is not None and watch.call_after_s is not None:
        ready = _with_call(ready, time_s, called_s + watch.call_after_s, counts)
    return ready


def lead_evidence(
    load_h: Array, load_f: Array, demand_h: Array, demand_f: Array, force_h_n: Array, force_f_n: Array,
    time_s: Array, counts: Mask,
) -> Evidence:  # fmt: skip
    """What the lead has to go by: load and stick force, healthy and faulted, (..., T)."""
    found = c.lead_cues(load_h, load_f, demand_h, demand_f, force_h_n, force_f_n)
    return _ready(_late(found, _step_s(time_s)), counts, np.full(load_f.shape, np.inf))


def first_notice(time_s: Array, evidence: Evidence) -> tuple[Array, Array]:
    """Detector A: earliest time over the cues (infinity: never) and index of the leading cue, both (..., 3).

    Independent channels race (6.4, the conservative rule). Of cues at the same instant the first listed leads.
    To the microsecond: the last bits depend on how many flights are looked at together, and a map shall be the same
    for any size of its chunks.
    """
    when = detect.notice(time_s, evidence.difference[..., :, None, :], evidence.sigma)  # (..., C, 3)
    when = np.round(when, 6)
    return np.min(when, axis=-2), np.argmin(when, axis=-2)


def _step_s(time_s: Array) -> float:
    first, second = np.ravel(time_s)[:2]
    return float(second - first)


def _late(found: dict[str, c.Cue], step_s: float) -> dict[str, c.Cue]:
    """Each cue by its delay later."""
    return {
        name: replace(cue, difference=detect.delayed(cue.difference, step_s, c.delay_of(name)))
        for name, cue in found.items()
    }


def _ready(found: dict[str, c.Cue], counts: Mask, time_to_ground_s: Array) -> Evidence:
    difference = np.stack([cue.difference * counts for cue in found.values()], axis=-2)
    shape = difference.shape[:-2] + difference.shape[-1:]
    sigma = [
        np.stack([
            np.broadcast_to(
                effective_sigma(name, TABLE[o], cue.eccentricity_rad, cue.widening, cue.scatter), shape
            )
            for o in OBSERVERS
        ], axis=-2)
        for name, cue in found.items()
    ]  # fmt: skip
    there = np.stack([np.broadcast_to(cue.there & counts, shape) for cue in found.values()], axis=-2)
    technique = np.stack([
        np.broadcast_to(np.maximum(TECHNIQUE[name].value, cue.scatter), shape) for name, cue in found.items()
    ], axis=-2)  # fmt: skip
    return Evidence(tuple(found), difference, np.stack(sigma, axis=-3), technique, there, time_to_ground_s)


def _with_call(ready: Evidence, time_s: Array, heard_s: Array, counts: Mask) -> Evidence:
    """Add the lead's call: each observer hears it when the same sort of observer in the lead would have spoken.

    The dwell of the detector stands for the time it takes to understand it.
    """
    earliest = np.min(heard_s, axis=-1)[..., None]
    difference = np.where(time_s >= earliest, 1.0, 0.0) * counts
    noise = np.array([float(effective_sigma("call", TABLE[o], None)) for o in OBSERVERS])
    sigma = np.where(time_s >= heard_s[..., None], noise[:, None], UNHEARD)
    return Evidence(
        (*ready.names, "call"),
        np.concatenate([ready.difference, difference[..., None, :]], axis=-2),
        np.concatenate([ready.sigma, sigma[..., None, :, :]], axis=-3),
        np.concatenate([ready.technique, np.zeros_like(difference)[..., None, :]], axis=-2),
        np.concatenate([ready.there, np.broadcast_to(counts, difference.shape)[..., None, :]], axis=-2),
        ready.time_to_ground_s,
    )
