"""The command ``page``: the briefing page of one scene or several, on paper, served to this machine."""

from __future__ import annotations

import argparse
import json
import os
import sys
import webbrowser
from collections.abc import Callable
from datetime import date
from pathlib import Path
from typing import TYPE_CHECKING, Any

if TYPE_CHECKING:
    from render.types import Study
    from scenes.model import Scene


def add_page(add: Callable[[str, str], argparse.ArgumentParser]) -> None:
    """Give the command line its ``page``."""
    sub = add("page", "make the briefing page: film, figures and assumptions in one, for any browser, offline")
    sub.add_argument("scene", metavar="SCENE", nargs="+", help="shipped names or paths; several go into one page")
    sub.add_argument("--out", type=Path, help="the page's folder, or its file with --single (default under out/)")
    sub.add_argument("--force", action="store_true", help="replace a page that is there")
    sub.add_argument("--again", action="store_true", help="fly and draw all anew, also where a scene was edited")
    sub.add_argument("--slot", help="whose eye (default: each scene's own)")
    sub.add_argument("--draft", action="store_true", help="films of half size and half rate")
    sub.add_argument("--single", action="store_true", help="one file with the films inside")
    sub.add_argument("--pdf", action="store_true", help="also the page on A4")
    sub.add_argument("--serve", action="store_true", help="serve the page to this machine until Ctrl-C")
    sub.add_argument("--port", type=int, default=0, help="port for --serve (default: a free one)")
    sub.add_argument("--no-open", action="store_true", help="with --serve: open no browser")


def page_command(args: argparse.Namespace) -> int:
    """Make the page; returns the exit code."""
    from render.command import progress_bar
    from render.output.page import INDEX, PDF, PageScene, claim_page, find_extras, stands, write_page, write_single
    from render.output.page_films import make_pictures

    scenes = read_scenes(args.scene)
    target = args.out or default_target([scene.name for _, scene in scenes], args.single)
    pdf = (target.with_suffix(".pdf") if args.single else target / PDF) if args.pdf else None
    replace = args.force or args.again
    existing = args.serve and not replace and not args.single and (target / INDEX).is_file()
    if not existing:
        _claim(target, pdf, args.single, replace, claim_page)
    studies = read_studies(scenes, args.again)
    parts = []
    for (_, scene), study in zip(scenes, studies, strict=True):
        slot = _slot(study, args.slot)
        pictures = make_pictures(study, slot, Path("out") / scene.name / "page_files", draft=args.draft,
                                 again=args.again, progress=progress_bar())
        parts.append(PageScene(study, slot, pictures, find_extras(Path("out") / scene.name)))
    made = f"{date.today():%d %B %Y}".lstrip("0")
    if existing and stands(parts, target):
        path = target / INDEX
    elif args.single:
        path = write_single(parts, target, made=made, force=replace, pdf=pdf)
    else:
        path = write_page(parts, target, made=made, force=replace, pdf=args.pdf)
    weight = path.stat().st_size if args.single else sum(p.stat().st_size for p in target.rglob("*") if p.is_file())
    _tell(args, path, pdf, weight, len(parts))
    return serve(path, args) if args.serve else 0


def default_target(names: list[str], single: bool) -> Path:
    """Where a page goes without ``--out``: with its scene, or in a place of its own for several."""
    base = Path("out") / names[0] if len(names) == 1 else Path("out")
    return base / ("page.html" if single else "page")


def _claim(target: Path, pdf: Path | None, single: bool, force: bool, claim_page: Callable[..., None]) -> None:
    """Refuse before any work what can't be written at its end."""
    from render.files import claim_output

    if not single:
        claim_page(target, force=force)
        return
    claim_output(target, force=force)
    if pdf is not None:
        claim_output(pdf, force=force)


