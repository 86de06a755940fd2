"""In a browser: the film plays, and film, chart and keys stay in step; read off the pixels of the film itself."""

from __future__ import annotations

from pathlib import Path
from typing import Any

import pytest

from render.output.page import write_single
from render.output.page_server import PageServer
from tests.page.conftest import END_S, RATE, START_S, until
from tests.page.drawn import READ_NUMBER

SHOWN = "article.scene:not([hidden])"
# Watches for a while: at each repaint the film's own number against the frame that the chart's cursor stands at.
IN_STEP = """
([forMs, startS, rate]) => new Promise((done) => {
  const read = %s;
  const article = document.querySelector("article.scene:not([hidden])");
  const chart = [...article.querySelectorAll(".linked svg")].find((svg) => svg.getClientRects().length);
  const cursor = chart.querySelector(".cursor"), d = chart.dataset, found = [], begun = performance.now();
  const step = () => {
    const number = read(article.querySelector("video:not(.off)"));
    const part = (Number(cursor.getAttribute("x1")) - d.x0) / (d.x1 - d.x0);
    const time = Number(d.t0) + part * (d.t1 - d.t0);
    found.push([number, (time - startS) * rate]);
    if (performance.now() - begun < forMs) requestAnimationFrame(step); else done(found);
  };
  step();
})
""" % READ_NUMBER  # noqa: UP031 - the script is full of braces


def opened(page: Any, url: str) -> Any:
    page.goto(url)
    until(page, f'document.querySelector("{SHOWN} video.annotated").readyState >= 2')
    return page


def number(page: Any, kind: str = "video:not(.off)") -> int:
    return int(page.eval_on_selector(f"{SHOWN} {kind}", READ_NUMBER))


def cursor_s(page: Any) -> float:
    return float(page.locator(f"{SHOWN} .scrub").get_attribute("aria-valuenow"))


def settle(page: Any) -> None:
    """Until the film has decoded what was asked for, and has been painted."""
    until(page, f'[...document.querySelectorAll("{SHOWN} video")].every((v) => !v.seeking)')
    page.evaluate("new Promise((done) => requestAnimationFrame(() => requestAnimationFrame(done)))")


def test_it_plays_from_disk_and_asks_for_nothing_else(watched: Any, page_folder: Path) -> None:
    page = opened(watched, (page_folder / "index.html").as_uri())
    page.click(f"{SHOWN} [data-do=play]")
    until(page, f'document.querySelector("{SHOWN} video.annotated").currentTime > 0.5')
    assert page.inner_text(f"{SHOWN} [data-do=play]") == "Pause"
    page.click(f"{SHOWN} [data-do=play]")
    assert page.seen["errors"] == []
    base = page_folder.as_uri() + "/"
    assert page.seen["requests"] and [url for url in page.seen["requests"] if not url.startswith(base)] == []


def test_chart_and_film_are_in_step_while_it_plays(
    watched: Any, server: PageServer, record_property: Any
) -> None:
    page = opened(watched, server.url)
    page.click(f"{SHOWN} [data-do=play]")
    found = [pair for pair in page.evaluate(IN_STEP, [2500, START_S, RATE]) if pair[0] >= 0]
    assert len({n for n, _ in found}) > 20, "the film did not run"
    errors = [abs(n - at) for n, at in found]
    record_property("sync_error_frames", max(errors))
    print(f"\nsync error while playing: {max(errors):.2f} frames at most, over {len(found)} repaints")
    assert max(errors) <= 1.05  # a frame, and the rounding of the cursor's place


def test_a_move_over_the_chart_scrubs_the_film(watched: Any, server: PageServer) -> None:
    page = opened(watched, server.url)
    box = page.locator(f"{SHOWN} .linked svg.wide").bounding_box()
    for part in (0.3, 0.75, 0.5):
        page.mouse.move(box["x"] + part * box["width"], box["y"] + box["height"] / 2)
    settle(page)
    assert START_S < cursor_s(page) < END_S
    assert abs(number(page) - (cursor_s(page) - START_S) * RATE) < 0.51
    # the cursor stands under the mouse, to a frame
    line = page.locator(f"{SHOWN} .linked svg.wide .cursor").bounding_box()
    frame_px = box["width"] / ((END_S - START_S) * RATE)
    assert abs(line["x"] + line["width"] / 2 - box["x"] - 0.5 * box["width"]) <= frame_px + 1.5


