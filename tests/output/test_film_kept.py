"""An interrupted film: its finished pieces are kept, a resumed one is the same film, and nothing is drawn twice."""

from __future__ import annotations

import os
from pathlib import Path

import numpy as np
import pytest

from render.errors import LatepullError, MachineError
from render.output import film
from render.output.film import write_film
from render.output.parts import kept_folder, kept_frames
from render.output.source import SourceSpec
from render.types import Study
from tests.output.test_film import START_S, decoded, grey, short_shot

FAIL = {"fail": "error", "fail_s": START_S + 1.05}


@pytest.fixture
def cut_off(study: Study, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> Path:
    """A film that failed at its 11th frame of 15, in pieces of 4."""
    monkeypatch.setattr(film, "PIECE", 4)
    target = tmp_path / "film.mp4"
    with pytest.raises(MachineError):
        write_film(study, "right", target, shot=short_shot(study), source=grey(**FAIL), workers=1, keep=True)
    return target


def test_finished_pieces_are_kept_and_nothing_else(cut_off: Path) -> None:
    assert kept_frames(cut_off) == (8, 20)
    there = sorted(p.name for p in kept_folder(cut_off).iterdir())
    assert there == ["key.json", "overlay_000.mp4", "overlay_001.mp4"]
    assert not cut_off.exists()


def test_a_resumed_film_draws_only_what_is_missing(study: Study, cut_off: Path) -> None:
    before = {p.name: p.stat().st_mtime_ns for p in kept_folder(cut_off).glob("*.mp4")}
    # a source that fails at once, were it asked for a frame of a kept piece
    early = SourceSpec("tests.output.drawn:open_grey", {"start_s": START_S, **FAIL})
    calls: list[int] = []
    with pytest.raises(MachineError):
        write_film(study, "right", cut_off, shot=short_shot(study), source=early, workers=1, keep=True, resume=True,
                   progress=lambda done, total: calls.append(done))  # fmt: skip
    assert min(calls) >= 8
    assert {p.name: p.stat().st_mtime_ns for p in kept_folder(cut_off).glob("*.mp4")} == before


def test_a_resumed_film_is_the_film(study: Study, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setattr(film, "PIECE", 4)
    flag = tmp_path / "flag"
    flag.touch()
    spec = SourceSpec("tests.output.drawn:open_grey", {"start_s": START_S, **FAIL, "fail_while": str(flag)})
    shot = short_shot(study)
    plain = tmp_path / "plain.mp4"
    with pytest.raises(MachineError):
        write_film(study, "right", tmp_path / "a.mp4", shot=shot, source=spec, plain_path=plain, workers=1, keep=True)
    assert kept_frames(tmp_path / "a.mp4") == (8, 20)
    os.remove(flag)
    write_film(study, "right", tmp_path / "a.mp4", shot=shot, source=spec, plain_path=plain, workers=1, keep=True,
               resume=True)  # fmt: skip
    write_film(study, "right", tmp_path / "b.mp4", shot=shot, source=spec, workers=1, keep=True)
    assert np.array_equal(decoded(tmp_path / "a.mp4"), decoded(tmp_path / "b.mp4"))
    assert len(decoded(plain)) == 20
    assert kept_frames(tmp_path / "a.mp4") == (0, 0)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["a.mp4", "b.mp4", "plain.mp4"]


def test_frames_of_another_film_are_refused(study: Study, cut_off: Path) -> None:
    other = short_shot(study, end_s=START_S + 1.2)
    with pytest.raises(LatepullError, match="are of another film"):
        write_film(study, "right", cut_off, shot=other, source=grey(), workers=1, keep=True, resume=True)
    assert kept_frames(cut_off) == (8, 20), "what is kept stays kept"
    write_film(study, "right", cut_off, shot=other, source=grey(), workers=1, keep=True)
    assert len(decoded(cut_off)) == len(other) and not kept_folder(cut_off).exists()
