"""A team's passes, no two alike: how they spread at the gates, and in how many of them he would have known in time."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from render.decide.cases import GATE_COLUMNS, GATES, Cases, work_cases
from render.decide.known import LIKELY, PassEvidence, calibrate, known_in_passes, with_technique
from render.decide.passes import COMMON, OWN, draw, pass_scenes, reaction_s
from render.decide.technique import healthy_evidence, technique_scatter
from render.errors import LatepullError
from render.frames import Array
from render.sight.evidence import Evidence
from render.types import OBSERVERS, freeze_arrays
from scenes.airframe import Airframe
from scenes.model import Scatter, Scene
from terrain.ground import Ground

TECHNIQUE_PASSES = 60  # healthy passes that a team's technique scatter is taken from
CONFIDENCE = 0.95


@dataclass(frozen=True, slots=True)
class Share:
    """So many of so many, with the interval that holds the true share in 95 of 100 studies (Clopper-Pearson)."""

    count: int
    of: int
    low: float
    high: float

    @property
    def per_100(self) -> float:
        """In how many of 100."""
        return 100.0 * self.count / self.of if self.of else float("nan")


def share(count: int, of: int) -> Share:
    """A count with its interval: exact binomial, SciPy's ``binomtest``."""
    if of == 0:
        return Share(0, 0, 0.0, 1.0)
    interval = stats.binomtest(count, of).proportion_ci(CONFIDENCE, method="exact")
    return Share(count, of, float(interval.low), float(interval.high))


@dataclass(frozen=True, slots=True)
class Influence:
    """How an input goes with what is left: rank correlation (Spearman), and its 95 % interval (Fisher)."""

    name: str
    rank: float
    low: float
    high: float


@dataclass(frozen=True, slots=True, eq=False)
class SlotScatter:
    """One wing pilot over N passes that could be flown."""

    slot: str
    by_itself: Share  # stays above the floor whatever he does
    in_time: Share  # needs to act, and his hand moves before the last pull
    too_late: Share
    contact_acting: Share  # meets the ground although he breaks out when he knows
    contact_idle: Share  # meets the ground if nobody acts
    observers_in_time: tuple[Share, Share, Share]  # detector A, early, likely, late: by itself or in time
    in_hand_s: Array  # (N,) infinity by itself, minus infinity never known
    false_alarms: float  # share of healthy passes in which he thinks something is wrong
    bound: float
    technique: Mapping[str, float]  # cue -> one sigma used in place of, or beside, the table's
    influences: tuple[Influence, ...]  # largest first

    def __post_init__(self) -> None:
        freeze_arrays(self)


@dataclass(frozen=True, slots=True, eq=False)
class ScatterStudy:
    """N passes asked for, some of which may not be flown."""

    scene: Scene
    scatter: Scatter
    measured: bool  # the scatter is from recordings
    seed: int
    passes: int
    not_flown: tuple[str, ...]  # why, for each that could not be
    gates: Array  # (N, 5, 4) GATES x GATE_COLUMNS, of the flown passes without their fault
    contact_healthy: Share  # passes that meet the ground with nothing failing
    slots: tuple[SlotScatter, ...]

    def __post_init__(self) -> None:
        freeze_arrays(self)


def study_scatter(
    scene: Scene, scatter: Scatter, airframe_of: Callable[[str], Airframe], ground: Ground, *, passes: int, seed: int,
    measured: bool = False, chunk: int = 64, count: Callable[[int], None] | None = None, technique: bool = True,
) -> ScatterStudy:
    """Fly so many passes of a scene with a team's scatter. The same for a seed, whatever the chunk.

    measured: the scatter comes from recordings, so that the technique it shows takes the place of the guesses;
    technique: whether it is worked out at all (otherwise the table's guesses stand). Raises LatepullError for a
    scene without a fault or without wings, or if no pass can be flown.
    """
    if scene.briefed is not None or scene.fault is None:
        raise LatepullError(f"'{scene.name}' has no fault: a scatter study asks in how many passes one is known "
                            "in time")
    if not scene.formation:
        raise LatepullError(f"'{scene.name}' has no wing pilots")
    draws = draw(passes, len(scene.formation), seed)
    kept: dict[tuple[int, int], PassEvidence] = {}

    def sink(case: int, aircraft: int, time_s: Array, evidence: Evidence) -> None:
        if aircraft > 0:
            kept[case, aircraft - 1] = _trimmed(time_s, evidence)

    nominal = work_cases([scene], airframe_of, ground)
    if nominal.error[0] is not None:
        raise LatepullError(nominal.error[0])
    scenes = pass_scenes(scene, scatter, draws)
    cases = _work(scenes, airframe_of, ground, chunk, sink, count)
    flown = np.flatnonzero(cases.flown)
    if flown.size == 0:
        raise LatepullError(f"no pass of '{scene.name}' could be flown with this scatter: {cases.error[0]}")
    own: tuple[dict[str, float], ...] = tuple({} for _ in scene.formation)
    if technique and scatter != Scatter():
        some = flown[:TECHNIQUE_PASSES]
        own = technique_scatter(scene, float(nominal.loop_scale[0]), [scenes[int(i)] for i in some],
                                cases.loop_scale[some], float(nominal.fault_s[0]), airframe_of, ground)
    healthy = healthy_evidence(scene, float(nominal.loop_scale[0]), airframe_of, ground)
    slots = tuple(
        _slot(k, scene, scatter, cases, flown, draws.common, draws.own[:, k], kept, own[k], healthy[k], seed, measured)
        for k in range(len(scene.formation))
    )
    bottom = cases.gates[flown][:, GATES.index("bottom"), GATE_COLUMNS.index("height_m")]
    return ScatterStudy(
        scene, scatter, measured, seed, passes, tuple(e for e in cases.error if e is not None),
        cases.gates[flown], share(int(np.sum(bottom <= 0.0)), flown.size), slots,
    )


