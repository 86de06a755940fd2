"""The drawn overlay: its marks stand where the study says, and people with any eyes can tell them apart."""

from __future__ import annotations

import math
from itertools import combinations, pairwise

import numpy as np
import pytest
from hypothesis import given
from hypothesis import strategies as st
from PIL import Image, ImageDraw

from render.output import ink
from render.output.bar import MarginBar, bar_scale
from render.output.card import card_texts, viewing_widths
from render.output.overlay import STRIP, Overlay
from render.output.side_view import SideView
from render.output.texts import overlay_texts
from render.output.timeline import Timeline
from render.picture.panini import Panini
from render.types import Study
from tests.output.made_up import made_up_study

SIZE = (1280, 720)


def fault_s(study: Study) -> float:
    assert study.faulted.fault_s is not None
    return study.faulted.fault_s


@pytest.mark.parametrize("after_s", [-3.0, 0.0, 0.7, 1.9, 2.4, 4.0, 6.0])
def test_bar_ends_at_the_margin(study: Study, after_s: float) -> None:
    """The white line at the bar's end is where the axis puts the seconds left, to 2 pixels."""
    time_s = fault_s(study) + after_s
    bar = MarginBar(study, "right", (900, 114), 1.0)
    image = np.asarray(bar.draw(overlay_texts(study, "right", time_s), time_s)).astype(int)
    row = np.abs(image[79] - ink.WHITE).max(axis=-1) < 10  # just under the bar: only this line and the zero's reach it
    columns = np.flatnonzero(np.abs(image[32] - ink.WHITE).max(axis=-1) < 10)
    want = bar.x(2.0 - after_s)
    assert np.min(np.abs(columns - want)) <= 2 and row.any()
    # linear axis: two seconds take twice the pixels of one
    assert bar.x(2.0) - bar.x(0.0) == pytest.approx(2 * (bar.x(1.0) - bar.x(0.0)), rel=1e-12)


def test_bar_marks_are_the_margin_when_noticed(study: Study) -> None:
    """Last pull 2.0 s after the fault, noticed 1.5 and 2.6 s after it: 0.5 s left and 0.6 s too late."""
    scale = bar_scale(study, "right")
    assert {o: round(left, 9) for o, (_, left) in scale.notices.items()} == {"early": 0.5, "likely": -0.6}
    assert scale.blind == ("late",) and scale.reaction_s == (0.8, 1.5, 3.0)
    assert scale.left_s <= 2.0 - 6.9 and scale.right_s >= 3.0


def test_reaction_is_orange_from_the_last_pull_on(study: Study) -> None:
    bar = MarginBar(study, "right", (900, 114), 1.0)
    time_s = fault_s(study) - 3.0
    image = np.asarray(bar.draw(overlay_texts(study, "right", time_s), time_s)).astype(int)
    row = image[38]  # near the bar's upper edge, over its words
    # solid for what even the early observer needs; blue beyond what the late one needs; empty beyond what is left
    assert np.abs(row[round(bar.x(0.3))] - ink.ORANGE).max() < 10
    assert np.abs(row[round(bar.x(4.0))] - ink.SKY).max() < 10
    assert np.abs(row[round(bar.x(6.0))] - ink.PANEL).max() < 10
    between = row[round(bar.x(1.7)) : round(bar.x(2.9))]
    assert np.abs(between - ink.ORANGE).max(axis=1).min() < 40 and np.abs(between - ink.SKY).max(axis=1).min() < 40


def test_play_position_moves_linearly(study: Study) -> None:
    line = Timeline(study, "right", 10.0, 30.0, (1000, 64), 1.0)
    for time_s, part in ((10.0, 0.0), (15.0, 0.25), (30.0, 1.0)):
        assert line.x(time_s) == pytest.approx(16 + part * 968)
        column = np.asarray(line.draw(time_s))[29 - 5, :].astype(int)
        white = np.flatnonzero(np.abs(column - ink.WHITE).max(axis=-1) < 10)
        assert np.min(np.abs(white - line.x(time_s))) <= 5


def test_side_view_has_one_scale_and_turns_with_the_path(healthy_study: Study) -> None:
    """A loop of 500 m radius is drawn as a circle."""
    view = SideView(healthy_study, "right", 3.0, 29.0, (250, 216), 1.0)
    image = np.asarray(view.draw(3.0)).astype(int)
    rows, columns = np.nonzero(np.abs(image - ink.SKY).max(axis=-1) < 40)
    assert np.ptp(rows) == pytest.approx(1000 * view._scale, abs=6)
    assert np.ptp(columns) == pytest.approx(1000 * view._scale, abs=6)


