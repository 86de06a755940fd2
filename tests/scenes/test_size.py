"""Sizes of a film against the encoder itself: ffmpeg's libx264 with yuv420p."""

from __future__ import annotations

import subprocess

import imageio_ffmpeg
import pytest
from hypothesis import given
from hypothesis import strategies as st

from scenes.rules import LEAST_SIZE, MACROBLOCKS, nearest_size


def encoder_takes(width: int, height: int) -> bool:
    """Whether one grey frame of the size is encoded within level 5.2 without complaint."""
    command = [imageio_ffmpeg.get_ffmpeg_exe(), "-v", "warning", "-f", "rawvideo", "-pix_fmt", "gray", "-s",
               f"{width}x{height}", "-r", "30", "-i", "-", "-c:v", "libx264", "-preset", "ultrafast", "-pix_fmt",
               "yuv420p", "-level:v", "5.2", "-f", "null", "-"]
    done = subprocess.run(command, input=bytes(width * height), capture_output=True, check=False)
    return done.returncode == 0 and b"frame MB size" not in done.stderr


@pytest.mark.parametrize(
    ("asked", "fits"),
    [((1281, 720), (1280, 720)), ((1280, 721), (1280, 720)), ((4096, 2306), (4096, 2304)),
     ((3841, 2161), (3840, 2160))],
)
def test_the_encoder_agrees(asked: tuple[int, int], fits: tuple[int, int]) -> None:
    """It refuses the size that is refused and takes the nearest: the rule is the encoder's, not ours."""
    assert nearest_size(*asked) == fits
    assert not encoder_takes(*asked)
    assert encoder_takes(*fits)


@given(st.integers(0, 20_000), st.integers(0, 20_000))
def test_the_nearest_size_always_fits(width: int, height: int) -> None:
    """Even, within the limits, and itself its nearest."""
    w, h = nearest_size(width, height)
    assert w % 2 == h % 2 == 0 and w >= LEAST_SIZE[0] and h >= LEAST_SIZE[1]
    assert -(-w // 16) * -(-h // 16) <= MACROBLOCKS
    assert nearest_size(w, h) == (w, h)
