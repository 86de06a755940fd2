"""What is left when a pilot has noticed: many flights with a fault, each against its own healthy twin."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from render.decide.seats import seats
from render.flight import records as r
from render.flight import script as s
from render.flight.batch import Raw, fly_faulted, fly_kept
from render.flight.fly import AFTER_SCRIPT_S, ground_arrays
from render.flight.plan import DT_S, Plan
from render.frames import Array
from render.margin.last_pull import last_pulls
from render.sight import cues as c
from render.sight.evidence import Evidence, first_notice, lead_evidence, wing_evidence
from render.sight.notice import SAMPLE_S
from render.sight.observers import TABLE
from render.types import OBSERVERS, freeze_arrays
from scenes.model import Level
from terrain.ground import Ground

CHUNK = 120  # flights in memory at once, about 0.6 MB each and aircraft
VIEWS = 24  # of them looked at together
LONGER, EXTENSIONS = 1.6, 3  # a fault that has not come to its lowest point is flown on
NO_CUE = ""

EvidenceSink = Callable[[int, int, Array, Evidence], None]
"""Called with the case, the slot's place among those worked on, times and evidence (no leading axis)."""


@dataclass(frozen=True, slots=True, eq=False)
class Left:
    """F faulted flights, S slots, observers O early, likely, late. Times from the start of each flight."""

    slots: tuple[str, ...]
    fault_s: Array  # (F,) NaN: the fault's point is never reached
    low_m: Array  # (F, S) lowest height above ground after the fault, 0 at contact
    last_pull_s: Array  # (F, S) against the floor; infinity: never runs out
    notice_s: Array  # (F, S, O) infinity: never
    cue: tuple[tuple[tuple[str, ...], ...], ...]  # (F, S, O)
    whole: NDArray[np.bool_]  # (F,) followed to the lowest point, within the model's range
    why: NDArray[np.int64]  # (F,) why the lead stopped: a code of records

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def at_notice_s(self) -> Array:
        """Seconds left before the last pull when each has noticed, (F, S, O).

        Infinity where it never runs out; minus infinity where it does and he never notices.
        """
        with np.errstate(invalid="ignore"):
            left = self.last_pull_s[..., None] - self.notice_s
        left = np.where(np.isinf(self.notice_s), -np.inf, left)
        return np.where(np.isinf(self.last_pull_s)[..., None], np.inf, left)

    def in_hand_s(self) -> Array:
        """Seconds left when his hand moves, his reaction after he noticed, (F, S, O): the lateness, turned round."""
        return self.at_notice_s() - np.array([TABLE[o].reaction.value for o in OBSERVERS])


def all_slots(plan: Plan) -> tuple[int, ...]:
    """Aircraft of all slots."""
    return tuple(range(1, len(plan.airframes)))


def unlike_slots(plan: Plan) -> tuple[int, ...]:
    """Aircraft of the slots that are no mirror image of one before, for searches (the day's wind is the same air)."""
    seen: dict[tuple[float, float, float, str], int] = {}
    for k in all_slots(plan):
        aft, right, down = plan.slots[k - 1]
        seen.setdefault((aft, abs(right), down, plan.airframes[k].name), k)
    return tuple(seen.values())


def only(plan: Plan, aircraft: Sequence[int]) -> Plan:
    """The plan with the lead and some of its wings."""
    keep = [0, *aircraft]
    scene = replace(plan.scene, formation=tuple(plan.scene.formation[k - 1] for k in aircraft))
    return replace(plan, scene=scene, airframes=tuple(plan.airframes[k] for k in keep), af=plan.af[keep],
                   entry=plan.entry[keep], slots=plan.slots[[k - 1 for k in aircraft]])


