"""Stages of tests share what takes two thirds of building one: the cover of a land, shapes, cockpits.

A stage gets what it would have built itself; one that changed it would be found by the kept pictures.
"""

from __future__ import annotations

from collections.abc import Iterator
from functools import cache

import pytest

from render.picture import land, stage
from terrain.cover import Cover, cover_of
from terrain.ground import Ground


@pytest.fixture(scope="session", autouse=True)
def built_once() -> Iterator[None]:
    """Covers, shapes and cockpits kept for the next stage that needs the same."""
    covers: dict[tuple[str, str, int], Cover] = {}

    def cover(ground: Ground, seed: int) -> Cover:
        key = ground.name, repr(ground.recipe), seed
        if key not in covers:
            covers[key] = cover_of(ground, seed)
        return covers[key]

    with pytest.MonkeyPatch.context() as patch:
        patch.setattr(land, "cover_of", cover)
        patch.setattr(stage, "build_shape", cache(stage.build_shape))
        patch.setattr(stage, "build_cockpit", cache(stage.build_cockpit))
        yield
