"""The small search for a shape that tests share: where it freezes, how it is begun, what it finds."""

from __future__ import annotations

from collections.abc import Iterator, Sequence
from functools import lru_cache
from typing import Any

import numpy as np

from render.decide.chunks import Folder
from render.decide.ledger import Ledger
from render.decide.runner import Runner
from render.decide.shape import Job, make_job
from render.decide.shape_flights import Flights
from render.decide.shape_search import Shape, find_shape
from render.decide.values import common_of
from scenes.model import DEG
from scenes.reader import read_airframe, read_scene
from terrain.ground import read_ground

POINTS = np.array([180.0, 235.0, 290.0]) * DEG


@lru_cache
def hero() -> Job:
    """The shipped scene, frozen at a few points."""
    scene = read_scene("late_freeze")
    ground = read_ground(scene.ground, scene.seed)
    return make_job(scene, common_of(scene, read_airframe, ground).airframes.__getitem__, ground, POINTS)


class CutOff:
    """Does some pieces here and is then interrupted, as by Ctrl-C."""

    where = "here"

    def __init__(self, pieces: int = 10**9) -> None:
        self.left, self.done = pieces, 0

    def run(self, work: Any, common: Any, chunks: Sequence[tuple[int, Any]]) -> Iterator[tuple[int, Any]]:
        """Pieces done, until it is cut off."""
        for number, chunk in chunks:
            if self.left == 0:
                raise KeyboardInterrupt
            self.left -= 1
            self.done += 1
            yield number, work(common, chunk)


def search(run: Runner, folder: Folder | None = None, *, resume: bool = False) -> Shape:
    """A small search that evolves and polishes."""
    flights = Flights(hero(), Ledger(run, folder, resume=resume))
    return find_shape(hero(), load_factor=4.8, budget=120, seed=3, steps=1, people=5, flights=flights)


@lru_cache
def whole() -> tuple[Shape, int]:
    """The search uninterrupted, keeping nothing, and how many pieces it takes."""
    run = CutOff()
    return search(run), run.done