def work_left(
    twins: Sequence[Plan], scale: Array, faulted: Sequence[Plan], twin_of: Sequence[int], ground: Ground,
    seconds: float, *, offset_s: float = 0.0, sink: EvidenceSink | None = None, every_notice: bool = True,
) -> Left:
    """Fly healthy twins (W) and flights with a fault (F), and find last pulls and notices of every slot.

    scale (W,): of the back half's demand; twin_of (F,): each flight's twin; seconds: how long is flown at first;
    offset_s: what the clock of the script says at the start (looks at the gauges). Plans of one shape.
    every_notice: also of flights whose last pull never runs out, where nothing hangs on it.
    """
    heights, grid = ground_arrays(ground)
    of = np.asarray(twin_of, dtype=int)
    parts: list[tuple[NDArray[np.int_], Left]] = []
    order = np.argsort(of, kind="stable")
    for at in range(0, len(order), CHUNK):
        todo, span = order[at : at + CHUNK], seconds
        for last in range(EXTENSIONS + 1):
            found = _chunk(twins, scale, [faulted[int(i)] for i in todo], of[todo], todo, ground, heights, grid,
                           span, offset_s, sink, every_notice)
            done = found.whole | (found.why != r.OK) | np.isnan(found.fault_s) | (last == EXTENSIONS)
            parts.append((todo[done], _rows(found, done)))
            todo, span = todo[~done], span * LONGER
            if todo.size == 0:
                break
    return _join(parts, len(of))


def _rows(left: Left, rows: NDArray[np.bool_]) -> Left:
    return Left(left.slots, left.fault_s[rows], left.low_m[rows], left.last_pull_s[rows], left.notice_s[rows],
                tuple(left.cue[int(i)] for i in np.flatnonzero(rows)), left.whole[rows], left.why[rows])


def _join(parts: Sequence[tuple[NDArray[np.int_], Left]], count: int) -> Left:
    back = np.argsort(np.concatenate([rows for rows, _ in parts]), kind="stable")
    assert back.size == count

    def column(name: str) -> Array:
        joined: Array = np.concatenate([getattr(left, name) for _, left in parts])[back]
        return joined

    cue = [row for _, left in parts for row in left.cue]
    return Left(parts[0][1].slots, column("fault_s"), column("low_m"), column("last_pull_s"), column("notice_s"),
                tuple(cue[int(i)] for i in back), column("whole").astype(bool), column("why").astype(np.int64))


def stopped_s(raw: Raw) -> Array:
    """When each aircraft of each flight stopped, s, (B, K): contact to a part of a step; infinity if it didn't."""
    b, k = raw.status.shape[:2]
    out = np.full((b, k), np.inf)
    for i, j in zip(*np.nonzero(raw.status[:, :, 0] != r.OK), strict=True):
        at = int(raw.status[i, j, 1])
        out[i, j] = at * DT_S
        if int(raw.status[i, j, 0]) == r.CONTACT and at > 0:
            above, below = raw.a[i, at - 1, j, r.A_AGL], raw.a[i, at, j, r.A_AGL]
            out[i, j] = (at - 1 + above / max(above - below, 1e-9)) * DT_S
    return out


