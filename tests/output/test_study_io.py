"""A study saved and loaded is the same study; a wrong one is refused by name."""

from __future__ import annotations

import json
from dataclasses import fields, is_dataclass
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from render.study_io import StudyChanged, StudyDamaged, StudyMissing, StudyVersion, load_study, save_study
from render.types import Study
from tests.output.made_up import SCENE_TEXT


def assert_same(a: Any, b: Any, where: str = "study") -> None:
    """Equal field by field, arrays bit by bit."""
    assert type(a) is type(b) or isinstance(a, dict), where
    if is_dataclass(a):
        for f in fields(a):
            assert_same(getattr(a, f.name), getattr(b, f.name), f"{where}.{f.name}")
    elif isinstance(a, np.ndarray):
        np.testing.assert_array_equal(a, b, err_msg=where)
        assert a.dtype == b.dtype and not b.flags.writeable
    elif isinstance(a, dict):
        assert a.keys() == b.keys()
        for key in a:
            assert_same(a[key], b[key], f"{where}.{key}")
    elif isinstance(a, tuple):
        assert len(a) == len(b)
        for i, (x, y) in enumerate(zip(a, b, strict=True)):
            assert_same(x, y, f"{where}.{i}")
    else:
        assert a == b, where


def test_round_trip(study: Study, tmp_path: Path) -> None:
    save_study(study, tmp_path)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["study.json", "study.npz"]
    assert_same(study, load_study(tmp_path, scene_text=SCENE_TEXT))


def test_a_scene_without_fault_keeps_one_flight(healthy_study: Study, tmp_path: Path) -> None:
    back = load_study(save_study(healthy_study, tmp_path))
    assert back.faulted is back.healthy
    assert_same(healthy_study, back)


def test_refusals(study: Study, tmp_path: Path) -> None:
    with pytest.raises(StudyMissing, match="run `latepull fly`"):
        load_study(tmp_path)
    save_study(study, tmp_path)
    with pytest.raises(StudyChanged, match="the scene was edited since"):
        load_study(tmp_path, scene_text=SCENE_TEXT + "floor: 200 ft\n")
    text = tmp_path / "study.json"
    good = text.read_text()
    text.write_text(json.dumps({**json.loads(good), "format": 99}))
    with pytest.raises(StudyVersion, match="saved in format 99, this version reads 1"):
        load_study(tmp_path)
    text.write_text(good[: len(good) // 2])
    with pytest.raises(StudyDamaged, match="is not a saved study"):
        load_study(tmp_path)
    text.write_text(good.replace("stabilator frozen after the top\\n", "something else\\n"))
    with pytest.raises(StudyDamaged, match="was altered after the flight"):
        load_study(tmp_path)
    text.write_text(good.replace('"type": "Watch"', '"type": "os"'))
    with pytest.raises(StudyDamaged, match="can't be read back"):
        load_study(tmp_path)
    text.write_text(good)
    (tmp_path / "study.npz").write_bytes((tmp_path / "study.npz").read_bytes()[:-100])
    with pytest.raises(StudyDamaged, match="does not belong to"):
        load_study(tmp_path)
