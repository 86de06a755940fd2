"""Frame sources for tests of films: each frame's grey says which instant it shows. Opened by name in the workers."""

from __future__ import annotations

import os
import signal
import time
from collections.abc import Iterator
from contextlib import contextmanager

import numpy as np

from render.errors import MachineError
from render.types import Study


class Grey:
    """A flat grey of 20 levels a second of flight from ``start_s``; optional misbehaviour at an instant."""

    def __init__(self, size_px: tuple[int, int], start_s: float, fail: str, fail_s: float, slow_s: float) -> None:
        self._frame = np.zeros((size_px[1], size_px[0], 3), np.uint8)
        self._start_s, self._fail, self._fail_s, self._slow_s = start_s, fail, fail_s, slow_s

    def frame(self, time_s: float) -> np.ndarray:
        """The grey of an instant."""
        time.sleep(self._slow_s)
        if self._fail and time_s >= self._fail_s:
            if self._fail == "error":
                raise MachineError("no software OpenGL here: made up for a test")
            if self._fail == "bug":
                raise RuntimeError("a bug made up for a test")
            os.kill(os.getpid(), signal.SIGSEGV)
        self._frame[:] = grey_of(time_s - self._start_s)
        return self._frame


def grey_of(since_s: float) -> int:
    """Grey level of an instant."""
    return round(40 + 20 * since_s) % 256


@contextmanager
def open_grey(
    study: Study, slot: str, size_px: tuple[int, int], *, start_s: float = 0.0, fail: str = "", fail_s: float = 0.0,
    slow_s: float = 0.0, fail_while: str = "",
) -> Iterator[Grey]:
    """Open the grey source; it misbehaves only while the file ``fail_while`` is there, if one is named."""
    if fail_while and not os.path.exists(fail_while):
        fail = ""
    yield Grey(size_px, start_s, fail, fail_s, slow_s)
