"""Detector B over the passes of a scatter study: when he knew, in each of them.

The accumulator and its calibration are those of ``sight.accumulate``; here every pass has its own flight, so its
own evidence, and each pass its own stream of random numbers.
"""

from __future__ import annotations

from collections.abc import Mapping, Sequence
from dataclasses import dataclass, replace

import numpy as np

from render.frames import Array
from render.sight.accumulate import LAPSE_ENDS_S, accumulate, bound_for, drive, first_reach
from render.sight.evidence import Evidence
from render.sight.observers import TABLE, VISUAL, Observer
from render.types import OBSERVERS

CALIBRATION_PASSES = 4000  # the bound rests on the highest 80 of them
OFF_GAZE = ("flow", "growth", "closing", "lead")  # what attention is for (head of observers.py)
LIKELY = TABLE["likely"]


@dataclass(frozen=True, slots=True, eq=False)
class PassEvidence:
    """What one pass gives one wing pilot; times (T,) from the start of that pass, evidence without leading axis."""

    time_s: Array
    evidence: Evidence


def with_technique(evidence: Evidence, scatter: Mapping[str, float], *, measured: bool) -> Evidence:
    """The evidence with a team's own technique scatter: cue -> one sigma; cues not named keep theirs.

    measured: the team's own takes the place of the guesses; otherwise the larger of the two counts.
    """
    technique = evidence.technique.copy()
    for i, name in enumerate(evidence.names):
        if name in scatter:
            kept = 0.0 if measured else technique[..., i, :]
            technique[..., i, :] = np.maximum(scatter[name], kept)
    sensory2 = np.maximum(evidence.sigma**2 - evidence.technique[..., :, None, :] ** 2, 0.0)
    return replace(evidence, technique=technique, sigma=np.sqrt(sensory2 + technique[..., :, None, :] ** 2))


def sensory_of(evidence: Evidence, who: Observer = LIKELY) -> Array:
    """Noise of the sense alone, (C, T); the lead's as ``accumulate`` has it."""
    column = OBSERVERS.index(who.name)
    sensory = np.sqrt(np.maximum(evidence.sigma[..., column, :] ** 2 - evidence.technique**2, 0.0))
    followed = np.array([n == "lead" for n in evidence.names])[:, None]
    return np.where(followed, np.maximum(sensory, evidence.technique), sensory)


def calibrate(healthy: PassEvidence, seed: int, slot: int, who: Observer = LIKELY) -> tuple[float, float]:
    """The bound that the healthy twin reaches in at most 2 % of passes, and how often fresh passes reach it."""
    peaks = [
        np.concatenate([_healthy_peaks(healthy, who, np.random.default_rng(np.random.SeedSequence([seed, 1, slot, part,
                                                                                                   at])))
                        for at in range(0, CALIBRATION_PASSES, 500)])
        for part in range(2)
    ]
    bound = bound_for(peaks[0])
    return bound, float(np.mean(peaks[1] >= bound))


def _healthy_peaks(healthy: PassEvidence, who: Observer, rng: np.random.Generator, count: int = 500) -> Array:
    e = healthy.evidence
    offset = rng.normal(size=(count, len(e.names)))
    shut = _shut(e, rng.random(count) < who.lapse.value)
    flow_in = drive(e.difference, sensory_of(e, who), e.technique, offset, e.there & ~shut)
    noise = rng.normal(size=(count, healthy.time_s.size))
    peaks: Array = np.max(accumulate(flow_in, _step(healthy.time_s), noise), axis=-1)
    return peaks


def _shut(evidence: Evidence, lapses: np.ndarray) -> np.ndarray:
    """Where a lapse shuts the cues off the gaze, (N, C, T)."""
    peripheral = np.array([n in VISUAL and n != "lead" for n in evidence.names])
    late = evidence.time_to_ground_s > LAPSE_ENDS_S
    return lapses[:, None, None] & peripheral[:, None] & late


def _step(time_s: Array) -> float:
    return float(time_s[1] - time_s[0])


def known_in_passes(
    passes: Sequence[PassEvidence | None], numbers: Sequence[int], bound: float, attention: Array, seed: int, slot: int,
    who: Observer = LIKELY,
) -> Array:
    """When he knew, in each pass, s from its start, (N,): infinity where never or where there is no evidence.

    numbers (N,): which passes of the study they are, each with its own stream of random numbers. attention (N,): by
    what part more or less each pass's noise off the gaze is (1: as the observer's).
    """
    when = np.full(len(passes), np.inf)
    for i, (one, number) in enumerate(zip(passes, numbers, strict=True)):
        if one is None or one.time_s.size < 2:
            continue
        e = one.evidence
        rng = np.random.default_rng(np.random.SeedSequence([seed, 2, slot, number]))
        offset = rng.normal(size=(1, len(e.names)))
        shut = _shut(e, np.array([rng.random() < who.lapse.value]))
        sensory = sensory_of(e, who)
        off = np.array([n in OFF_GAZE for n in e.names])[:, None]
        sensory = np.where(off, sensory * attention[i], sensory)
        flow_in = drive(e.difference, sensory, e.technique, offset, e.there & ~shut)
        gathered = accumulate(flow_in, _step(one.time_s), rng.normal(size=(1, one.time_s.size)))
        when[i] = first_reach(one.time_s, gathered, bound)[0]
    return when
