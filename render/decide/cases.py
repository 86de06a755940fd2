"""Many cases worked through together: variants of one scene in, one table of columns out.

A case goes through the same flight, margin and sight code as ``work_through``; a case that can't be flown
is a row with its error, not an exception.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, fields
from typing import Any

import numpy as np
from numpy.typing import NDArray

from render.errors import LatepullError
from render.frames import Array
from render.study import work_through
from render.types import OBSERVERS, Study, freeze_arrays
from scenes.airframe import Airframe
from scenes.complaint import SceneError
from scenes.model import Scene
from terrain.ground import Ground

GATES = ("entry", "vertical_up", "top", "vertical_down", "bottom")
GATE_COLUMNS = ("time_s", "height_m", "speed_mps", "load_factor")
# every cue there is; a cue of a case is an index into this, -1 for none
CUES = ("tilt", "turning", "flow", "closing", "growth", "lead", "load", "felt rate", "stick force", "gauge", "call")
CHUNK = 128

Progress = Callable[[int, int], None]


@dataclass(frozen=True, slots=True, eq=False)
class Cases:
    """Columns over B cases; S slots, K = S + 1 aircraft (the lead first), the three observers O early, likely, late.

    Times from the start of the script. NaN: it never runs out (last pull), is never noticed, never meets the
    ground, or the case could not be flown (then ``error`` says why).
    """

    names: tuple[str, ...]  # (S,) the slots
    error: tuple[str | None, ...]  # (B,)
    fault_s: Array  # (B,)
    contact_s: Array  # (B, K)
    lowest_m: Array  # (B, K) above the ground after the fault (after the top without one); 0 at contact
    loop_scale: Array  # (B,)
    gates: Array  # (B, 5, 4) of the healthy lead: GATES x GATE_COLUMNS, height above ground, calibrated speed
    load_factor_max: Array  # (B,) of the healthy lead, greatest
    speed_max_mps: Array  # (B,) of the healthy lead, calibrated
    last_pull_floor_s: Array  # (B, S)
    last_pull_ground_s: Array  # (B, S)
    lead_notice_s: Array  # (B, O)
    notice_s: Array  # (B, S, O)
    cue: NDArray[np.int64]  # (B, S, O) index into CUES, -1 none
    reaction_s: Array  # (O,)
    lateness_s: Array  # (B, S, O) against the floor; positive: too late
    clearance_floor_m: Array  # (B, S, O) lowest point above the floor if he breaks out when he has noticed
    clearance_ground_m: Array  # (B, S, O)

    def __post_init__(self) -> None:
        freeze_arrays(self)

    def __len__(self) -> int:
        return len(self.error)

    @property
    def flown(self) -> NDArray[np.bool_]:
        """Which cases could be flown, (B,)."""
        return np.array([e is None for e in self.error], dtype=bool)


_PER_CASE = tuple(f.name for f in fields(Cases) if f.name not in ("names", "error", "reaction_s"))


def work_cases(
    scenes: Sequence[Scene],
    airframe_of: Callable[[str], Airframe],
    ground: Ground,
    *,
    chunk: int = CHUNK,
    progress: Progress | None = None,
) -> Cases:
    """Work through scenes with the same slots over one ground; in chunks of ``chunk`` cases.

    progress: called with cases done and all cases after each chunk. A case equals ``work_through`` of its scene.
    Raises LatepullError if there is no scene or the slots differ.
    """
    if not scenes:
        raise LatepullError("no cases to work through")
    names = tuple(slot.name for slot in scenes[0].formation)
    for scene in scenes:
        if tuple(slot.name for slot in scene.formation) != names:
            raise LatepullError(f"cases of one table need the same slots: read {scene.name} with others than {names}")
    parts = []
    for at in range(0, len(scenes), chunk):
        parts.append(_chunk(scenes[at : at + chunk], names, airframe_of, ground))
        if progress is not None:
            progress(min(at + chunk, len(scenes)), len(scenes))
    return join(parts)


def join(parts: Sequence[Cases]) -> Cases:
    """Tables one after another; they need the same slots."""
    first = parts[0]
    columns: dict[str, Any] = {name: np.concatenate([getattr(p, name) for p in parts]) for name in _PER_CASE}
    return Cases(names=first.names, error=tuple(e for p in parts for e in p.error), reaction_s=first.reaction_s.copy(),
                 **columns)


def take(cases: Cases, rows: Sequence[int] | NDArray[np.int_]) -> Cases:
    """The table with some of its rows, in the order given."""
    index = np.asarray(rows, dtype=int)
    columns: dict[str, Any] = {name: getattr(cases, name)[index] for name in _PER_CASE}
    return Cases(names=cases.names, error=tuple(cases.error[int(i)] for i in index), reaction_s=cases.reaction_s.copy(),
                 **columns)


def _chunk(
    scenes: Sequence[Scene], names: tuple[str, ...], airframe_of: Callable[[str], Airframe], ground: Ground
) -> Cases:
    from render.sight.observers import TABLE

    b, s, o = len(scenes), len(names), len(OBSERVERS)
    col: dict[str, Any] = {
        "fault_s": np.full(b, np.nan), "contact_s": np.full((b, s + 1), np.nan),
        "lowest_m": np.full((b, s + 1), np.nan), "loop_scale": np.full(b, np.nan),
        "gates": np.full((b, len(GATES), len(GATE_COLUMNS)), np.nan), "load_factor_max": np.full(b, np.nan),
        "speed_max_mps": np.full(b, np.nan), "last_pull_floor_s": np.full((b, s), np.nan),
        "last_pull_ground_s": np.full((b, s), np.nan), "lead_notice_s": np.full((b, o), np.nan),
        "notice_s": np.full((b, s, o), np.nan), "cue": np.full((b, s, o), -1, dtype=np.int64),
        "lateness_s": np.full((b, s, o), np.nan), "clearance_floor_m": np.full((b, s, o), np.nan),
        "clearance_ground_m": np.full((b, s, o), np.nan),
    }
    errors: list[str | None] = []
    for i, scene in enumerate(scenes):
        try:
            study = work_through(scene, airframe_of, ground, "")
        except (LatepullError, SceneError) as exc:
            errors.append(str(exc))
            continue
        errors.append(None)
        _fill(col, i, study)
    return Cases(names=names, error=tuple(errors), reaction_s=np.array([TABLE[w].reaction.value for w in OBSERVERS]),
                 **col)


def _none(value: float | None) -> float:
    return np.nan if value is None else value


def _fill(col: dict[str, Any], i: int, study: Study) -> None:
    flight, twin = study.faulted, study.healthy
    col["fault_s"][i] = _none(flight.fault_s)
    col["contact_s"][i] = [_none(c) for c in flight.contact_s]
    since = flight.fault_s if flight.fault_s is not None else twin.events.get("top", 0.0)
    col["lowest_m"][i] = np.maximum(np.min(flight.height_agl_m[flight.time_s >= since], axis=0), 0.0)
    col["loop_scale"][i] = twin.loop_scale
    for j, gate in enumerate(GATES):
        if gate in study.verdict["points"]:
            col["gates"][i, j] = [study.verdict["points"][gate][c] for c in GATE_COLUMNS]
    col["load_factor_max"][i] = np.max(twin.load_factor[:, 0])
    col["speed_max_mps"][i] = np.max(twin.cas_mps[:, 0])
    col["last_pull_floor_s"][i] = [_none(p) for p in study.margin.last_pull_floor_s[1:]]
    col["last_pull_ground_s"][i] = [_none(p) for p in study.margin.last_pull_ground_s[1:]]
    col["lead_notice_s"][i] = [_none(n.time_s) for n in study.notices["lead"]]
    for j, name in enumerate(flight.names[1:]):
        for m, note in enumerate(study.notices[name]):
            col["notice_s"][i, j, m] = _none(note.time_s)
            col["cue"][i, j, m] = -1 if note.cue is None else CUES.index(note.cue)
            col["lateness_s"][i, j, m] = _none(note.lateness_s)
            col["clearance_floor_m"][i, j, m] = _none(note.clearance_m)
            col["clearance_ground_m"][i, j, m] = _none(note.clearance_ground_m)
