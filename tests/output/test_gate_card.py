"""The gate card: its words, its sizes, and that nothing on it sounds like a leave to fly."""

from __future__ import annotations

import json
import re
from functools import lru_cache
from pathlib import Path

import numpy as np
import pytest
from PIL import Image

from render.decide.brief import brief
from render.decide.gate_extras import Float
from render.decide.gate_sheet import GateSheet
from render.decide.gates import Gate
from render.decide.worst import Worst
from render.errors import OutputExists
from render.frames import Array
from render.output import gate_words as words
from render.output.gate_card import write_gate_card
from tests.flight.made import DEG, FT, KT, invented_jet, loop_scene

LEAVE = re.compile(r"\b(safe|ok|okay|cleared|approved?|allow\w*|permit\w*|permission|acceptable|authoris\w*|"
                   r"authoriz\w*|recommend\w*|fit to|good to|go|legal|enough)\b", re.IGNORECASE)


def made_gate(name: str, *, none: bool = False, jump: bool = False, lower: float = 0.0) -> Gate:
    """A gate with made-up figures."""
    speed = np.array([190.0, 200.0, 210.0]) * KT
    height = np.array([5500.0, 5900.0, 6300.0]) * FT
    noticed = (height[:, None] + np.array([900.0, 1200.0, 1700.0]) * FT) - lower * FT
    there = np.full((3, 3), np.inf if jump else 1.5)
    if none:
        noticed, there = np.full((3, 3), np.nan), np.full((3, 3), np.nan)
    return Gate(name, speed, 1, float(height[1]), height, np.full(3, 4000.0 * FT), noticed, there,
                np.full((3, 3), 260.0 * DEG), "nothing shows it" if none else "")


def made_worst(left: Array, deg: float = 260.0, cue: str = "tilt") -> Worst:
    """The worst freeze of one loop."""
    return Worst(np.array([deg * DEG]), left.reshape(1, 1, 3), np.array([[12.0]]), left.reshape(1, 3),
                 np.full((1, 3), deg * DEG), ((cue, cue, cue),), np.zeros((1, 3), dtype=bool))


@lru_cache
def sheet(kind: str = "short") -> GateSheet:
    """A sheet with made-up figures: short | over | none."""
    flown = brief(loop_scene(), lambda _: invented_jet())
    gates = {name: made_gate(name, none=kind == "none", jump=kind == "over", lower=1500.0 if kind == "over" else 0.0)
             for name in ("top", "vertical_down")}
    left = np.array([-3.2, -4.5, -6.9]) if kind == "short" else np.full(3, np.inf if kind == "over" else -np.inf)
    nan = float("nan")
    floats = {k: Float(0.15, 0.5, False) for k in ("briefed", "limit", "early", "likely", "late")}
    if kind == "none":
        floats["likely"] = Float(nan, nan, False)
    base = np.full(3, nan) if kind == "none" else np.array([1060.0, 1310.0, 1650.0]) * FT
    change = (160.0 * FT, 140.0 * FT, nan if kind == "none" else 230.0 * FT)
    days = {day: {g: change for g in gates} for day in ("hotter", "higher")}
    return GateSheet(flown.scene, invented_jet(), flown, 1.5, True, gates, {g: made_worst(left) for g in gates}, base,
                     "it never shows" if kind == "none" else "", floats, days)


@pytest.mark.parametrize("kind", ["short", "over", "none"])
def test_no_word_of_it_sounds_like_a_leave(kind: str) -> None:
    text = words.sheet_text(sheet(kind))
    assert LEAVE.search(text) is None
    assert "A training illustration, not a clearance." in text and "come first." in text
    assert "nan" not in text.lower().replace("balance", "")


def test_headlines() -> None:
    assert words.headline(sheet("short"), "top") == ("Top: 1,200 ft too low to leave 1.5 s", "short")
    assert words.headline(sheet("over"), "top") == ("Top: 300 ft above the height that leaves 1.5 s", "over")
    assert words.headline(sheet("none"), "vertical_down") == ("Vertical down: no height leaves 1.5 s", "none")


def test_figures_are_rounded_up_and_bands_have_three() -> None:
    assert words.rows(sheet("short"), "top") == [
        ("this loop", "5,900 ft"), ("closes at 300 ft, briefed pull", "5,900 ft"),
        ("closes at 300 ft, limit pull (7.5 g)", "4,000 ft"),
        ("any freeze leaves 1.5 s: early / likely / late", "6,800 / 7,100 / 7,600 ft"),
    ]
    units = words.Units("feet")
    assert words.rounded_up(units, 7091.2 * FT) == "7,100 ft" and words.rounded_up(units, 7100.0 * FT) == "7,100 ft"


def test_what_the_worst_freeze_leaves_is_said_in_words() -> None:
    assert words.held_words(sheet("short"), "top") == (
        "from the top on: at 260 deg; his hand moves 4.5 s after the last pull (likely, by horizon's tilt).")
    assert "stay above the floor by themselves" in words.held_words(sheet("over"), "top")
    assert "nothing shows it" in words.held_words(sheet("none"), "top")


def test_the_figures_for_a_program_are_json() -> None:
    for kind in ("short", "over", "none"):
        plain = json.loads(json.dumps(words.plain_sheet(sheet(kind)), allow_nan=False))
        assert plain["gates"]["top"]["this_loop"]["height_m"] == pytest.approx(5900.0 * FT)
    assert plain["base_needed_m"]["likely"] is None


def test_card_is_a5_and_whole_or_not_at_all(tmp_path: Path) -> None:
    png, pdf = write_gate_card(sheet("short"), tmp_path / "card")
    with Image.open(png) as image:
        assert image.size == (pytest.approx(148 / 25.4 * 200, abs=1), pytest.approx(210 / 25.4 * 200, abs=1))
    box = re.search(rb"/MediaBox \[ ?([0-9. ]+) ?\]", pdf.read_bytes())
    assert box is not None
    width, height = (float(v) for v in box[1].split()[2:])
    assert (width / 72 * 25.4, height / 72 * 25.4) == (pytest.approx(148, abs=0.2), pytest.approx(210, abs=0.2))
    with pytest.raises(OutputExists):
        write_gate_card(sheet("short"), tmp_path / "card")
    assert sorted(p.name for p in tmp_path.iterdir()) == ["card.pdf", "card.png"]
    for kind in ("over", "none"):
        write_gate_card(sheet(kind), tmp_path / kind)
