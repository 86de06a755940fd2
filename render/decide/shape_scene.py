"""The pull that a search found, as a scene file that builds on the one it began from."""

from __future__ import annotations

from pathlib import Path

from render.decide.shape_search import Shape
from scenes.model import Loop, Scene
from scenes.reader import read_scene
from scenes.writer import plain_table, write_scene_like


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
