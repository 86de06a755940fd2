"""The demand over the back half of a loop that leaves the most in the worst case.

The shape of the pull after the top decides how late a freeze of the lead's pitch control shows, and whether it
clears the ground by itself. A candidate is a load factor at a few loop angles; it is closed at the scene's base
height, flown, held against the limits (``shape_limits``), frozen at every freeze point and judged by its worst one.
"""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from render.decide.brief import without_fault
from render.decide.cases import Cases, work_cases
from render.errors import LatepullError
from render.frames import Array
from render.types import freeze_arrays
from scenes.airframe import Airframe
from scenes.model import DEG, Fault, Loop, Point, Scene, Slot
from terrain.ground import Ground

KNOTS_RAD = np.array([195.0, 225.0, 250.0, 270.0, 300.0, 330.0, 350.0]) * DEG
TOP_RAD = 180.0 * DEG
LIKELY = 1
NEVER_S = 30.0  # what a freeze that is never noticed, or can't be flown, counts as in a search, s too late
CLEAR_S = -20.0  # a loop whose every freeze clears the floor by itself lies below any lateness
CLEAR_M_PER_S = 100.0  # and the lower, the more it clears: metres of clearance for each second of the scale
LEAST_LOAD = 0.5  # of the demand searched, g: less would unload a formation over the top (common practice, no source)


@dataclass(frozen=True, slots=True, eq=False)
class Job:
    """What a search is about: the scene as briefed, its loop, what is flown over what."""

    scene: Scene  # without its fault
    loop: int  # step of the script that closes
    airframe_of: Callable[[str], Airframe]
    ground: Ground
    freeze_rad: Array  # (F,) freeze points

    def __post_init__(self) -> None:
        freeze_arrays(self)

    @property
    def knots_rad(self) -> Array:
        """Angles of the demand that is sought, (D,): those before the table's end."""
        step = self.scene.script[self.loop]
        assert isinstance(step, Loop)
        knots: Array = KNOTS_RAD[KNOTS_RAD < max(step.angle_rad[-1], 352.0 * DEG) - 1.0 * DEG]
        return knots


def make_job(
    scene: Scene, airframe_of: Callable[[str], Airframe], ground: Ground, freeze_rad: Array
) -> Job:
    """The search of a scene. Raises LatepullError: no loop, or none that closes at a height."""
    briefed = without_fault(scene)
    loops = [i for i, step in enumerate(briefed.script) if isinstance(step, Loop)]
    if not loops:
        raise LatepullError(f"{scene.source or scene.name}: read a script without a loop, wanted one: shape seeks the "
                            "pull over the back half of a loop")
    closing = [i for i in loops if _loop(briefed, i).close_at_m is not None]
    if not closing:
        raise LatepullError(f"{scene.source or scene.name}: script.{loops[0]}.loop: read no close_at, wanted the "
                            "height at which every pull that is tried has to close, such as close_at: 300 ft")
    if closing[0] != loops[0]:
        raise LatepullError(f"{scene.source or scene.name}: script.{closing[0]}.loop: shape seeks the pull of the "
                            "first loop, and that has no close_at")
    return Job(briefed, loops[0], airframe_of, ground, freeze_rad.copy())


def _loop(scene: Scene, i: int) -> Loop:
    step = scene.script[i]
    assert isinstance(step, Loop)
    return step


def with_demand(job: Job, load: Array, end_load: float) -> Scene:
    """The scene with another demand over the back half: load (D,) at the knots, ``end_load`` at the table's end."""
    old = _loop(job.scene, job.loop)
    angles = [a for a in old.angle_rad if a <= TOP_RAD]
    loads = list(old.load_factor[: len(angles)])
    knots = job.knots_rad
    last = old.angle_rad[-1] if old.angle_rad[-1] > knots[-1] + 1.0 * DEG else 358.0 * DEG
    new = dataclasses.replace(old, angle_rad=(*angles, *(float(a) for a in knots), last),
                              load_factor=(*loads, *(float(n) for n in load), end_load))
    script = (*job.scene.script[: job.loop], new, *job.scene.script[job.loop + 1 :])
    return dataclasses.replace(job.scene, script=script)


