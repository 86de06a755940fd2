"""The pull that a search found, as a scene file that builds on the one it began from; maps of both."""

from __future__ import annotations

import dataclasses
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path

from render.decide.brief import without_fault
from render.decide.cases import CHUNK, join
from render.decide.chunks import cases_of, columns_of
from render.decide.ledger import Columns, Ledger
from render.decide.map import Map, grid_values, make_map, map_axes
from render.decide.shape_flights import pieces_of
from render.decide.shape_search import Shape
from render.decide.values import Common, common_of, work_values
from scenes.airframe import Airframe
from scenes.model import DEG, Fault, Loop, Point, Scene
from scenes.reader import read_scene
from scenes.writer import plain_table, write_scene_like
from terrain.ground import Ground


def found_scene(base: str, shape: Shape, folder: Path) -> str:
    """YAML of the best pull, ``like:`` the scene at ``base``; folder: where it will be saved.

    The scene keeps its fault; where it flies another script than was briefed, the briefed loop changes.
    """
    assert shape.best is not None
    item = shape.trade[shape.best]
    assert item.scene is not None
    step = item.scene.script[shape.job.loop]
    assert isinstance(step, Loop)
    scene: Scene = read_scene(base)
    script = "script" if scene.briefed is None else "briefed"
    return write_scene_like(base, {
        f"{script}.{shape.job.loop}.loop.load_factor": plain_table(step),
        "title": f"{scene.title.rstrip('.')[:150]}, with the pull that shape found",
    }, folder.resolve())


def map_work(common: Common, values: Sequence[Mapping[str, float]]) -> Columns:
    """Cases of a map as columns; a piece of work for a runner."""
    return columns_of(work_values(common, values))


def map_of(scene: Scene, airframe_of: Callable[[str], Airframe], ground: Ground, ledger: Ledger | None = None,
           progress: Callable[[int, int], None] | None = None) -> Map:
    """The map of a scene over its default axes, of a freeze if the scene has no fault on the way down."""
    if scene.fault is None or scene.briefed is not None:
        scene = dataclasses.replace(without_fault(scene), fault=Fault("freeze", Point("loop_angle", 245.0 * DEG)))
    mapped, x, y = map_axes(scene, None, None)
    values, common = grid_values(x, y), common_of(mapped, airframe_of, ground)
    pieces, finished = list(pieces_of(values, CHUNK)), 0

    def done(piece: int) -> None:
        nonlocal finished
        finished += len(pieces[piece])
        if progress is not None:
            progress(finished, len(values))

    parts = (ledger or Ledger()).work(map_work, common, pieces, done)
    return make_map(scene, mapped, x, y, join([cases_of(columns) for columns in parts]))