def read_scenes(names: list[str]) -> list[tuple[str, Scene]]:
    """All scenes, each once; raises with the faults of every one that can't be read."""
    from render.errors import LatepullError
    from scenes.reader import SceneError, read_scene

    found: list[tuple[str, Scene]] = []
    faults: list[SceneError] = []
    for name in dict.fromkeys(names):
        try:
            found.append((name, read_scene(name)))
        except SceneError as exc:
            faults.append(exc)
    if len(faults) == 1:
        raise faults[0]
    if faults:
        raise LatepullError("\n".join(str(fault) for fault in faults))
    twice = {scene.name for _, scene in found if sum(other.name == scene.name for _, other in found) > 1}
    if twice:
        raise LatepullError(f"two scenes are named {', '.join(sorted(twice))}: they would share one folder under out/; "
                            "give one file another name")
    return found


def read_studies(scenes: list[tuple[str, Scene]], again: bool) -> list[Study]:
    """The studies of scenes: saved ones, flown now where there is none or ``again``.

    Raises LatepullError that names every scene whose saved study is of another text or version, or damaged.
    """
    from render.errors import LatepullError
    from render.study import VERSION
    from render.study_io import StudyError, StudyMissing, load_study
    from scenes.reader import scene_text

    found: list[Study | None] = []
    faults = []
    for name, scene in scenes:
        folder = Path("out") / scene.name
        study = None
        try:
            study = None if again else load_study(folder, scene_text=scene_text(name))
            if study is not None and study.versions.get("latepull") != VERSION:
                raise StudyError(f"the study in {folder} was flown by latepull {study.versions.get('latepull')}, "
                                 f"this is {VERSION}")
        except StudyMissing:
            pass
        except StudyError as exc:
            faults.append(f"{name}: {exc}")
        found.append(study)
    if faults:
        raise LatepullError("\n".join([*faults, "Nothing was made. --again flies and draws what the page needs anew."]))
    return [_flown(name, scene) if study is None else study for (name, scene), study in zip(scenes, found, strict=True)]


def _flown(name: str, scene: Scene) -> Study:
    from render.study import work_through
    from render.study_io import save_study
    from scenes.reader import read_airframe, scene_text
    from terrain.ground import read_ground

    study = work_through(scene, read_airframe, read_ground(scene.ground, scene.seed), scene_text(name))
    save_study(study, Path("out") / scene.name)
    return study


def _slot(study: Study, wanted: str | None) -> str:
    from render.errors import LatepullError

    slot = wanted or study.scene.film.slot
    if slot not in study.faulted.names:
        raise LatepullError(f"--slot: read {slot}, {study.scene.name} has {', '.join(study.faulted.names)}")
    return slot


def _tell(args: argparse.Namespace, path: Path, pdf: Path | None, weight: int, count: int) -> None:
    from render.command import CAUTION

    if args.json:
        data: dict[str, Any] = {"page": str(path), "pdf": None if pdf is None else str(pdf), "bytes": weight,
                                "scenes": count, "caution": CAUTION}
        print(json.dumps(data), flush=True)
        return
    scenes = "1 scene" if count == 1 else f"{count} scenes"
    print(f"{path}: {scenes}, {weight / 1e6:.1f} MB" + (f"\n{pdf}" if pdf is not None else "") + f"\n{CAUTION}",
          flush=True)


def serve(path: Path, args: argparse.Namespace) -> int:
    """Serve a page until Ctrl-C, which is its ordinary end."""
    from render.output.page_server import PageServer

    with PageServer(path, args.port) as server:
        try:
            # to stderr: --json keeps stdout for what a program reads
            print(f"{server.url} (this machine only; Ctrl-C ends it)", file=sys.stderr, flush=True)
            if not args.no_open and _has_screen():
                webbrowser.open(server.url)
            server.serve_forever()
        except KeyboardInterrupt:
            print("stopped", file=sys.stderr)
    return 0


def _has_screen() -> bool:
    """Whether a browser could show itself; on a server a text browser would take the terminal instead."""
    return sys.platform in ("win32", "darwin") or bool(os.environ.get("DISPLAY") or os.environ.get("WAYLAND_DISPLAY"))