@dataclass(frozen=True, slots=True, eq=False)
class Frozen:
    """One loop frozen at F points; observers O early, likely, late; the worst of all its slots."""

    freeze_rad: Array  # (F,)
    lateness_s: Array  # (F, O) minus infinity: clears the floor by itself; infinity: never noticed; NaN: not flown
    clear_m: Array  # (F,) lowest height of any wing above the floor if nobody acts
    error: tuple[str | None, ...]  # (F,)

    def __post_init__(self) -> None:
        freeze_arrays(self)

    @property
    def clears(self) -> NDArray[np.bool_]:
        """Which freezes clear the floor by themselves, (F,)."""
        return np.isneginf(self.lateness_s[:, LIKELY])

    @property
    def worst_s(self) -> Array:
        """Greatest lateness of all freezes, (O,); minus infinity if all clear by themselves."""
        worst: Array = np.max(np.where(np.isnan(self.lateness_s), np.inf, self.lateness_s), axis=0)
        return worst

    @property
    def scores_s(self) -> Array:
        """The likely observer's lateness, (F,); below any where the freeze clears by itself, the more, the lower."""
        late = self.lateness_s[:, LIKELY]
        known = np.minimum(np.where(np.isnan(late), NEVER_S, late), NEVER_S)
        scores: Array = np.where(self.clears, CLEAR_S - self.clear_m / CLEAR_M_PER_S, known)
        return scores

    @property
    def score_s(self) -> float:
        """What a search makes small: the likely observer's worst lateness; where all clear, the less the more."""
        return float(np.max(self.scores_s))


def short_of_clearing(frozen: Frozen, floor_m: float) -> Array:
    """How far each freeze is from clearing by itself, on the scale of scores, s, (F,).

    Lateness jumps where a freeze begins to clear; this goes there evenly, but for a jump at contact with the ground.
    """
    late = np.nan_to_num(frozen.lateness_s[:, LIKELY], nan=NEVER_S, posinf=NEVER_S, neginf=CLEAR_S)
    clear = np.nan_to_num(frozen.clear_m, nan=-floor_m)
    met = np.where(clear <= 1e-9 - floor_m, np.clip(late, CLEAR_S, NEVER_S) - CLEAR_S, 0.0)
    short: Array = CLEAR_S - clear / CLEAR_M_PER_S + met
    return short


def unlike_slots(scene: Scene) -> Scene:
    """The scene less the slots that are a mirror image of one before, for searches."""
    seen: dict[tuple[float, float, float, str | None], Slot] = {}
    for slot in scene.formation:
        seen.setdefault((slot.aft_m, abs(slot.right_m), slot.down_m, slot.airframe), slot)
    return dataclasses.replace(scene, formation=tuple(seen.values()))


def freeze_all(
    job: Job, scenes: Sequence[Scene], freeze_rad: Array | None = None,
    progress: Callable[[int, int], None] | None = None,
) -> list[Frozen]:
    """Freeze each loop at each point; one chunk of flights, all slots of the scenes given."""
    points = job.freeze_rad if freeze_rad is None else freeze_rad
    many = [
        dataclasses.replace(scene, fault=Fault("freeze", Point("loop_angle", float(a))))
        for scene in scenes for a in points
    ]
    if not many:
        return []
    cases = work_cases(many, job.airframe_of, job.ground, progress=progress)
    floor = job.scene.floor_m
    return [_frozen(cases, points, slice(i * len(points), (i + 1) * len(points)), floor) for i in range(len(scenes))]


def _frozen(cases: Cases, points: Array, rows: slice, floor_m: float) -> Frozen:
    late = cases.lateness_s[rows]  # (F, S, O)
    last = np.isnan(cases.last_pull_floor_s[rows])[:, :, None]
    each = np.where(last, -np.inf, np.where(np.isnan(late), np.inf, late))
    error = cases.error[rows]
    bad = np.array([e is not None for e in error])
    worst = np.max(each, axis=1)
    worst[bad] = np.nan
    low = np.min(cases.lowest_m[rows][:, 1:], axis=1) - floor_m
    return Frozen(points.copy(), worst, np.where(bad, np.nan, low), error)
