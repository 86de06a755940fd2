"""The briefing page: a folder (or one file) that opens from disk in any browser and fetches nothing.

The script and the style stand inside the page and are named in its Content-Security-Policy by their hashes, so
that nothing else may run, whatever a scene's title says. Written whole or not at all.
"""

from __future__ import annotations

import base64
import hashlib
import json
import os
import shutil
from collections.abc import Sequence
from contextlib import ExitStack
from dataclasses import dataclass, replace
from importlib.resources import files
from pathlib import Path

from jinja2 import Environment, PackageLoader, StrictUndefined
from markupsafe import Markup
from PIL import Image, UnidentifiedImageError

from render.errors import LatepullError, OutputExists
from render.files import claim_output, output_error, scratch_folder, whole_file
from render.output.page_films import Pictures, study_key
from render.output.page_pdf import write_pdf
from render.output.page_scene import InlineFilm, Picture, Refs, SceneView, scene_view
from render.output.words import CAUTION
from render.types import Study

FORMAT = 1
INDEX, MANIFEST, FILES, PDF = "index.html", "page.json", "files", "briefing.pdf"
SCRIPTS = ("page_film.js", "page_sitting.js", "page_main.js")
STYLES = ("page.css", "print.css")
EXTRAS = (("map*", "Map"), ("gate_card*", "Gate card"), ("gates*", "Gates"), ("scatter*", "Scatter of technique"),
          ("shape*", "Shapes of the pull"))
TYPES = {".png": "image/png", ".jpg": "image/jpeg", ".svg": "image/svg+xml"}
EXTRA_BYTES = 20_000_000


@dataclass(frozen=True, slots=True, eq=False)
class PageScene:
    """One scene to put into a page: its study, the seat, its pictures, and files of maps and gates."""

    study: Study
    slot: str
    pictures: Pictures
    extras: tuple[Path, ...] = ()


def find_extras(folder: str | Path) -> tuple[Path, ...]:
    """Pictures of maps and gates that lie in a scene's folder, or in one of theirs in it, such as map/map.svg.

    Readable ones; a drawing (svg) before a png of it.
    """
    folder = Path(folder)
    found: dict[str, Path] = {}
    for pattern, _ in EXTRAS:
        for suffix in (".svg", ".png"):
            for path in sorted([*folder.glob(pattern + suffix), *folder.glob(f"{pattern}/{pattern}{suffix}")]):
                if path.stem not in found and _readable(path):
                    found[path.stem] = path
    return tuple(found.values())


def _readable(path: Path) -> bool:
    try:
        if not 0 < path.stat().st_size <= EXTRA_BYTES:
            return False
        if path.suffix == ".svg":
            return "<svg" in path.read_text(encoding="utf-8")[:4000]
        with Image.open(path) as image:
            image.verify()
        return True
    except (OSError, ValueError, SyntaxError, UnidentifiedImageError):
        return False


def extra_caption(path: Path) -> str:
    """What a map's or gate card's picture is called."""
    kind = next((words for pattern, words in EXTRAS if path.match(f"{pattern}{path.suffix}")), "Picture")
    rest = path.stem.replace("_", " ").strip()
    return kind if rest.lower() == kind.lower() else f"{kind}: {rest}"


def policy(style: str, script: str) -> str:
    """The Content-Security-Policy of a page with this style and script: they alone, its own pictures and films."""
    def hashed(text: str) -> str:
        return base64.b64encode(hashlib.sha256(text.encode("utf-8")).digest()).decode()

    return (f"default-src 'none'; script-src 'sha256-{hashed(script)}'; style-src 'sha256-{hashed(style)}'; "
            "img-src 'self' data:; media-src 'self' blob:; base-uri 'none'; form-action 'none'")


def render_page(views: Sequence[SceneView], *, made: str, version: str) -> str:
    """The page as HTML; made: the day in words. Every text of a scene is escaped."""
    environment = Environment(loader=PackageLoader("render.output", "templates"), autoescape=True,
                              undefined=StrictUndefined, trim_blocks=True, lstrip_blocks=True)
    static = files("render.output") / "static"
    style = "\n".join((static / name).read_text(encoding="utf-8") for name in STYLES)
    body = "\n".join((static / name).read_text(encoding="utf-8") for name in SCRIPTS)
    script = f'"use strict";\n(() => {{\n{body}\n}})();\n'
    title = views[0].title if len(views) == 1 else f"Briefing: {len(views)} scenes"
    return environment.get_template("page.html.j2").render(
        scenes=views, policy=Markup(policy(style, script)), style=Markup(style), script=Markup(script),
        page_title=title, generator=f"latepull {version}", made=made, caution=CAUTION)


def write_page(
    scenes: Sequence[PageScene], folder: str | Path, *, made: str, force: bool = False, pdf: bool = False
) -> Path:
    """Write a page's folder, with its PDF if asked; returns its index.html.

    Raises OutputExists, LatepullError, MachineError; nothing is left then, and an old page stands as it was.
    """
    folder = Path(folder)
    claim_page(folder, force=force)
    with scratch_folder(folder) as scratch:
        part = scratch / "page"
        (part / FILES).mkdir(parents=True)
        views = [scene_view(s.study, s.slot, s.pictures, _copied(s, part / FILES, i), i)
                 for i, s in enumerate(scenes, start=1)]
        version = str(scenes[0].study.versions.get("latepull", ""))
        (part / INDEX).write_text(render_page(views, made=made, version=version), encoding="utf-8", newline="\n")
        if pdf:
            write_pdf(part / INDEX, part / PDF)
        (part / MANIFEST).write_text(manifest(scenes, part, version), encoding="utf-8")
        _take_place(part, folder, scratch)
    return folder / INDEX


