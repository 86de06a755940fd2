"""Stills: the film's own frame of an instant, and the set of key moments."""

from __future__ import annotations

import subprocess
import sys
from pathlib import Path

import numpy as np
import pytest
from PIL import Image

from render.errors import LatepullError, OutputExists
from render.output.overlay import Overlay
from render.output.shot import default_range
from render.output.source import SourceSpec
from render.output.stills import write_key_stills, write_still
from render.types import Study
from tests.output.drawn import grey_of

GREY = SourceSpec("tests.output.drawn:open_grey", {"start_s": 0.0})
SIZE = (320, 180)


def test_still_is_the_films_frame(study: Study, tmp_path: Path) -> None:
    path = write_still(study, "right", 21.3, tmp_path / "a.png", size_px=SIZE, source=GREY)
    want = np.full((180, 320, 3), grey_of(21.3), np.uint8)
    Overlay(study, "right", SIZE, *default_range(study, "right")).draw(want, 21.3)
    np.testing.assert_array_equal(np.asarray(Image.open(path)), want)
    plain = write_still(study, "right", 21.3, tmp_path / "b.png", size_px=SIZE, source=GREY, overlay=False)
    assert np.all(np.asarray(Image.open(plain)) == grey_of(21.3))


def test_still_outside_the_flight_or_already_there(study: Study, tmp_path: Path) -> None:
    with pytest.raises(LatepullError, match="a still at 99 s: the flight runs from 0 s to 36 s"):
        write_still(study, "right", 99.0, tmp_path / "a.png", size_px=SIZE, source=GREY)
    assert list(tmp_path.iterdir()) == []
    write_still(study, "right", 9.0, tmp_path / "a.png", size_px=SIZE, source=GREY)
    with pytest.raises(OutputExists):
        write_still(study, "right", 9.0, tmp_path / "a.png", size_px=SIZE, source=GREY)


def test_key_stills_are_one_for_each_moment(study: Study, healthy_study: Study, tmp_path: Path) -> None:
    paths = write_key_stills(study, "left", tmp_path, size_px=SIZE, source=GREY)
    assert [p.name for p in paths] == [
        "left_fault.png", "left_visible_early.png", "left_last_pull_floor.png", "left_visible_likely.png",
    ]  # fmt: skip
    # the caption's white banner stands over the strip
    rows = np.asarray(Image.open(paths[0]))[180 - 45 - 16 : 180 - 45 - 4]
    assert (rows > 240).all(axis=-1).any()
    assert write_key_stills(healthy_study, "left", tmp_path, size_px=SIZE, source=GREY) == ()


def test_a_draft_loads_no_compiler() -> None:
    """numba and scipy.interpolate take half of a draft still's time to load; nothing in it needs them."""
    code = ("import sys; import render.output.stills, render.output.stage_source, render.study_io; "
            "print(*sorted({'numba', 'scipy.interpolate', 'matplotlib.pyplot'} & set(sys.modules)))")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, cwd=Path(__file__).parents[2])
    assert (done.stdout.strip(), done.stderr) == ("", "")


def test_a_film_starts_its_workers_before_it_loads_any_drawing() -> None:
    code = ("import sys; import render.output.film, render.output.stage_options, render.study_io; "
            "print(*sorted({'numba', 'scipy', 'pyvista', 'vtkmodules', 'matplotlib'} & set(sys.modules)))")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, cwd=Path(__file__).parents[2])
    assert (done.stdout.strip(), done.stderr) == ("", "")
