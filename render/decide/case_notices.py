"""What the pilots of many cases could have noticed: the cues and detector of ``notice_all``, many flights at once."""

from __future__ import annotations

from collections.abc import Callable
from concurrent.futures import ThreadPoolExecutor
from dataclasses import dataclass, fields, replace
from typing import Any

import numpy as np
from numpy.typing import NDArray

from render.decide.case_flights import Flown
from render.decide.seats import lead_eye, seat_of
from render.flight import records as r
from render.flight.plan import DT_S
from render.flight.states import body_motion
from render.frames import Array, quat_rotate
from render.sight import cues as c
from render.sight.evidence import Evidence, first_notice, lead_evidence, wing_evidence
from render.sight.geometry import HeightAt
from render.sight.notice import SAMPLE_S
from render.types import OBSERVERS
from scenes.model import Watch

EVERY = max(1, round(SAMPLE_S / DT_S))
TOGETHER = 12  # cases looked at together, about 3 MB each
SHARED = 3  # a twin that so many cases share is looked at once for all of them

Steps = NDArray[np.int64]
Sink = Callable[[int, int, Array, Evidence], None]
"""Called with the case, the aircraft, the times (T,) and the evidence of that case (no leading axis)."""


@dataclass(frozen=True, slots=True, eq=False)
class Seen:
    """Notices of B cases, K aircraft, O observers: when (infinity: never) and the leading cue's name ("" then)."""

    when_s: Array  # (B, K, O)
    cue: NDArray[np.object_]  # (B, K, O)


def look(flown: Flown, height_at: HeightAt, threads: int, sink: Sink | None = None) -> Seen:
    """Notices of all cases with a fault; the others never notice anything."""
    b, aircraft = len(flown.case), flown.y.shape[0]
    when = np.full((b, aircraft, len(OBSERVERS)), np.inf)
    cue = np.full(when.shape, "", dtype=object)
    todo = np.flatnonzero(np.isfinite(flown.fault_s))
    if todo.size == 0:
        return Seen(when, cue)
    start = _starts(flown, todo)
    samples: Steps = (flown.last[todo] - start) // EVERY + 1
    views = _shared_views(flown, todo, start, height_at)

    def work(rows: NDArray[np.int64]) -> None:
        mine = todo[rows]
        _look(flown, mine, start[rows], int(samples[rows].max()), height_at, views, when, cue, sink)

    parts = _parts(flown, todo, samples, {w for w, _ in views})
    if threads > 1:
        with ThreadPoolExecutor(threads) as pool:
            list(pool.map(work, parts))
    else:
        for part in parts:
            work(part)
    return Seen(when, cue)


def _parts(flown: Flown, todo: Steps, samples: Steps, shared: set[int]) -> list[Steps]:
    """Rows of ``todo`` to look at together: one watch, one twin if its views are shared, of much the same length."""
    groups: dict[tuple[Watch, int], list[int]] = {}
    for j in np.argsort(samples, kind="stable"):
        twin = int(flown.twin_of[todo[j]])
        key = flown.plans[int(todo[j])].scene.watch, twin if twin in shared else -1
        groups.setdefault(key, []).append(int(j))
    return [np.array(rows[at : at + TOGETHER]) for rows in groups.values() for at in range(0, len(rows), TOGETHER)]


def _starts(flown: Flown, todo: Steps) -> Steps:
    """The last step before each fault, as ``notice._grid`` has it, (n,)."""
    # time_s = step * DT_S as the flights keep it: the last one not after the fault
    step = np.floor(flown.fault_s[todo] / DT_S).astype(np.int64)
    step += (step + 1) * DT_S <= flown.fault_s[todo]
    step -= step * DT_S > flown.fault_s[todo]
    start: Steps = np.minimum(np.maximum(step, 0), np.maximum(flown.last[todo] - EVERY, 0))
    return start


def _display_line(y: Array) -> Array:
    """Azimuth across the lead's wing at the start, as ``notice_all`` has it; y (..., NY) of that instant."""
    quat, _, _ = body_motion(y, np.zeros(3))
    wing_e = quat_rotate(quat, np.array([0.0, 1.0, 0.0]))
    return np.asarray(np.arctan2(wing_e[..., 1], wing_e[..., 0]) - np.pi / 2.0)


@dataclass(frozen=True, slots=True, eq=False)
class _Shared:
    """The picture at a wing's eye in a twin, at all steps from ``first`` on."""

    first: int
    view: c.View


