"""Whatever stands in a scene file, the reader gives a Scene or a SceneError, never another exception."""

from __future__ import annotations

import copy
import random
from typing import Any

import pytest
import yaml
from hypothesis import given, settings
from hypothesis import strategies as st

from scenes.complaint import SceneError
from scenes.model import Scene
from scenes.reader import read_scene_text
from tests.scenes.made import WHOLE


def scene_or_error(text: str) -> Scene | SceneError:
    """The scene, or the error with at least one complaint and a place in each; the error can be printed."""
    try:
        return read_scene_text(text, "s.yaml")
    except SceneError as exc:
        assert exc.complaints
        for one in exc.complaints:
            assert one.file and one.read and one.wanted
        str(exc).encode("utf-8")
        return exc


CHARACTERS = st.one_of(st.characters(), st.sampled_from("\0\t\n\r :{}[],&*!|>'\"%@`#-?~<=.\ufeff\u2028\x85\x7f"))


@settings(max_examples=150)
@given(st.integers(0, len(WHOLE) - 1), CHARACTERS, st.sampled_from(["replace", "insert", "delete"]))
def test_one_wrong_character(place: int, character: str, how: str) -> None:
    """Any character anywhere put in, taken out or replaced."""
    after = place + (how != "insert")
    scene_or_error(WHOLE[:place] + ("" if how == "delete" else character) + WHOLE[after:])


@settings(max_examples=60)
@given(st.integers(0, len(WHOLE)))
def test_a_file_cut_off(end: int) -> None:
    """As a disk that was full leaves it."""
    assert scene_or_error(WHOLE[:end])


@settings(max_examples=100)
@given(st.text(max_size=60))
def test_any_text_at_all(text: str) -> None:
    """Never a scene: none so short can be one."""
    assert isinstance(scene_or_error(text), SceneError)


VALUES: list[Any] = [None, "", "none", 0, -1, 1e308, float("nan"), float("inf"), True, [], {}, [[]], [1, 2], {"a": 1},
                     "1 kt", "9" * 400, "385 kt", "x" * 300, "\u0661\u0662 kt", "1_000 ft", "0x10 m", "-0 ft", {1: 2}]


def nodes(plain: Any, path: tuple[Any, ...] = ()) -> list[tuple[Any, ...]]:
    """Paths of all values."""
    below: list[tuple[Any, ...]] = []
    if isinstance(plain, dict):
        below = [p for key, value in plain.items() for p in nodes(value, (*path, key))]
    if isinstance(plain, list):
        below = [p for i, value in enumerate(plain) for p in nodes(value, (*path, i))]
    return [path, *below] if path else below


PLAIN = yaml.safe_load(WHOLE)
PATHS = nodes(PLAIN)


@pytest.mark.parametrize("path", PATHS, ids=[".".join(map(str, path)) for path in PATHS])
def test_any_value_in_any_place(path: tuple[Any, ...]) -> None:
    """Each odd value in place of each value of the scene: read or refused at that place or above it."""
    for value in random.Random(str(path)).sample(VALUES, 5):
        node = plain = copy.deepcopy(PLAIN)
        for key in path[:-1]:
            node = node[key]
        node[path[-1]] = value
        result = scene_or_error(yaml.safe_dump(plain, allow_unicode=True))
        assert isinstance(result, Scene | SceneError)