def test_only_its_rectangles_are_touched(study: Study) -> None:
    frame = np.full((720, 1280, 3), 77, np.uint8)
    Overlay(study, "right", SIZE, 14.0, 28.0).draw(frame, fault_s(study))
    touched = (frame != 77).any(axis=-1)
    assert touched[720 - STRIP :].all()
    assert not touched[240 : 720 - STRIP].any() and not touched[110:240, :1000].any()


def test_the_caption_keeps_clear_of_a_low_upper_picture(study: Study) -> None:
    frame = np.full((720, 1280, 3), 77, np.uint8)
    Overlay(study, "right", SIZE, 14.0, 28.0, caption_bottom_px=270).draw(frame, fault_s(study))
    touched = (frame != 77).any(axis=-1)[:, :1000]
    rows = np.flatnonzero(touched[: 720 - STRIP].any(axis=1))
    assert rows[-1] == 270 - 14 - 1 and rows[0] > 130


@pytest.mark.parametrize("size", [(640, 360), (1920, 1080), (1024, 768), (160, 120)])
def test_overlay_draws_at_every_size(size: tuple[int, int]) -> None:
    for study in (made_up_study(), made_up_study(fault=False, units="metres")):
        frame = np.zeros((size[1], size[0], 3), np.uint8)
        Overlay(study, "left", size, 14.0, 27.0, note="a note").draw(frame, 20.0, "a caption")
        assert frame[-round(STRIP * size[1] / 720) :].any(axis=-1).all()


def test_same_frame_twice(study: Study) -> None:
    made = []
    for _ in range(2):
        frame = np.zeros((360, 640, 3), np.uint8)
        Overlay(study, "right", (640, 360), 14.0, 28.0).draw(frame, 21.3)
        made.append(frame)
    np.testing.assert_array_equal(*made)


# Machado, Oliveira & Fernandes 2009, IEEE TVCG 15:1291-1298, severity 1.0, linear RGB; numbers from memory.
DEUTAN = np.array([[0.367322, 0.860646, -0.227968], [0.280085, 0.672501, 0.047413], [-0.011820, 0.042940, 0.968881]])
PROTAN = np.array([[0.152286, 1.052583, -0.204868], [0.114503, 0.786281, 0.099216], [-0.003882, -0.048116, 1.051998]])
# IEC 61966-2-1 (sRGB): linear RGB to XYZ, D65
XYZ = np.array([[0.4124, 0.3576, 0.1805], [0.2126, 0.7152, 0.0722], [0.0193, 0.1192, 0.9505]])


def lab(colour: ink.Colour, eyes: np.ndarray) -> np.ndarray:
    """CIE 1976 L*a*b* of an sRGB colour as seen with given eyes."""
    c = np.array(colour) / 255
    linear = np.where(c <= 0.04045, c / 12.92, ((c + 0.055) / 1.055) ** 2.4)
    x, y, z = XYZ @ np.clip(eyes @ linear, 0, 1) / (XYZ @ np.ones(3))
    f = [v ** (1 / 3) if v > (6 / 29) ** 3 else v / (3 * (6 / 29) ** 2) + 4 / 29 for v in (x, y, z)]
    return np.array([116 * f[1] - 16, 500 * (f[0] - f[1]), 200 * (f[1] - f[2])])


@pytest.mark.parametrize("eyes", [np.eye(3), DEUTAN, PROTAN], ids=["all colours", "deutan", "protan"])
def test_neighbouring_colours_are_told_apart(eyes: np.ndarray) -> None:
    """Colours that touch each other in the bar lie far apart (a difference of 2.3 is just noticeable)."""
    touching = ("SKY", "ORANGE", "PANEL", "WHITE"), ("VERMILION", "YELLOW", "BACK", "WHITE"), ("SKY", "VERMILION")
    for group in touching:
        for a, b in combinations(group, 2):
            distance = np.linalg.norm(lab(getattr(ink, a), eyes) - lab(getattr(ink, b), eyes))
            assert distance > 20, (a, b, distance)