def write_single(
    scenes: Sequence[PageScene], path: str | Path, *, made: str, force: bool = False, pdf: Path | None = None
) -> Path:
    """Write a page as one file with its films and pictures inside, and its PDF if asked; returns the path.

    Raises as write_page does.
    """
    version = str(scenes[0].study.versions.get("latepull", ""))
    with ExitStack() as stack:
        part = stack.enter_context(whole_file(path, force=force))
        pdf_part = stack.enter_context(whole_file(pdf, force=force)) if pdf is not None else None
        views = [scene_view(s.study, s.slot, s.pictures, _inlined(s, i), i) for i, s in enumerate(scenes, start=1)]
        part.write_text(render_page(views, made=made, version=version), encoding="utf-8", newline="\n")
        if pdf_part is not None:  # paper has no use for films, and reading past them takes minutes
            scratch = stack.enter_context(scratch_folder(Path(path)))
            bare = [replace(view, inline_films=()) for view in views]
            (scratch / INDEX).write_text(render_page(bare, made=made, version=version), encoding="utf-8")
            write_pdf(scratch / INDEX, pdf_part)
    return Path(path)


def claim_page(folder: Path, *, force: bool) -> None:
    """Check that a page may take this folder's place: nothing there, or a page of ours and ``force``."""
    claim_output(folder / INDEX, force=True) if folder.is_dir() else claim_output(folder, force=force)
    if not folder.exists():
        return
    if not folder.is_dir() or (any(folder.iterdir()) and not (folder / MANIFEST).is_file()):
        raise LatepullError(f"{folder} is there and holds no page; it is left as it is: use --out with another name")
    if any(folder.iterdir()) and not force:
        raise OutputExists(folder)


def manifest(scenes: Sequence[PageScene], folder: Path, version: str) -> str:
    """What is in a page, as JSON: its scenes, the studies they are of, each file with its size."""
    sizes = {p.relative_to(folder).as_posix(): p.stat().st_size for p in sorted(folder.rglob("*")) if p.is_file()}
    return json.dumps({"format": FORMAT, "latepull": version, "files": sizes, "scenes": page_scenes(scenes)}, indent=1)


def page_scenes(scenes: Sequence[PageScene]) -> list[dict[str, object]]:
    """The scenes of a page as its manifest names them."""
    return [{"name": s.study.scene.name, "slot": s.slot, "study": study_key(s.study),
             "size_px": list(s.pictures.shot.size_px), "rate_fps": s.pictures.shot.rate_fps} for s in scenes]


def stands(scenes: Sequence[PageScene], folder: str | Path) -> bool:
    """Whether a folder holds just this page; raises LatepullError, by name, for a file of it that is gone."""
    folder = Path(folder)
    try:
        data = json.loads((folder / MANIFEST).read_text(encoding="utf-8"))
        same = data["format"] == FORMAT and data["scenes"] == page_scenes(scenes)
        lost = [name for name, size in data["files"].items()
                if not (folder / name).is_file() or (folder / name).stat().st_size != size]
    except (OSError, ValueError, KeyError, TypeError, AttributeError):
        return False
    if lost:
        raise LatepullError(f"{folder} is not whole: {', '.join(lost)} missing or changed; --force makes it again")
    return same


def _copied(scene: PageScene, folder: Path, number: int) -> Refs:
    """Copy a scene's files under plain names (a title may hold anything) and give their addresses."""
    def put(path: Path, name: str) -> str:
        if not path.is_file():
            raise LatepullError(f"{path} is missing: draw it again with --again")
        shutil.copyfile(path, folder / name)
        return f"{FILES}/{name}"

    made = scene.pictures
    return Refs(
        annotated=put(made.annotated, f"scene{number}.mp4"), plain=put(made.plain, f"scene{number}_plain.mp4"),
        stills=tuple(Picture(put(s.path, f"scene{number}_still{i}.jpg"), s.caption)
                     for i, s in enumerate(made.stills, start=1)),
        extras=tuple(Picture(put(p, f"scene{number}_extra{i}{p.suffix}"), extra_caption(p))
                     for i, p in enumerate(scene.extras, start=1)),
    )  # fmt: skip


def _inlined(scene: PageScene, number: int) -> Refs:
    def text(path: Path) -> str:
        if not path.is_file():
            raise LatepullError(f"{path} is missing: draw it again with --again")
        return base64.b64encode(path.read_bytes()).decode()

    def picture(path: Path, caption: str) -> Picture:
        return Picture(f"data:{TYPES[path.suffix]};base64,{text(path)}", caption)

    made = scene.pictures
    films = tuple(InlineFilm(f"film-{number}-{kind}", text(path))
                  for kind, path in (("annotated", made.annotated), ("plain", made.plain)))
    return Refs(annotated=f"#{films[0].id}", plain=f"#{films[1].id}", inline_films=films,
                stills=tuple(picture(s.path, s.caption) for s in made.stills),
                extras=tuple(picture(p, extra_caption(p)) for p in scene.extras))


def _take_place(part: Path, folder: Path, scratch: Path) -> None:
    """Put a finished page where the old one stands; if that fails the old one is back in its place."""
    old = scratch / "old"
    try:
        if folder.exists():
            os.replace(folder, old)
        try:
            os.replace(part, folder)
        except OSError:
            if old.exists():
                os.replace(old, folder)
            raise
    except OSError as exc:
        raise output_error(exc, folder) from exc