def test_frame_by_frame_and_moments(watched: Any, server: PageServer) -> None:
    page = opened(watched, server.url)
    page.focus(f"{SHOWN} .scrub")
    for key, wanted in (("ArrowRight", 1), ("ArrowRight", 2), ("ArrowLeft", 1), ("Shift+ArrowRight", 31),
                        ("PageDown", 61), ("Home", 0), ("End", 120), ("ArrowRight", 121), ("ArrowLeft", 120)):
        page.keyboard.press(key)
        settle(page)
        assert round((cursor_s(page) - START_S) * RATE) == min(wanted, 120)
        if wanted <= 120:
            assert number(page) == wanted, key
    page.keyboard.press("Home")
    moments = [float(b.get_attribute("data-moment")) for b in page.locator(f"{SHOWN} [data-moment]").all()]
    inside = [m for m in moments if m > START_S]
    assert len(inside) >= 4  # fault, early, last pulls, likely
    for moment in inside:
        page.keyboard.press("n")
        settle(page)
        assert 0.0 <= number(page) / RATE + START_S - moment < 1.0 / RATE + 1e-3
    page.keyboard.press("p")
    settle(page)
    assert abs(number(page) / RATE + START_S - inside[-2]) <= 1.0 / RATE


def test_both_versions_show_the_same_instant(watched: Any, server: PageServer) -> None:
    page = opened(watched, server.url)
    for _ in range(7):
        page.keyboard.press("ArrowRight")
    settle(page)
    page.keyboard.press("v")
    page.wait_for_selector(f"{SHOWN} video.plain:not(.off)")
    settle(page)
    assert page.get_attribute(f"{SHOWN} [data-do=plain]", "aria-pressed") == "true"
    assert number(page, "video.plain") == number(page, "video.annotated") == 7
    page.keyboard.press("Space")
    until(page, f'document.querySelector("{SHOWN} video.plain").currentTime > 0.6')
    page.keyboard.press("v")  # while it runs
    page.wait_for_selector(f"{SHOWN} video.annotated:not(.off)")
    found = [pair for pair in page.evaluate(IN_STEP, [600, START_S, RATE]) if pair[0] >= 0]
    assert max(abs(n - at) for n, at in found) <= 1.05
    assert found[0][0] >= 7 and found[-1][0] > found[0][0], "it did not go on from there"


def test_play_slow_and_keys_off(watched: Any, server: PageServer) -> None:
    page = opened(watched, server.url)
    video = f'document.querySelector("{SHOWN} video.annotated")'
    page.keyboard.press("s")
    page.keyboard.press("k")
    until(page, f"{video}.currentTime > 0.05")
    assert page.evaluate(f"{video}.playbackRate") == 0.25
    page.keyboard.press("k")
    assert page.evaluate(f"{video}.paused")
    page.click("#show-keys")
    page.uncheck("#keys-on")
    page.keyboard.press("Escape")
    before = cursor_s(page)
    page.keyboard.press("k")
    page.keyboard.press("ArrowRight")
    assert page.evaluate(f"{video}.paused") and cursor_s(page) == before
    page.focus(f"{SHOWN} .scrub")  # a slider has its arrows in any case
    page.keyboard.press("ArrowRight")
    assert cursor_s(page) == pytest.approx(before + 1 / RATE, abs=2e-4)


def test_the_readout_says_what_the_overlay_says(watched: Any, server: PageServer, scenes: Any) -> None:
    from render.output.texts import overlay_texts

    page = opened(watched, server.url)
    for _ in range(3):
        page.keyboard.press("Shift+ArrowRight")
    texts = overlay_texts(scenes[0].study, "right", START_S + 3.0)
    assert page.inner_text(f"{SHOWN} .readout .since") == texts.since_fault
    assert page.inner_text(f"{SHOWN} .readout .left") == f"{texts.margin_label}: {texts.margin_value}"
    assert page.inner_text(f"{SHOWN} .readout .height") == texts.height
    assert page.inner_text(f"{SHOWN} .readout .speed") == texts.speed


def test_a_single_file_does_the_same(watched: Any, scenes: Any, tmp_path: Path) -> None:
    path = write_single(scenes, tmp_path / "alles in einer Datei.html", made="today")
    page = opened(watched, path.as_uri())
    page.keyboard.press("Shift+ArrowRight")
    settle(page)
    # a film from inside the page taints no canvas, so that even from disk its pixels can be read
    assert number(page) == 30
    page.click(f"{SHOWN} [data-do=play]")
    until(page, f'document.querySelector("{SHOWN} video.annotated").currentTime > 1.4')
    assert page.seen["errors"] == []
    assert all(url.split(":")[0] in ("blob", "data") for url in page.seen["requests"][1:])