def test_words_stand_out_in_grey() -> None:
    """Contrast of text on its panel of at least 4.5:1 (WCAG 2.1, success criterion 1.4.3)."""

    def luminance(colour: ink.Colour) -> float:
        c = np.array(colour) / 255
        return float(XYZ[1] @ np.where(c <= 0.04045, c / 12.92, ((c + 0.055) / 1.055) ** 2.4))

    for front, back in (("WHITE", "BACK"), ("QUIET", "BACK"), ("YELLOW", "BACK"), ("SKY", "BACK"), ("QUIET", "PANEL")):
        high, low = luminance(getattr(ink, front)), luminance(getattr(ink, back))
        assert (high + 0.05) / (low + 0.05) > 4.5, (front, back)
    # the big figure on its block is large text: 3:1
    assert (luminance(ink.WHITE) + 0.05) / (luminance(ink.VERMILION) + 0.05) > 3.0


@given(
    st.lists(st.tuples(st.floats(-100, 1100), st.floats(10, 120)), min_size=1, max_size=7),
)
def test_labels_never_overlap(places: list[tuple[float, float]]) -> None:
    places.sort()
    lefts = ink.spread([c for c, _ in places], [w for _, w in places], 0.0, 1000.0, 8.0)
    ends = [left + w for left, (_, w) in zip(lefts, places, strict=True)]
    assert lefts[0] >= -1e-9 and ends[-1] <= 1000 + 1e-9
    assert all(b - a >= 8 - 1e-9 for (a, _), (_, b) in pairwise(zip(ends, lefts, strict=True)))


def test_font_has_latin_greek_and_cyrillic() -> None:
    face = ink.font(30)
    boxes = {bytes(face.getmask(c)) for c in ("\ue123", "\ue124")}  # private use: the font's missing-glyph box
    assert len(boxes) == 1
    for letter in "AéßñΩπλЖяЩł":
        assert bytes(face.getmask(letter)) not in boxes, letter


def test_words_are_placed_as_the_font_places_them() -> None:
    """Cached words give the same line as drawing the whole text, to a pixel."""
    face = ink.font(26, True)
    ours, whole = Image.new("RGB", (500, 60)), Image.new("RGB", (500, 60))
    ink.put_words(ours, 20, 30, "2.4 s after the fault", face, ink.WHITE)
    ImageDraw.Draw(whole).text((20, 30), "2.4 s after the fault", fill=ink.WHITE, font=face, anchor="lm")
    for axis in (0, 1):
        got, want = (np.flatnonzero(np.asarray(i).any(axis=(axis, 2))) for i in (ours, whole))
        assert abs(got[0] - want[0]) <= 1 and abs(got[-1] - want[-1]) <= 1


def test_viewing_distance() -> None:
    """width / (2 tan(field/2)): a right angle is true from half a width; 53.13 deg (3-4-5 triangle) from one width."""
    assert viewing_widths(math.pi / 2) == pytest.approx(0.5, rel=1e-12)
    assert viewing_widths(2 * math.atan(0.5)) == pytest.approx(1.0, rel=1e-12)
    # wide pictures are squeezed: a field of 120 deg fills 2 x 2 tan(30 deg) distances, not 2 tan(60 deg)
    assert viewing_widths(math.radians(120)) == pytest.approx(math.sqrt(3) / 4, rel=1e-12)
    assert viewing_widths(math.radians(120)) == pytest.approx(Panini(math.radians(120), (640, 360)).focal_px / 640)


def test_card_says_what_it_must(study: Study) -> None:
    texts = card_texts(study, "right")
    assert texts.viewing == "Angles are true from 0.65 picture widths away (field 75 deg)."
    assert texts.source == "Scene: made_up. latepull 0.1.0, numpy 2.0."
    assert texts.caution == (
        "A training illustration, not a clearance. The authority's rules, the aircraft's manual and licensed "
        "practice come first."
    )
    assert texts.figures == (
        ("Last pull to clear the floor (100 ft)", "2.0 s after the fault"),
        ("Last pull to clear the ground", "2.5 s after the fault"),
        ("Ground contact if nobody acts", "6.9 s after the fault"),
    )
    assert texts.observers == (
        ("early", "could notice 1.5 s after the fault, by horizon's tilt", "too late by 0.3 s with 0.8 s reaction"),
        ("likely", "could notice 2.6 s after the fault, by ground closing", "too late by 2.1 s with 1.5 s reaction"),
        ("late", "never noticed", ""),
    )
