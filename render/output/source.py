"""Where frames come from: a named factory, so that a film's workers can open it in their own process."""

from __future__ import annotations

import importlib
from collections.abc import Callable, Mapping
from contextlib import AbstractContextManager
from dataclasses import dataclass, field
from typing import Any, Protocol, cast

import numpy as np
from numpy.typing import NDArray

from render.types import Study


class FrameSource(Protocol):
    """Draws a study instant."""

    def frame(self, time_s: float) -> NDArray[np.uint8]:
        """The picture at an instant, (h, w, 3); the array may be used again by the next call."""
        ...


def caption_bottom_px(source: FrameSource) -> int | None:
    """The row above which a source wants the overlay's caption, where it doesn't lie well at the top; else None."""
    row: int | None = getattr(source, "caption_bottom_px", None)
    return row


Opener = Callable[..., AbstractContextManager[FrameSource]]


@dataclass(frozen=True, slots=True)
class SourceSpec:
    """A factory by name, ``module:function``, and its options (plain JSON values).

    A source must not touch the graphics driver before its first frame: it is opened before its process forks.
    smooth: whether it needs the compiled edge smoothing, which takes a while to load.
    """

    factory: str = "render.output.stage_source:open_stage"
    options: Mapping[str, Any] = field(default_factory=dict)
    smooth: bool = False

    @property
    def modules(self) -> tuple[str, ...]:
        """What a drawing process had better load while it still waits for its job."""
        return (self.factory.partition(":")[0], *(("render.picture.edges",) if self.smooth else ()))

    def open(self, study: Study, slot: str, size_px: tuple[int, int]) -> AbstractContextManager[FrameSource]:
        """Open the source for one slot and frame size; it is closed on leaving the context."""
        module, _, name = self.factory.partition(":")
        opener = cast(Opener, getattr(importlib.import_module(module), name))
        return opener(study, slot, size_px, **self.options)
