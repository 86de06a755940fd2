"""What a study says, in the columns of a table of cases, so that the two can be compared."""

from __future__ import annotations

from typing import Any

import numpy as np

from render.decide.case_flights import GATES
from render.decide.cases import CUES, GATE_COLUMNS
from render.types import Study


def nan(value: float | None) -> float:
    return np.nan if value is None else value


def columns_of_study(study: Study) -> dict[str, Any]:
    """The row of a case, by column, from the study of its scene."""
    flown, twin = study.faulted, study.healthy
    since = flown.fault_s if flown.fault_s is not None else twin.events.get("top", 0.0)
    gates = np.full((len(GATES), len(GATE_COLUMNS)), np.nan)
    for j, gate in enumerate(GATES):
        if gate in study.verdict["points"]:
            gates[j] = [study.verdict["points"][gate][c] for c in GATE_COLUMNS]
    notes = [study.notices[name] for name in flown.names[1:]]
    return {
        "fault_s": nan(flown.fault_s),
        "contact_s": [nan(c) for c in flown.contact_s],
        "lowest_m": np.maximum(np.min(flown.height_agl_m[flown.time_s >= since], axis=0), 0.0),
        "loop_scale": twin.loop_scale,
        "gates": gates,
        "last_pull_floor_s": [nan(p) for p in study.margin.last_pull_floor_s[1:]],
        "last_pull_ground_s": [nan(p) for p in study.margin.last_pull_ground_s[1:]],
        "lead_notice_s": [nan(n.time_s) for n in study.notices["lead"]],
        "notice_s": [[nan(n.time_s) for n in own] for own in notes],
        "cue": [[-1 if n.cue is None else CUES.index(n.cue) for n in own] for own in notes],
        "lateness_s": [[nan(n.lateness_s) for n in own] for own in notes],
        "clearance_floor_m": [[nan(n.clearance_m) for n in own] for own in notes],
        "clearance_ground_m": [[nan(n.clearance_ground_m) for n in own] for own in notes],
    }
