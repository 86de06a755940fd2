"""The flights of a search for a pull, in pieces for a runner: measured by the lead alone, frozen with the formation."""

from __future__ import annotations

import dataclasses
from collections.abc import Iterator, Sequence
from dataclasses import dataclass
from typing import Any

import numpy as np

from render.decide.ledger import Columns, Ledger
from render.decide.shape import Frozen, Job, freeze_all
from render.decide.shape_limits import Pull, measure_pulls
from render.frames import Array
from scenes.model import Scene

MEASURED = 20  # pulls in a piece that measures them
FROZEN = 48  # cases in a piece that freezes them, about; it takes whole pulls
SAMPLES = ("angle_rad", "flown_load", "lift", "demand")
NUMBERS = tuple(f.name for f in dataclasses.fields(Pull) if f.name not in (*SAMPLES, "error"))


def measure_work(job: Job, scenes: Sequence[Scene]) -> Columns:
    """Pulls of some loops as columns; a piece of work for a runner."""
    pulls = measure_pulls(job, scenes)
    columns: dict[str, Array] = {}
    for name in SAMPLES:
        columns[name] = np.full((len(pulls), max(len(getattr(p, name)) for p in pulls)), np.nan)
        for i, pull in enumerate(pulls):
            if pull.error is None:
                columns[name][i] = getattr(pull, name)
    return {"numbers": np.array([[getattr(p, name) for name in NUMBERS] for p in pulls]), **columns,
            "error": np.array([p.error or "" for p in pulls])}


def pulls_of(columns: Columns) -> list[Pull]:
    """The pulls from such columns."""
    out = []
    for i, why in enumerate(columns["error"]):
        numbers = dict(zip(NUMBERS, map(float, columns["numbers"][i]), strict=True))
        shown = {} if why else {name: tuple(map(float, columns[name][i])) for name in SAMPLES}
        out.append(Pull(**numbers, **shown, error=str(why) or None))  # type: ignore[arg-type]
    return out


def freeze_work(job: Job, piece: tuple[Sequence[Scene], tuple[float, ...]]) -> Columns:
    """Some loops frozen at some points, as columns; a piece of work for a runner."""
    scenes, points = piece
    frozen = freeze_all(job, scenes, np.array(points))
    return {"lateness_s": np.array([f.lateness_s for f in frozen]), "clear_m": np.array([f.clear_m for f in frozen]),
            "error": np.array([[e or "" for e in f.error] for f in frozen])}


def frozen_of(columns: Columns, points: Array) -> list[Frozen]:
    """The frozen loops from such columns."""
    return [
        Frozen(points.copy(), late.copy(), clear.copy(), tuple(str(e) or None for e in error))
        for late, clear, error in zip(columns["lateness_s"], columns["clear_m"], columns["error"], strict=True)
    ]


@dataclass(frozen=True, slots=True)
class Flights:
    """Flies what a search asks for: here or on a cluster, kept or read, as the ledger says."""

    job: Job
    ledger: Ledger = dataclasses.field(default_factory=Ledger)

    def measure(self, scenes: Sequence[Scene]) -> list[Pull]:
        """``measure_pulls`` of each."""
        pieces = list(pieces_of(tuple(scenes), MEASURED))
        return [pull for columns in self.ledger.work(measure_work, self.job, pieces) for pull in pulls_of(columns)]

    def freeze(self, scenes: Sequence[Scene], points: Array) -> list[Frozen]:
        """``freeze_all`` of each at the points."""
        each = max(FROZEN // len(points), 1)
        pieces = [(part, tuple(map(float, points))) for part in pieces_of(tuple(scenes), each)]
        return [f for columns in self.ledger.work(freeze_work, self.job, pieces) for f in frozen_of(columns, points)]


def pieces_of(items: Sequence[Any], size: int) -> Iterator[Any]:
    """The items, so many at a time."""
    return (items[at : at + size] for at in range(0, len(items), size))
