"""The team's own calls: what is pressed on the plain film, read off the pixels at the very press."""

from __future__ import annotations

import csv
import io
from pathlib import Path
from typing import Any

import pytest

from render.output.page_server import PageServer
from tests.page.conftest import END_S, NAME, RATE, START_S, until
from tests.page.drawn import READ_NUMBER
from tests.page.test_film_in_step import opened

# Notes, before the page's own listener runs, which frame the film showed when the key came.
SPY = f"""
addEventListener("keydown", () => {{
  const film = document.getElementById("sitting-film");
  if (film && !film.paused) window.pressedAt = ({READ_NUMBER})(film);
}}, true);
"""


def sit(page: Any, press_at_s: float | None) -> None:
    page.click("#start-sitting")
    until(page, 'document.getElementById("sitting-film").readyState >= 2')
    page.keyboard.press("Enter")
    if press_at_s is not None:
        until(page, f'document.getElementById("sitting-film").currentTime >= {press_at_s - START_S}')
        page.keyboard.press("Space")
    until(page, 'document.getElementById("sitting-go").textContent === "Next run"')


def saved(page: Any) -> list[dict[str, str]]:
    with page.expect_download() as download:
        page.click("#save-calls")
    assert download.value.suggested_filename == "calls.csv"
    text = Path(download.value.path()).read_text(encoding="utf-8")
    return list(csv.DictReader(io.StringIO(text)))


def test_a_call_is_right_within_a_frame_and_saved(watched: Any, server: PageServer, scenes: Any) -> None:
    watched.add_init_script(SPY)
    page = opened(watched, server.url)
    page.fill("#pilot", '=B"2')  # what a spreadsheet would take for a formula is dropped
    sit(page, 21.8)
    frame = page.evaluate("window.pressedAt")
    assert frame >= round((21.8 - START_S) * RATE) - 1
    words = page.inner_text("#sitting-words")
    page.click("#sitting-close")
    rows = saved(page)
    study = scenes[0].study
    assert [(r["scene"], r["seat"], r["pilot"]) for r in rows] == [(NAME, "right", "B2")]
    called = float(rows[0]["time_s"])
    assert called == pytest.approx(START_S + frame / RATE, abs=1.001 / RATE)
    assert float(rows[0]["fault_s"]) == pytest.approx(study.faulted.fault_s, abs=1e-3)
    cells = page.locator("#calls-table tbody td").all_inner_texts()
    since = called - study.faulted.fault_s
    late = called - study.margin.last_pull_floor_s[1]
    assert cells[4] == f"{since:.2f} s" and cells[5] == "2.60 s" and cells[6] == "2.00 s"
    assert cells[7] == f"{-late:.2f} s in hand" and cells[7] in words
    assert page.seen["errors"] == []
    assert [url for url in page.seen["requests"] if not url.startswith((server.url, "blob:" + server.url))] == []


def test_a_call_before_the_fault_is_no_credit(watched: Any, server: PageServer) -> None:
    page = opened(watched, server.url)
    sit(page, START_S + 0.2)
    assert page.inner_text("#sitting-words").endswith("before the fault. Nothing had failed yet.")
    page.click("#sitting-close")
    assert page.locator("#calls-table tbody td").all_inner_texts()[7] == "called before the fault"


def test_no_call_is_kept_as_none_and_a_reload_loses_nothing(watched: Any, server: PageServer) -> None:
    page = opened(watched, server.url)
    sit(page, None)
    assert page.inner_text("#sitting-words") == "You called no break-out in this run."
    page.keyboard.press("Escape")
    page.reload()
    until(page, "document.documentElement.classList.contains('scripted')")
    rows = saved(page)
    assert [(r["scene"], r["time_s"]) for r in rows] == [(NAME, "")]
    page.click("#calls-table button")
    assert page.inner_text("#calls-table tbody") == "No run yet."
    assert page.is_disabled("#save-calls")


def test_a_run_gives_nothing_away_and_closing_it_keeps_nothing(watched: Any, server: PageServer, scenes: Any) -> None:
    page = opened(watched, server.url)
    page.click("#start-sitting")
    page.keyboard.press("Enter")
    until(page, 'document.getElementById("sitting-film").currentTime > 0.2')
    box = page.locator("#sitting").bounding_box()
    assert (box["width"], box["height"]) == (1366, 768)  # nothing of the page shows beside it
    said = page.inner_text("#sitting").lower()
    for word in ("fault", "last pull", "frozen", scenes[0].study.scene.title.lower()):
        assert word not in said
    page.keyboard.press("ArrowRight")  # no scrubbing to the answer
    assert page.evaluate('document.getElementById("sitting-film").currentTime') < END_S - START_S
    page.keyboard.press("Escape")
    assert page.inner_text("#calls-table tbody") == "No run yet."
