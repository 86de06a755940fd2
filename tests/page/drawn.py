"""A frame source whose frames carry their own number as ten black or white blocks, read back in a browser."""

from __future__ import annotations

from collections.abc import Iterator
from contextlib import contextmanager

import numpy as np

from render.types import Study

BITS = 10
BAND = (0.40, 0.56)  # of the height: between the overlay's words and its strip


class Numbered:
    """Frame n of a film that starts at ``start_s``: block i is white if bit i of n is set."""

    def __init__(self, size_px: tuple[int, int], start_s: float, rate_fps: float) -> None:
        self._size, self._start_s, self._rate = size_px, start_s, rate_fps

    def frame(self, time_s: float) -> np.ndarray:
        """The picture of an instant."""
        width, height = self._size
        number = round((time_s - self._start_s) * self._rate)
        frame = np.full((height, width, 3), 96, np.uint8)
        top, bottom = (round(part * height) for part in BAND)
        block = width // BITS
        for i in range(BITS):
            frame[top:bottom, i * block : (i + 1) * block] = 255 if number >> i & 1 else 0
        return frame


@contextmanager
def open_numbered(
    study: Study, slot: str, size_px: tuple[int, int], *, start_s: float, rate_fps: float
) -> Iterator[Numbered]:
    """Open the numbered source."""
    yield Numbered(size_px, start_s, rate_fps)


# Run in the browser: the number of the frame that a video element shows, -1 before the first.
READ_NUMBER = """
(video) => {
  if (video.readyState < 2) return -1;
  const canvas = document.createElement("canvas");
  canvas.width = video.videoWidth; canvas.height = video.videoHeight;
  const context = canvas.getContext("2d");
  context.drawImage(video, 0, 0);
  const y = Math.round(canvas.height * 0.48), block = canvas.width / 10;
  const row = context.getImageData(0, y, canvas.width, 1).data;
  let number = 0;
  for (let i = 0; i < 10; i += 1) if (row[Math.round((i + 0.5) * block) * 4] > 128) number |= 1 << i;
  return number;
}
"""