def _chunk(
    twins: Sequence[Plan], scale: Array, plans: Sequence[Plan], of: NDArray[np.int_], cases: NDArray[np.int_],
    ground: Ground, heights: Array, grid: Array, seconds: float, offset_s: float, sink: EvidenceSink | None,
    every_notice: bool,
) -> Left:
    steps = round(seconds / DT_S)
    used = np.unique(of)
    kept = fly_kept([twins[int(w)] for w in used], scale[used], steps, heights, grid,
                    tail=round(AFTER_SCRIPT_S / DT_S) + 2)
    healthy, twin = kept.raw, np.searchsorted(used, of)
    ended_s = healthy.mem[twin, s.M_SCRIPT_END_S]
    end_step = np.where(ended_s >= 0.0, np.round(ended_s / DT_S), steps).astype(np.int64)
    raw, begin = fly_faulted(plans, kept, twin, end_step, steps, heights, grid)
    f, slots = len(plans), len(plans[0].airframes) - 1
    fault_s = np.where((begin >= 0) & (raw.mem[:, s.M_FAULT_S] >= 0.0), raw.mem[:, s.M_FAULT_S], np.nan)
    over, ended = _over(healthy, raw, twin)
    ends = np.minimum(np.minimum(raw.status[:, :, 1], raw.status[:, :1, 1]), over[:, None]).astype(np.int64)
    contact = (raw.status[:, 0, 0] == r.CONTACT) & (raw.status[:, 0, 1] <= over)
    cut = (raw.status[:, 0, 0] != r.OK) & (raw.status[:, 0, 0] != r.CONTACT) & (raw.status[:, 0, 1] <= over)
    low, last = np.full((f, slots), np.inf), np.full((f, slots), np.inf)
    notice = np.full((f, slots, len(OBSERVERS)), np.inf)
    cue = np.full((f, slots, len(OBSERVERS)), NO_CUE, dtype=object)
    hit = np.flatnonzero(np.isfinite(fault_s))
    if hit.size:
        stop = stopped_s(raw)[hit, 1:]
        met = (raw.status[hit, 1:, 0] == r.CONTACT) & (raw.status[hit, 1:, 1] <= ends[hit, :1])
        ys, as_ = (np.ascontiguousarray(v.transpose(2, 0, 1, 3)[1:, hit]) for v in (raw.y, raw.a))
        pulls, _ = last_pulls([plans[int(i)] for i in hit], ys, as_, ends[hit, 0], np.where(met, stop, np.nan), heights,
                              grid)
        last[hit] = np.where(np.isnan(pulls), np.inf, pulls)
        for i in hit:
            since = raw.a[i, int(np.ceil(fault_s[i] / DT_S)) : ends[i, 0] + 1, 1:, r.A_AGL]
            low[i] = np.maximum(np.min(since, axis=0, initial=np.inf), 0.0)
        asked = hit if every_notice else hit[np.any(np.isfinite(last[hit]), axis=1) | cut[hit]]
        _look(plans, healthy, raw, twin, asked, fault_s, over, ground, offset_s, notice, cue, cases, sink)
    # outside the model's range nothing is known: what was there at its edge is all that counts
    edge = ends[:, 0] * DT_S
    last = np.where(cut[:, None] & np.isinf(last), edge[:, None], last)
    return Left(tuple(slot.name for slot in plans[0].scene.formation), fault_s, low, last, notice,
                tuple(tuple(tuple(str(w) for w in row) for row in case) for case in cue),
                (ended | contact) & ~cut, np.where(contact | cut, raw.status[:, 0, 0], r.OK).astype(np.int64))


def _over(healthy: Raw, raw: Raw, twin: NDArray[np.int_]) -> tuple[NDArray[np.int64], NDArray[np.bool_]]:
    """The step with which each flight is over, (F,), and whether it came to that (the rule of ``fly``).

    The end of the twin's script, later if the lead still goes down then, for a while: what follows is no part of
    the scene.
    """
    last = raw.y.shape[1] - 1
    end_s = healthy.mem[twin, s.M_SCRIPT_END_S]
    end = np.where(end_s >= 0.0, np.minimum(np.round(end_s / DT_S), last), last).astype(np.int64)
    longest = round(AFTER_SCRIPT_S / DT_S)
    over, ended = np.full(len(end), last), np.zeros(len(end), dtype=bool)
    for i, first in enumerate(end):
        level = np.flatnonzero(np.diff(raw.y[i, first : first + longest + 1, 0, r.D]) <= 0.0)
        if level.size or first + longest <= last:
            over[i], ended[i] = first + (level[0] if level.size else longest), True
    return over, ended


