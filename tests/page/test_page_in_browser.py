"""In a browser: sizes, scenes, accessibility, what a title may hold, what is missing, ten scenes, paper."""

from __future__ import annotations

import shutil
from pathlib import Path
from typing import Any

import pytest

from render.output.page import write_page
from render.output.page_server import PageServer
from render.output.words import CAUTION
from tests.page.conftest import TITLE, until
from tests.page.test_film_in_step import SHOWN, opened

SIZES = {"phone": (390, 844), "laptop": (1366, 768), "projector": (1920, 1080)}
# Elements whose words stick out of their own box sideways, or out of the window where nothing scrolls.
CUT = """
() => [...document.querySelectorAll("main *, header *, footer *")].filter((e) => {
  if (!e.getClientRects().length || e.closest("svg, .scroll, .film, .skip") || !e.textContent.trim()) return false;
  const box = e.getBoundingClientRect();
  return box.right > innerWidth + 1 || box.left < -1 || (e.scrollWidth > e.clientWidth + 1 && e.clientWidth > 0
    && getComputedStyle(e).display !== "inline");
}).map((e) => `${e.tagName}.${e.className}: ${e.textContent.trim().slice(0, 40)}`)
"""
# Words of a drawing that stick out of it: they would be cut.
CUT_SVG = """
() => [...document.querySelectorAll("article:not([hidden]) svg")].filter((s) => s.getClientRects().length).flatMap(
  (svg) => { const box = svg.getBoundingClientRect(); return [...svg.querySelectorAll("text")].filter((t) => {
    const b = t.getBoundingClientRect();
    return b.left < box.left - 2 || b.right > box.right + 2 || b.top < box.top - 2 || b.bottom > box.bottom + 2;
  }).map((t) => t.textContent); })
"""


@pytest.mark.parametrize("size", SIZES)
def test_nothing_is_cut_at(watched: Any, server: PageServer, size: str) -> None:
    watched.set_viewport_size(dict(zip(("width", "height"), SIZES[size], strict=True)))
    page = opened(watched, server.url)
    for scene in (1, 2):
        page.evaluate(f"location.hash = '#scene-{scene}'")
        page.wait_for_timeout(100)
        assert page.evaluate("document.documentElement.scrollWidth <= innerWidth"), f"scene {scene} scrolls sideways"
        assert [x for x in page.evaluate(CUT) if not x.startswith("A.")] == []  # long titles end in dots in the list
        assert page.evaluate(CUT_SVG) == []
        assert page.locator(f"{SHOWN} .linked svg:visible").count() == 1
        assert page.locator(f"{SHOWN} video:visible").count() == 1
    assert page.seen["errors"] == []


@pytest.mark.parametrize(("size", "scheme"), [("phone", "light"), ("laptop", "dark"), ("projector", "light")])
def test_axe_finds_nothing(browser: Any, server: PageServer, size: str, scheme: str) -> None:
    axe = pytest.importorskip("axe_playwright_python.sync_playwright", reason="axe-core is missing")
    width, height = SIZES[size]
    context = browser.new_context(viewport={"width": width, "height": height}, color_scheme=scheme, bypass_csp=True)
    page = opened(context.new_page(), server.url)
    try:
        for state in ("scene 1", "keys", "scene 2"):
            if state == "keys":
                page.click("#show-keys")
            elif state == "scene 2":
                page.keyboard.press("Escape")
                page.evaluate("location.hash = '#scene-2'")
                page.wait_for_timeout(100)
            result = axe.Axe().run(page)
            assert result.violations_count == 0, f"{state}: {result.generate_report()}"
    finally:
        context.close()


def test_scenes_are_switched_and_only_one_film_is_held(watched: Any, server: PageServer) -> None:
    page = opened(watched, server.url)
    page.click("[data-scene-link='2']")
    until(page, f'document.querySelector("{SHOWN}").id === "scene-2"')
    until(page, f'document.querySelector("{SHOWN} video").readyState >= 2')
    assert page.inner_text(f"{SHOWN} h1") == "Healthy loop"
    assert page.locator("video[src]").count() == 2  # both versions of the scene shown, none of the other
    assert page.get_attribute("[data-scene-link='2']", "aria-current") == "true"
    assert "nothing to notice" in page.inner_text(f"{SHOWN} .sentence")
    page.keyboard.press("1")
    until(page, f'document.querySelector("{SHOWN}").id === "scene-1"')
    page.go_back()
    until(page, f'document.querySelector("{SHOWN}").id === "scene-2"')
    assert page.seen["errors"] == []


def test_a_hostile_title_stays_text(watched: Any, server: PageServer) -> None:
    page = opened(watched, server.url)
    assert page.inner_text(f"{SHOWN} h1") == TITLE
    assert page.evaluate("window.hacked") is None
    # and what gets in all the same may not run, load or send
    said = page.evaluate("""() => new Promise((done) => {
      const found = new Set();
      addEventListener("securitypolicyviolation", (e) => { found.add(e.effectiveDirective);
        if (found.size === 4) done([...found].sort()); });
      const add = (tag, set) => document.body.append(Object.assign(document.createElement(tag), set));
      add("script", { textContent: "window.hacked = 3" });
      add("style", { textContent: "body { display: none }" });
      add("img", { src: "http://127.0.0.2:9/x.png" });
      fetch("http://127.0.0.2:9/x").catch(() => 0);
    })""")
    assert said == ["connect-src", "img-src", "script-src-elem", "style-src-elem"]
    assert page.evaluate("window.hacked") is None


