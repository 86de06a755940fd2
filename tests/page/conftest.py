"""A real browser, and pages of invented studies whose films carry their frame numbers."""

from __future__ import annotations

import os
import shutil
import time
from collections.abc import Iterator
from dataclasses import replace
from pathlib import Path
from threading import Thread
from typing import Any

import pytest

from render.output.page import PageScene, write_page
from render.output.page_films import Pictures, make_pictures
from render.output.page_server import PageServer
from render.output.shot import Shot, plan_shot
from render.output.source import SourceSpec
from render.types import Study
from tests.output.made_up import made_up_study

TITLE = """<script>window.hacked = 1</script> & "Flügel's" <img src=x onerror="window.hacked=2">"""
NAME = 'Übung "eins" <b>'
START_S, END_S, RATE, SIZE = 20.0, 24.0, 30.0, (320, 180)
BROWSERS = ("chromium", "chromium-browser", "google-chrome", "google-chrome-stable")
ARGUMENTS = ["--no-sandbox", "--disable-gpu", "--disable-background-networking", "--disable-component-update",
             "--disable-sync", "--no-first-run", "--autoplay-policy=no-user-gesture-required"]


@pytest.fixture(scope="session")
def browser() -> Iterator[Any]:
    """The system's Chromium, headless; without one the tests are skipped, but never on CI."""
    path = next((found for name in BROWSERS if (found := shutil.which(name))), None)
    if path is None:
        if os.environ.get("CI"):
            pytest.fail("no Chromium: .ci/run installs it")
        pytest.skip("no Chromium here: apt-get install chromium")
    sync_api = pytest.importorskip("playwright.sync_api", reason="the Python package playwright is missing")
    with sync_api.sync_playwright() as playwright:
        opened = playwright.chromium.launch(executable_path=path, args=ARGUMENTS)
        yield opened
        opened.close()


def until(page: Any, expression: str, wait_s: float = 20.0) -> None:
    """Wait for an expression; the driver's own way evaluates text in the page, which the page's policy forbids."""
    end = time.monotonic() + wait_s
    while not page.evaluate(expression):
        assert time.monotonic() < end, f"never came true: {expression}"
        page.wait_for_timeout(20)


def numbered(shot: Shot) -> SourceSpec:
    return SourceSpec("tests.page.drawn:open_numbered", {"start_s": shot.start_s, "rate_fps": shot.rate_fps})


def made_scene(study: Study, folder: Path) -> PageScene:
    shot = plan_shot(study, "right", start_s=START_S, end_s=END_S, rate_fps=RATE, size_px=SIZE, card_s=1.0)
    return PageScene(study, "right", make_pictures(study, "right", folder, shot=shot, source=numbered(shot)))


@pytest.fixture(scope="session")
def scenes(tmp_path_factory: pytest.TempPathFactory) -> list[PageScene]:
    """A faulted scene with a hostile title, and a healthy one in metres."""
    folder = tmp_path_factory.mktemp("Ordner mit Übung 'eins'")
    faulted = made_up_study()
    faulted = replace(faulted, scene=replace(faulted.scene, title=TITLE, name=NAME))
    return [made_scene(faulted, folder / "a"), made_scene(made_up_study(fault=False, units="metres"), folder / "b")]


@pytest.fixture(scope="session")
def page_folder(scenes: list[PageScene], tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A page of both scenes (with its PDF where that can be made), in a folder with a name that needs quoting."""
    folder = tmp_path_factory.mktemp("p") / "Seite für #1 50%"
    return write_page(scenes, folder, made="1 December 2026", pdf=has_pango()).parent


def has_pango() -> bool:
    """Whether WeasyPrint finds its system libraries."""
    try:
        import weasyprint  # noqa: F401
    except OSError:
        return False
    return True


@pytest.fixture
def pango() -> None:
    """Skip without Pango, but never on CI."""
    if not has_pango():
        (pytest.fail if os.environ.get("CI") else pytest.skip)("no Pango here: apt-get install libpango-1.0-0")


@pytest.fixture(scope="session")
def pictures(scenes: list[PageScene]) -> Pictures:
    return scenes[0].pictures


@pytest.fixture(scope="session")
def server(page_folder: Path) -> Iterator[PageServer]:
    """The page served on loopback."""
    with PageServer(page_folder / "index.html") as opened:
        thread = Thread(target=opened.serve_forever, daemon=True)
        thread.start()
        yield opened
        opened.shutdown()
        thread.join()


@pytest.fixture
def watched(browser: Any) -> Iterator[Any]:
    """A fresh page that notes console errors, uncaught errors and every request: ``page.seen``."""
    context = browser.new_context(viewport={"width": 1366, "height": 768})
    page = context.new_page()
    seen: dict[str, list[str]] = {"errors": [], "requests": []}
    page.on("console", lambda message: seen["errors"].append(message.text) if message.type == "error" else None)
    page.on("pageerror", lambda error: seen["errors"].append(str(error)))
    page.on("request", lambda request: seen["requests"].append(request.url))
    page.seen = seen
    yield page
    context.close()
