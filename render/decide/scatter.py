"""A team's passes, no two alike: how they spread at the gates, and in how many of them he would have known in time."""

from __future__ import annotations

from collections.abc import Callable, Mapping
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray
from scipy import stats

from render.decide.cases import GATE_COLUMNS, GATES, Cases
from render.decide.known import LIKELY
from render.decide.passes import COMMON, OWN, Draws, draw, reaction_s
from render.decide.scatter_work import CHUNK, PassWork, fly_passes, prepare
from render.errors import LatepullError
from render.frames import Array
from render.types import OBSERVERS, freeze_arrays
from scenes.airframe import Airframe
from scenes.model import Scatter, Scene
from terrain.ground import Ground

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
    measured: bool = False, technique: bool = True, chunk: int = CHUNK,
) -> ScatterStudy:
    """Fly so many passes of a scene with a team's scatter, here. The same for a seed, whatever the chunk.

    measured: the scatter comes from recordings, so that the technique it shows takes the place of the guesses;
    technique: whether it is worked out at all (otherwise the table's guesses stand). Raises LatepullError for a
    scene without a fault or without wings, or if no pass can be flown.
    """
    work = prepare(scene, scatter, airframe_of, ground, seed, measured=measured, technique=technique)
    return sum_up(work, *fly_passes(work, passes, chunk=chunk))


def sum_up(work: PassWork, cases: Cases, known_s: Array) -> ScatterStudy:
    """The study of passes that were flown: cases (N), when each wing pilot knew (N, S).

    Raises LatepullError if none could be flown.
    """
    scene = work.common.scene
    flown = np.flatnonzero(cases.flown)
    if flown.size == 0:
        raise LatepullError(f"no pass of '{scene.name}' could be flown with this scatter: {cases.error[0]}")
    draws = draw(len(cases), len(scene.formation), work.seed)
    slots = tuple(_slot(k, work, cases, known_s[:, k], flown, draws) for k in range(len(scene.formation)))
    bottom = cases.gates[flown][:, GATES.index("bottom"), GATE_COLUMNS.index("height_m")]
    return ScatterStudy(
        scene, work.scatter, work.measured, work.seed, len(cases), tuple(e for e in cases.error if e is not None),
        cases.gates[flown], share(int(np.sum(bottom <= 0.0)), flown.size), slots,
    )


def _slot(
    k: int, work: PassWork, cases: Cases, known_s: Array, flown: NDArray[np.int_], draws: Draws
) -> SlotScatter:
    """One slot's figures, over the passes that were flown."""
    own = draws.own[:, k]
    reaction = reaction_s(LIKELY.reaction.value, work.scatter.reaction, own[:, OWN.index("reaction")])
    floor, ground = (np.where(np.isnan(v[:, k]), np.inf, v[:, k]) for v in
                     (cases.last_pull_floor_s, cases.last_pull_ground_s))
    acts = known_s + reaction
    with np.errstate(invalid="ignore"):
        in_hand = np.where(np.isinf(floor), np.inf, floor - acts)[flown]
    by_itself = np.isinf(floor[flown])
    n = flown.size
    hits = np.isfinite(cases.contact_s[flown, k + 1])
    with np.errstate(invalid="ignore"):
        late = cases.lateness_s[flown, k]
    early, likely, last = (share(int(np.sum(by_itself | (late[:, o] <= 0.0))), n) for o in range(len(OBSERVERS)))
    return SlotScatter(
        work.common.scene.formation[k].name, share(int(np.sum(by_itself)), n),
        share(int(np.sum(~by_itself & (in_hand >= 0.0))), n), share(int(np.sum(in_hand < 0.0)), n),
        share(int(np.sum(hits & (acts > ground)[flown])), n), share(int(np.sum(hits)), n), (early, likely, last),
        in_hand, work.false_alarms[k], work.bound[k], dict(work.technique[k]),
        _influences(in_hand, draws.common[flown], own[flown], work.scatter),
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