def _shared_views(flown: Flown, todo: Steps, start: Steps, height_at: HeightAt) -> dict[tuple[int, int], _Shared]:
    """Views of the twins that several cases share, by twin and aircraft."""
    found: dict[tuple[int, int], _Shared] = {}
    twin = flown.twins.raw
    for w in np.unique(flown.twin_of[todo]):
        rows = flown.twin_of[todo] == w
        watch = {flown.plans[int(i)].scene.watch for i in todo[rows]}
        if np.count_nonzero(rows) < SHARED or len({x.look_at for x in watch}) > 1:
            continue
        first, last = int(start[rows].min()), int(flown.last[todo[rows]].max())
        plan = flown.twins.plans[w]
        y, a, wind = twin.y[w, first : last + 1], twin.a[w, first : last + 1], plan.wind_e_mps
        eye, line = lead_eye(plan, y[:, 0], wind), float(_display_line(twin.y[w, 0, 0]))
        for k in range(1, y.shape[1]):
            seat = seat_of(plan, y[:, k], a[:, k], wind, eye, k)
            found[int(w), k] = _Shared(first, c.view(seat, height_at, line, next(iter(watch)).look_at))
    return found


def _pick(view: c.View, index: Steps) -> c.View:
    """A view at some of its instants, (n, T)."""
    columns: dict[str, Any] = {}
    for f in fields(view):
        value = getattr(view, f.name)
        columns[f.name] = None if value is None else value[index]
    return replace(view, **columns)


def _look(
    flown: Flown, rows: Steps, start: Steps, samples: int, height_at: HeightAt, views: dict[tuple[int, int], _Shared],
    when: Array, cue: NDArray[np.object_], sink: Sink | None,
) -> None:
    """Fill in the notices of some cases; they may have different numbers of samples, the rest does not count."""
    index = start[:, None] + EVERY * np.arange(max(samples, 2))
    time_s: Array = np.asarray(index * DT_S, dtype=np.float64)
    last = flown.last[rows]
    fault_s, twin_of = flown.fault_s[rows], flown.twin_of[rows]
    here = np.minimum(index, last[:, None])
    twin = flown.twins.raw
    plan = flown.plans[int(rows[0])]
    wind = np.stack([flown.plans[int(i)].wind_e_mps for i in rows])[:, None, :]
    yf, ah_index = flown.y[:, rows[:, None], here], (twin_of[:, None], here)
    af = flown.a[:, rows[:, None], here]
    yh, ah = twin.y[ah_index], twin.a[ah_index]  # (n, T, K, ...)
    eye_f, eye_h = lead_eye(plan, yf[0], wind), lead_eye(plan, yh[:, :, 0], wind)
    line = _display_line(flown.y[0, rows, 0])[:, None]
    called = np.full((len(rows), len(OBSERVERS)), np.inf)
    for k in range(flown.y.shape[0]):
        ends = np.stack([flown.contact_s[rows, k], flown.contact_s[rows, 0], flown.twin_contact_s[twin_of, k],
                         flown.twin_contact_s[twin_of, 0]])
        end_s = np.min(np.where(np.isnan(ends), np.inf, ends), axis=0)
        counts = (time_s > fault_s[:, None]) & (time_s < end_s[:, None]) & (index <= last[:, None])
        if k == 0:
            evidence = lead_evidence(
                ah[:, :, 0, r.A_N], af[0, :, :, r.A_N], ah[:, :, 0, r.A_NCMD], af[0, :, :, r.A_NCMD],
                ah[:, :, 0, r.A_STICK_FORCE], af[0, :, :, r.A_STICK_FORCE], time_s, counts,
            )
        else:
            healthy = seat_of(plan, yh[:, :, k], ah[:, :, k], wind, eye_h, k)
            faulted = seat_of(plan, yf[k], af[k], wind, eye_f, k)
            one_twin = np.all(twin_of == twin_of[0])
            shared = views.get((int(twin_of[0]), k)) if one_twin else None
            view = None if shared is None else _pick(shared.view, here - shared.first)
            evidence = wing_evidence(
                healthy, faulted, time_s, counts, plan.scene.watch, height_at, line, called, view
            )
        found, leading = first_notice(time_s, evidence)
        if k == 0:
            called = found
        when[rows, k] = found
        cue[rows, k] = np.where(np.isfinite(found), np.array(evidence.names, dtype=object)[leading], "")
        if sink is not None:
            for j, i in enumerate(rows):
                sink(int(flown.case[i]), k, time_s[j], single(evidence, j))


def single(evidence: Evidence, j: int) -> Evidence:
    """The evidence of one case of several."""
    e = evidence
    return Evidence(e.names, e.difference[j], e.sigma[j], e.technique[j], e.there[j], e.time_to_ground_s[j])
