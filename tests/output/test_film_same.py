"""The same scene gives the same film twice: each frame's hash, whatever the number of drawing processes."""

from __future__ import annotations

import hashlib
import subprocess
from pathlib import Path

import imageio_ffmpeg
import pytest

from render.output.film import write_film
from render.output.shot import plan_shot
from render.output.stage_options import StageOptions, stage_spec
from render.types import Study

SIZE = (256, 144)


def frame_hashes(path: Path) -> list[str]:
    """A hash of each decoded frame."""
    command = [imageio_ffmpeg.get_ffmpeg_exe(), "-v", "error", "-i", str(path), "-f", "rawvideo", "-pix_fmt", "rgb24"]
    data = subprocess.run([*command, "-"], capture_output=True, check=True).stdout
    size = SIZE[0] * SIZE[1] * 3
    return [hashlib.sha256(data[i : i + size]).hexdigest() for i in range(0, len(data), size)]


@pytest.mark.draws
def test_the_same_scene_gives_the_same_film_twice(study: Study, tmp_path: Path) -> None:
    shot = plan_shot(study, "right", start_s=20.0, end_s=22.0, size_px=SIZE, rate_fps=10.0, card_s=0.2)
    spec = stage_spec(StageOptions(), SIZE, overlay=True)
    hashes = []
    for name in ("first", "second"):
        write_film(study, "right", tmp_path / f"{name}.mp4", shot=shot, source=spec, workers=2)
        hashes.append(frame_hashes(tmp_path / f"{name}.mp4"))
    assert len(hashes[0]) == len(shot) == 23
    assert len(set(hashes[0])) >= 20  # a moving picture
    assert hashes[0] == hashes[1]
