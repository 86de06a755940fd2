"""The question, the answer and the three figures, word for word, for each way a scene can end."""

from __future__ import annotations

import re
from dataclasses import replace
from pathlib import Path

import pytest

from render.output.page_chart import margin_chart
from render.output.page_sources import WORKS, assumptions, shown_value, thresholds, weakest, works
from render.output.page_svg import ticks
from render.output.page_words import answer, fault_line, figures, lateness_span, question, slot_rows, span
from render.sight.observers import TABLE, TECHNIQUE, source
from render.types import OBSERVERS, Notice, Study
from tests.output.made_up import made_up_study


def noticed(study: Study, *rows: tuple[float, float | None, float | None]) -> Study:
    """The study with other notices: (after the fault, lateness, clearance) of early, likely, late."""
    fault_s = study.faulted.fault_s or 0.0
    notes = tuple(
        Notice(o, fault_s + at, "tilt", r, late, clear, clear)
        for o, r, (at, late, clear) in zip(OBSERVERS, (0.8, 1.5, 3.0), rows, strict=True))
    return replace(study, notices={name: notes for name in study.notices})


def test_too_late_and_never() -> None:
    study = made_up_study()
    assert question("right") == "When could the pilot in slot right have known, and what was left then?"
    assert question("lead") == "When could the lead have known, and what was left then?"
    assert answer(study, "right") == (
        "He could have noticed 1.5 to 2.6 s after the fault, a late observer not at all, the last pull to clear the "
        "floor was at 2.0 s: with his reaction he breaks out 0.3 to 2.1 s too late.")
    one, two, three = figures(study, "right")
    assert (one.value, one.note) == (
        "1.5 to 2.6 s", "after the fault; by: horizon's tilt, ground closing; late observer: never")
    assert (two.value, two.note) == ("2.0 s", "to clear the floor (100 ft); to clear the ground: 2.5 s after the fault")
    assert (three.value, three.tone) == ("0.3 to 2.1 s too late", "late")
    assert three.note == "with 0.8 to 3.0 s reaction; late observer: never"


def test_in_hand_and_mixed() -> None:
    study = noticed(made_up_study(), (0.5, -0.7, 20.0), (0.4, -0.1, 5.0), (0.3, 1.3, -30.0))
    assert answer(study, "right").endswith("he breaks out anywhere from 0.7 s in hand to 1.3 s too late.")
    assert figures(study, "right")[2].tone == "mixed"
    study = noticed(made_up_study(), (0.1, -1.9, 20.0), (0.2, -1.0, 5.0), (0.3, -0.4, 1.0))
    assert answer(study, "right").endswith("he breaks out with 1.9 to 0.4 s in hand.")
    assert figures(study, "right")[2].tone == "hand"


def test_no_last_pull() -> None:
    study = made_up_study()
    margin = replace(study.margin, last_pull_floor_s=(None, None, None))
    study = noticed(replace(study, margin=margin), (1.0, None, 65.0), (2.0, None, 64.0), (3.0, None, 63.0))
    assert answer(study, "right") == (
        "He could have noticed 1.0 to 3.0 s after the fault; the margin above the floor does not run out in this "
        "flight, and a break-out then has its lowest point between 207 and 213 ft above the floor.")
    assert figures(study, "right")[1].value == "does not run out"
    assert figures(study, "right")[2].value == "207 to 213 ft"


def test_nothing_fails() -> None:
    healthy_study = made_up_study(fault=False, units="metres")
    assert answer(healthy_study, "right").startswith("Nothing fails in this scene and there is nothing to notice")
    assert [f.value for f in figures(healthy_study, "right")][:2] == ["nothing fails", "does not run out"]
    assert slot_rows(healthy_study, "right") == () and fault_line(healthy_study) == "No fault in this scene."


def test_a_lead_without_a_pull() -> None:
    study = made_up_study()
    assert "the stick gives no pull" in answer(study, "lead")
    assert [f.value for f in figures(study, "lead")][1:] == ["no pull left", "does nothing"]
    assert {(r.left, r.against, r.lowest) for r in slot_rows(study, "lead")[:2]} == {
        ("no pull left", "-", "a pull does nothing")}


def test_the_table_says_what_was_left_then() -> None:
    rows = slot_rows(made_up_study(), "right")
    assert [(r.noticed, r.left, r.against) for r in rows] == [
        ("1.5 s", "0.5 s left", "too late by 0.3 s"), ("2.6 s", "gone 0.6 s ago", "too late by 2.1 s"),
        ("never", "-", "-")]


@pytest.mark.parametrize(("values", "words"), [
    ([2.7, 4.0, 6.2], "2.7 to 6.2 s too late"), ([-22.0, -19.0], "22.0 to 19.0 s in hand"), ([0.5], "0.5 s too late"),
    ([0.0, 0.2], "0.0 s in hand to 0.2 s too late"), ([-0.02], "0.0 s in hand"),
])  # fmt: skip
def test_lateness_ranges(values: list[float], words: str) -> None:
    assert lateness_span(values) == words


def test_ranges_and_ticks() -> None:
    assert (span(3.14, 3.11), span(1.0, 2.0)) == ("3.1 s", "1.0 to 2.0 s")
    assert ticks(-1.0, 1.0, 5) == [-1.0, -0.5, 0.0, 0.5, 1.0]


def test_no_page_says_safe() -> None:
    room = Path(__file__).parents[2] / "render" / "output"
    for path in [*room.glob("templates/*"), *room.glob("static/*"), *room.glob("page*.py")]:
        assert re.search(r"\b(un)?safe(ly|ty)?\b", path.read_text(encoding="utf-8"), re.IGNORECASE) is None, path


def test_sources_are_those_of_the_observers() -> None:
    study = made_up_study()
    rows = thresholds(study, "right")
    assert [r.cue for r in rows] == ["horizon's tilt"] and rows[0].used
    tilt = [TABLE[o].weber["tilt"] for o in OBSERVERS]
    assert rows[0].values == tuple((shown_value(f), f.status) for f in tilt)
    assert rows[0].technique == (shown_value(TECHNIQUE["tilt"]), TECHNIQUE["tilt"].status)
    assert weakest(study, "right").startswith("The weakest figure behind these noticing times is from memory")
    named = {key for key, _ in works(study, "right")}
    assert {"1.29", "1.30", "3.15"} <= named and "2.3" not in named
    words = {a.what: (a.value, a.origin) for a in assumptions(study, "right")}
    assert words["Floor"] == ("100 ft above the ground", "the scene: the team's own minimum")
    assert words["Reaction"][1] == "3.15 (guess)"


def test_every_id_of_the_thresholds_has_its_work() -> None:
    bridges = {"1.42", "1.44", "1.45"}
    for cue in TECHNIQUE:
        for word in source(cue).replace("-", " ").split():
            key = word.strip("(),;")
            if key.replace(".", "").isdigit() and key.count(".") == 1 and key[0] in "123":
                assert key in WORKS or key in bridges, f"{cue}: {key}"


def test_the_chart_escapes_and_tells() -> None:
    chart = margin_chart(made_up_study(), "right", 20.0, 24.0, "x", wide=True)
    assert "Last pull at 2.0 s" in chart and "Early observer could notice at 1.5 s by horizon's tilt" in chart
    assert 'aria-labelledby="x-t x-d"' in chart and "style=" not in chart