def _work(
    scenes: list[Scene], airframe_of: Callable[[str], Airframe], ground: Ground, chunk: int,
    sink: Callable[[int, int, Array, Evidence], None], count: Callable[[int], None] | None,
) -> Cases:
    last = 0

    def progress(done: int, _: int) -> None:
        nonlocal last
        if count is not None:
            count(done - last)
        last = done

    return work_cases(scenes, airframe_of, ground, chunk=chunk, progress=progress, sink=sink)


def _trimmed(time_s: Array, e: Evidence) -> PassEvidence:
    """Evidence up to the last instant at which any cue can be had, so that it doesn't depend on its chunk."""
    any_there = np.flatnonzero(np.any(e.there, axis=0))
    n = int(any_there[-1]) + 1 if any_there.size else 0
    return PassEvidence(time_s[:n].copy(), Evidence(
        e.names, e.difference[:, :n].copy(), e.sigma[..., :n].copy(), e.technique[:, :n].copy(),
        e.there[:, :n].copy(), e.time_to_ground_s[:n].copy()))


def _slot(
    k: int, scene: Scene, scatter: Scatter, cases: Cases, flown: NDArray[np.int_], common: Array, own: Array,
    kept: Mapping[tuple[int, int], PassEvidence], technique: Mapping[str, float], healthy: tuple[Array, Evidence],
    seed: int, measured: bool,
) -> SlotScatter:
    """One slot's figures, over the passes that were flown."""
    def mine(e: Evidence) -> Evidence:
        return with_technique(e, technique, measured=measured)

    bound, false_alarms = calibrate(PassEvidence(healthy[0], mine(healthy[1])), seed, k)
    found = [kept.get((int(i), k)) for i in range(len(cases))]
    evidence = [None if p is None else PassEvidence(p.time_s, mine(p.evidence)) for p in found]
    # less attention is more noise
    noise = np.exp(scatter.attention * own[:, OWN.index("attention")])
    known = known_in_passes(evidence, bound, noise, seed, k).time_s
    reaction = reaction_s(LIKELY.reaction.value, scatter.reaction, own[:, OWN.index("reaction")])
    floor, ground = (np.where(np.isnan(v[:, k]), np.inf, v[:, k]) for v in
                     (cases.last_pull_floor_s, cases.last_pull_ground_s))
    with np.errstate(invalid="ignore"):
        in_hand = np.where(np.isinf(floor), np.inf, floor - known - reaction)[flown]
    by_itself = np.isinf(floor[flown])
    n = flown.size
    acts = (known + reaction)[flown]
    hits = np.isfinite(cases.contact_s[flown, k + 1])
    with np.errstate(invalid="ignore"):
        late = cases.lateness_s[flown, k]
    observers = tuple(share(int(np.sum(by_itself | (late[:, o] <= 0.0))), n) for o in range(len(OBSERVERS)))
    return SlotScatter(
        scene.formation[k].name, share(int(np.sum(by_itself)), n),
        share(int(np.sum(~by_itself & (in_hand >= 0.0))), n), share(int(np.sum(in_hand < 0.0)), n),
        share(int(np.sum(hits & (acts > ground[flown]))), n), share(int(np.sum(hits)), n),
        (observers[0], observers[1], observers[2]), in_hand, false_alarms, bound, dict(technique),
        _influences(in_hand, common[flown], own[flown], scatter),
    )


def _influences(in_hand: Array, common: Array, own: Array, scatter: Scatter) -> tuple[Influence, ...]:
    """Rank correlations of what was drawn with what is left, the inputs without spread left out."""
    spread = {
        "entry speed": scatter.entry_speed_mps, "entry height": scatter.entry_height_m,
        "g on the way up": scatter.load_factor, "early pull down": scatter.load_factor, "base height": scatter.base_m,
        "power": scatter.power, "wind north": scatter.wind_mps, "wind east": scatter.wind_mps,
        "place aft": scatter.station_m, "place right": scatter.station_m, "place down": scatter.station_m,
        "attention": scatter.attention, "reaction": scatter.reaction,
    }
    columns = {**{n: common[:, i] for i, n in enumerate(COMMON)}, **{n: own[:, i] for i, n in enumerate(OWN)}}
    out = []
    ranks = stats.rankdata(in_hand)  # infinities rank too
    if len(in_hand) < 10 or np.ptp(ranks) == 0.0:
        return ()
    for name, values in columns.items():
        if spread[name] <= 0.0:
            continue
        # more of what was drawn as attention is more noise, so less attention
        rho = float(stats.spearmanr(-values if name == "attention" else values, ranks).statistic)
        half = stats.norm.ppf(0.5 + CONFIDENCE / 2.0) / np.sqrt(max(len(in_hand) - 3, 1))
        z = np.arctanh(np.clip(rho, -0.9999, 0.9999))
        out.append(Influence(name, rho, float(np.tanh(z - half)), float(np.tanh(z + half))))
    return tuple(sorted(out, key=lambda one: -abs(one.rank)))
