"""The overlay's words: exact, and equal to the study's values at the frame's instant."""

from __future__ import annotations

import itertools
import math
import re
from dataclasses import replace

import numpy as np
import pytest

from render.output.card import UNTRUE, card_texts
from render.output.events import study_events
from render.output.texts import OverlayTexts, margin_at, overlay_texts
from render.output.words import Units, cue_words, lateness_words, seconds
from render.types import Study


def test_words_before_the_last_pull_are_exact(study: Study) -> None:
    fault_s = study.faulted.fault_s
    assert fault_s is not None
    got = overlay_texts(study, "right", fault_s + 0.6)
    assert got == OverlayTexts(
        slot="Slot right",
        title="Right wing, line abreast, stabilator frozen after the top",
        since_fault="0.6 s after the fault",
        height="2,420 ft above ground",
        speed="211 kt",
        margin_label="left before the last pull",
        margin_value="1.4 s",
        margin_note="a pull now clears the floor by 280 ft",
        margin_s=got.margin_s,
        state="left",
    )
    assert got.margin_s == pytest.approx(1.4, abs=1e-9)


def test_words_after_the_last_pull_say_since_when(study: Study) -> None:
    assert study.faulted.fault_s is not None
    got = overlay_texts(study, "right", study.faulted.fault_s + 3.2)
    assert (got.margin_label, got.margin_value, got.state) == ("last pull gone since", "1.2 s", "gone")
    assert got.margin_note == "a pull now does not clear the ground"
    between = overlay_texts(study, "right", study.faulted.fault_s + 2.25)
    assert between.margin_note == "a pull now ends 49 ft below the floor"


def test_no_fault_says_that_nothing_runs_out(healthy_study: Study) -> None:
    got = overlay_texts(healthy_study, "left", 10.0)
    assert (got.margin_value, got.state) == ("does not run out", "endless")
    assert got.margin_label == "time to clear the floor (30 m)"
    assert got.margin_note == "a pull now clears the floor by 60 m"
    assert got.since_fault == "no fault in this scene"
    assert math.isnan(got.margin_s)
    assert got.height.endswith(" m above ground") and got.speed.endswith(" km/h")


def test_contact_and_a_lead_without_pull(study: Study) -> None:
    contact, fault_s = study.faulted.contact_s[1], study.faulted.fault_s
    assert contact is not None and fault_s is not None
    assert overlay_texts(study, "right", contact).margin_value == "ground contact"
    assert overlay_texts(study, "lead", fault_s + 0.1).margin_value == "no pull left"
    assert overlay_texts(study, "lead", fault_s - 1.0).since_fault == "1.0 s before the fault"


@pytest.mark.parametrize("time_s", np.linspace(0.0, 26.0, 53))
def test_what_is_printed_is_the_studys_value(study: Study, time_s: float) -> None:
    """The numbers are read back out of the strings and compared with the arrays, within the printed digit."""
    got, k, flight = overlay_texts(study, "left", float(time_s)), 2, study.faulted
    height_ft = float(re.sub(r"[^\d.]", "", got.height))
    true_ft = np.interp(time_s, flight.time_s, flight.height_agl_m[:, k]) / 0.3048
    assert abs(height_ft - true_ft) <= (5.0 if true_ft >= 200 else 0.5) + 1e-6
    speed_kt = float(got.speed.split()[0])
    assert abs(speed_kt - np.interp(time_s, flight.time_s, flight.cas_mps[:, k]) * 3600 / 1852) <= 0.5 + 1e-6
    left = np.interp(time_s, study.margin.time_s, study.margin.seconds_floor_s[:, k])
    if got.state in ("left", "gone"):
        assert float(got.margin_value.split()[0]) == pytest.approx(abs(left), abs=0.05 + 1e-6)
        assert (got.state == "gone") == (left < 0)


def test_margin_beside_a_gap_takes_the_nearer_sample() -> None:
    from render.output.texts import sample

    time, values = np.array([0.0, 1.0, 2.0]), np.array([3.0, np.nan, 1.0])
    assert sample(time, values, 0.4) == 3.0 and math.isnan(sample(time, values, 0.6))
    assert sample(time, values, 5.0) == 1.0 and sample(time, values, -1.0) == 3.0


def test_after_contact_the_time_since_the_last_pull_counts_on(study: Study) -> None:
    """A margin that has no value after contact must not read as one that does not run out."""
    last, contact = study.margin.last_pull_floor_s[1], study.faulted.contact_s[1]
    assert last is not None and contact is not None
    left = np.where(study.margin.time_s[:, None] > contact - 0.5, np.nan, study.margin.seconds_floor_s)
    gap = replace(study, margin=replace(study.margin, seconds_floor_s=left))
    got = overlay_texts(gap, "right", contact - 0.2)
    assert got.state == "gone" and got.margin_s == pytest.approx(last - contact + 0.2)


def test_events_come_in_order_and_end_at_contact(study: Study) -> None:
    events = study_events(study, "right")
    assert [e.kind for e in events] == [
        "vertical_up", "top", "fault", "visible_early", "last_pull_floor", "last_pull_ground", "visible_likely",
        "contact",
    ]  # fmt: skip
    assert events[3].detail == "horizon's tilt" and events[2].detail == "stabilator frozen"
    assert all(a.time_s <= b.time_s for a, b in itertools.pairwise(events))


def test_number_words() -> None:
    feet, metres = Units("feet"), Units("metres")
    # 1 kt = 1852/3600 m/s and 1 ft = 0.3048 m by definition: 385 kt and 100 ft there and back
    assert feet.speed(385 * 1852 / 3600) == "385 kt" and feet.length(30.48) == "100 ft"
    assert metres.speed(100.0) == "360 km/h" and metres.length(1234.4) == "1,234 m"
    assert feet.height_calm(199.4 * 0.3048) == "199 ft" and feet.height_calm(1236 * 0.3048) == "1,240 ft"
    assert feet.length(-30.48) == "-100 ft" and feet.clearance(-30.48, "floor") == "100 ft below the floor"
    assert seconds(-0.04) == "0.0 s"
    assert [lateness_words(v) for v in (2.34, -0.8, 0.0, -0.04, None)] == [
        "too late by 2.3 s", "0.8 s in hand", "0.0 s in hand", "0.0 s in hand", "-",
    ]  # fmt: skip
    assert cue_words(None) == "never noticed" and cue_words("new_cue") == "new cue"


def test_unknown_slot_names_the_known_ones(study: Study) -> None:
    with pytest.raises(KeyError, match="no slot 'tail' in this study; it has lead, right, left"):
        margin_at(study, "tail", 0.0)


def test_the_card_says_where_no_distance_makes_the_angles_true(study: Study) -> None:
    assert "Angles are true from" in card_texts(study, "right").viewing
    for note in ("left: without the fault, right: with it; not at true size", "seen from the ground"):
        assert card_texts(study, "right", note).viewing == UNTRUE