def _look(
    plans: Sequence[Plan], healthy: Raw, raw: Raw, twin: NDArray[np.int_], hit: NDArray[np.int_], fault_s: Array,
    over: NDArray[np.int64], ground: Ground, offset_s: float, notice: Array, cue: NDArray[np.object_],
    cases: NDArray[np.int_], sink: EvidenceSink | None,
) -> None:
    """Fill in notices and cues, twin by twin, in groups of flights whose faults are near each other."""
    stop_h, stop_f = stopped_s(healthy), stopped_s(raw)
    first = plans[0].scene.script[0]
    line = first.heading_rad if isinstance(first, Level) and first.heading_rad is not None else 0.0
    every = max(1, round(SAMPLE_S / DT_S))
    for w in np.unique(twin[hit]):
        own = hit[twin[hit] == w]
        own = own[np.argsort(fault_s[own], kind="stable")]
        for at in range(0, own.size, VIEWS):
            rows = own[at : at + VIEWS]
            # on one beat for all, so that a flight is seen at the same instants in whatever company
            begin = max(int(np.floor(fault_s[rows[0]] / DT_S + 1e-9)), 0) // every * every
            end = min(int(np.max(np.minimum(raw.status[rows, 0, 1], over[rows]))) + every, raw.y.shape[1] - 1)
            pick = np.arange(min(begin, max(end - every, 0) // every * every), end + 1, every)
            time_s = pick * DT_S
            called = np.full((rows.size, len(OBSERVERS)), np.inf)
            yh, ah = healthy.y[w : w + 1, pick], healthy.a[w : w + 1, pick]
            yf, af = raw.y[np.ix_(rows, pick)], raw.a[np.ix_(rows, pick)]
            for k in range(len(plans[0].airframes)):
                until = np.minimum(np.min(stop_f[np.ix_(rows, [0, k])], axis=1), np.min(stop_h[w, [0, k]]))
                until = np.minimum(until, (over[rows] + 1) * DT_S)
                counts = (time_s > fault_s[rows, None]) & (time_s < until[:, None])
                if k == 0:
                    if plans[0].scene.watch.call_after_s is not None:
                        called, _ = first_notice(time_s, _lead(ah, af, time_s, counts))
                    continue
                seen = wing_evidence(
                    one_seat(seats(plans[0], yh, ah, k)), seats(plans[0], yf, af, k), time_s + offset_s, counts,
                    plans[0].scene.watch, ground.height_at, line, called + offset_s,
                )
                when, lead_cue = first_notice(time_s, seen)
                notice[rows, k - 1] = when
                cue[rows, k - 1] = np.where(np.isfinite(when), np.array(seen.names, dtype=object)[lead_cue], NO_CUE)
                if sink is not None:
                    for j, row in enumerate(rows):
                        sink(int(cases[row]), k - 1, time_s, single(seen, j))


def _lead(ah: Array, af: Array, time_s: Array, counts: NDArray[np.bool_]) -> Evidence:
    h, f = ah[:, :, 0], af[:, :, 0]
    return lead_evidence(h[..., r.A_N], f[..., r.A_N], h[..., r.A_NCMD], f[..., r.A_NCMD], h[..., r.A_STICK_FORCE],
                         f[..., r.A_STICK_FORCE], time_s, counts)


def one_seat(seat: c.Seat) -> c.Seat:
    """A batch of one seat without its leading axis."""
    assert seat.lead_eye_e_m is not None
    return replace(seat, pos_e_m=seat.pos_e_m[0], vel_e_mps=seat.vel_e_mps[0], quat_eb=seat.quat_eb[0],
                   rate_b_radps=seat.rate_b_radps[0], load_factor=seat.load_factor[0], cas_mps=seat.cas_mps[0],
                   height_m=seat.height_m[0], lead_eye_e_m=seat.lead_eye_e_m[0])


def single(seen: Evidence, j: int) -> Evidence:
    """The evidence of one flight of a batch."""
    return Evidence(seen.names, seen.difference[j], seen.sigma[j], seen.technique[j], seen.there[j],
                    seen.time_to_ground_s[j])
