"""Which instant each frame shows."""

from __future__ import annotations

import dataclasses

import numpy as np
import pytest

from render.errors import LatepullError
from render.output.ink import font
from render.output.shot import Hold, Slow, default_range, key_holds, plan_shot
from render.types import Study
from scenes.model import Captions


def test_default_film_runs_from_before_the_top_to_contact(study: Study) -> None:
    start, end = default_range(study, "right")
    assert start == pytest.approx(study.faulted.events["top"] - 3.0)
    assert end == study.faulted.contact_s[1]
    shot = plan_shot(study, "right")
    assert (shot.size_px, shot.rate_fps) == ((1280, 720), 30.0)
    run = shot.time_s[~shot.card]
    assert run[0] == start and run[-1] == pytest.approx(end, abs=1 / 30)
    np.testing.assert_allclose(np.diff(run)[:-1], 1 / 30, rtol=1e-9)
    assert int(shot.card.sum()) == 150 and not shot.card[: len(run)].any()


def test_default_film_of_a_healthy_loop_ends_after_the_bottom(healthy_study: Study) -> None:
    _, end = default_range(healthy_study, "left")
    assert end == pytest.approx(healthy_study.faulted.events["bottom"] + 2.0, abs=1e-9)


def test_holds_and_slow_motion_keep_every_instant(study: Study) -> None:
    shot = plan_shot(
        study, "right", start_s=20.0, end_s=22.0, rate_fps=10, card_s=0.0,
        holds=(Hold(20.5, 1.0, "here"),), slow=(Slow(21.0, 21.5, 4.0),),
    )  # fmt: skip
    # 2 s of flight + 1 s held + 0.5 s made 2 s long: 4.5 s, 46 frames with both ends
    assert len(shot) == 46
    held = [i for i, words in enumerate(shot.caption) if words == "here"]
    assert len(held) == 10 and np.all(shot.time_s[held] == 20.5)
    slow = np.array([words.startswith("slow motion: 4 times") for words in shot.caption])
    assert int(slow.sum()) == 20
    np.testing.assert_allclose(np.diff(shot.time_s[slow]), 0.025, rtol=1e-9)
    assert np.all(np.diff(shot.time_s) >= 0) and shot.time_s[-1] == 22.0


def test_key_holds_name_their_moments(study: Study) -> None:
    assert [h.caption for h in key_holds(study, "right")] == [
        "The fault: stabilator frozen",
        "Early observer could notice: horizon's tilt, 1.5 s after the fault",
        "Last pull to clear the floor, 2.0 s after the fault",
        "Likely observer could notice: ground closing, 2.6 s after the fault",
    ]


def test_range_outside_the_flight(study: Study) -> None:
    with pytest.raises(LatepullError, match="film from 30 s to 20 s: the flight runs from 0 s to 36 s"):
        plan_shot(study, "right", start_s=30.0, end_s=20.0)
    with pytest.raises(LatepullError, match="rate 500"):
        plan_shot(study, "right", rate_fps=500)


def test_captions_of_the_scene_take_the_place_of_the_english_ones(study: Study) -> None:
    words = Captions(fault="Стабилизатор застыл", last_pull="Τελευταίο τράβηγμα, {seconds} s")
    film = dataclasses.replace(study.scene.film, captions=words)
    told = dataclasses.replace(study, scene=dataclasses.replace(study.scene, film=film))
    english = {h.caption for h in key_holds(study, "right")}
    captions = [h.caption for h in key_holds(told, "right")]
    pull_s = study.margin.last_pull_floor_s[1] - study.faulted.fault_s
    assert captions[0] == "Стабилизатор застыл" and f"Τελευταίο τράβηγμα, {pull_s:.1f} s" in captions
    assert len(set(captions) & english) == len(captions) - 2


def test_fonts_hold_latin_cyrillic_and_greek() -> None:
    blank = bytes(font(20).getmask("\uffff"))  # what is drawn for a letter that a font hasn't
    shapes = [bytes(font(20).getmask(letter)) for letter in "ÄñőЖщяΩψξ"]
    assert blank not in shapes and len(set(shapes)) == len(shapes)