def test_a_missing_film_is_said(watched: Any, page_folder: Path, tmp_path: Path) -> None:
    folder = tmp_path / "copy"
    shutil.copytree(page_folder, folder)
    (folder / "files/scene1.mp4").unlink()
    watched.goto((folder / "index.html").as_uri())
    until(watched, f'!document.querySelector("{SHOWN} .missing").hidden')
    assert "files/scene1.mp4 is missing beside this page or damaged" in watched.inner_text(f"{SHOWN} .missing")


def test_without_script_all_scenes_stand_there(browser: Any, page_folder: Path) -> None:
    context = browser.new_context(java_script_enabled=False)
    page = context.new_page()
    page.goto((page_folder / "index.html").as_uri())
    assert page.locator("article.scene:visible").count() == 2
    assert page.locator("video[controls]:visible").count() == 4
    assert page.locator(".needs-script:visible").count() == 0
    context.close()


def test_colours_are_kept(watched: Any, server: PageServer) -> None:
    page = opened(watched, server.url)
    light = page.evaluate("getComputedStyle(document.body).backgroundColor")
    page.click("#theme")
    dark = page.evaluate("getComputedStyle(document.body).backgroundColor")
    assert light == "rgb(255, 255, 255)" and dark == "rgb(17, 21, 26)"
    page.reload()
    assert page.evaluate("getComputedStyle(document.body).backgroundColor") == dark


def test_ten_scenes(watched: Any, scenes: Any, tmp_path: Path) -> None:
    folder = tmp_path / "ten"
    write_page([scenes[i % 2] for i in range(10)], folder, made="today")
    weight = sum(p.stat().st_size for p in folder.rglob("*") if p.is_file())
    page = opened(watched, (folder / "index.html").as_uri())
    first = page.evaluate("performance.now()")
    for key in "9357":
        page.keyboard.press(key)
        until(page, f'document.querySelector("{SHOWN}").id === "scene-{key}"')
        until(page, f'document.querySelector("{SHOWN} video").readyState >= 2')
    assert page.locator("video[src]").count() == 2
    page.keyboard.press("ArrowRight")
    assert page.evaluate("document.documentElement.scrollWidth <= innerWidth")
    assert page.seen["errors"] == []
    print(f"\nten scenes: page {(folder / 'index.html').stat().st_size / 1e6:.2f} MB, {weight / 1e6:.1f} MB in all, "
          f"first frame within {first:.0f} ms")


def texts_of(path: Path) -> list[str]:
    """The text of each sheet; fails if a letter lies outside its sheet."""
    pdfium = pytest.importorskip("pypdfium2", reason="the Python package pypdfium2 is missing")
    document = pdfium.PdfDocument(str(path))
    found = []
    for sheet in document:
        width, height = sheet.get_size()
        assert (width, height) == pytest.approx((595.28, 841.89), abs=1.0)  # A4, 210 mm x 297 mm
        text = sheet.get_textpage()
        for i in range(text.count_chars()):
            left, bottom, right, top = text.get_charbox(i)
            assert -0.5 <= left and right <= width + 0.5 and -0.5 <= bottom and top <= height + 0.5, (
                f"cut on sheet {len(found) + 1}: {text.get_text_range(max(i - 20, 0), 40)!r}")
        found.append(" ".join(text.get_text_bounded().split()))
    document.close()
    return found


def check_sheets(sheets: list[str], scenes: Any) -> None:
    words = " ".join(CAUTION.replace("'", "’").split())
    for i, sheet in enumerate(sheets, start=1):
        assert words in sheet.replace("'", "’"), f"sheet {i} has no caution"
        assert f"{i} / {len(sheets)}" in sheet
    whole = " ".join(sheets)
    for scene in scenes:
        assert " ".join(scene.study.scene.title.split()) in whole
    starts = [i for i, sheet in enumerate(sheets) if "When could the pilot" in sheet]
    assert len(starts) == 2 and starts[0] == 0  # each scene begins a sheet of its own
    for part in ("too late by 2.1 s", "never noticed", "Key moments", "What was assumed", "Cautions", "0.3 to 2.1 s"):
        assert part in whole
    for control in ("Play", "Full screen", "Start a run", "Keys"):
        assert control not in whole
    assert 4 <= len(sheets) <= 8
    assert all(len(sheet) > 250 for sheet in sheets), "a sheet with next to nothing on it"


def test_printed_by_the_browser(watched: Any, server: PageServer, scenes: Any, tmp_path: Path) -> None:
    page = opened(watched, server.url)
    page.click("#theme")  # dark on the screen, light on paper all the same
    page.pdf(path=tmp_path / "print.pdf", prefer_css_page_size=True, print_background=True)
    check_sheets(texts_of(tmp_path / "print.pdf"), scenes)


def test_printed_by_the_command(pango: None, page_folder: Path, scenes: Any) -> None:
    check_sheets(texts_of(page_folder / "briefing.pdf"), scenes)
