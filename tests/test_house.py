"""The house rules of DESIGN.md and DEVELOPERS.md, read off the source: arrows, rooms, printing, sizes, top level."""

from __future__ import annotations

import ast
import json
import subprocess
import sys
from collections.abc import Iterator
from functools import cache
from pathlib import Path

import pytest

ROOT = Path(__file__).parent.parent
OURS = ("render", "scenes", "terrain")
SOURCES = sorted(p for top in OURS for p in (ROOT / top).rglob("*.py"))
LINES_MAX = 400

# Floors of the house from the ground up. A module imports from floors below its own and from its own room.
FLOORS: dict[str, int] = {
    "terrain": 0, "scenes": 1, "render": 2, "render.errors": 2, "render.frames": 2, "render.files": 2,
    "render.types": 3, "render.flight": 4, "render.margin": 5, "render.sight": 5, "render.study": 6,
    "render.study_io": 6, "render.picture": 7, "render.decide": 7, "render.output": 8, "render.command": 9,
}
# Errors are said in one way in every building, and know nothing of any of them.
EVERYWHERE = {"render.errors"}
# What only one room may use.
ALONE = {
    "pyvista": "render.picture", "vtk": "render.picture", "vtkmodules": "render.picture",
    "matplotlib": "render.output", "imageio": "render.output", "imageio_ffmpeg": "render.output",
    "jinja2": "render.output", "weasyprint": "render.output",
}
# Processes of our own whose standard output is a pipe to their parent, not a person's screen.
WORKERS = {"render.output.film_worker", "render.picture.probe"}


def name_of(path: Path) -> str:
    parts = path.relative_to(ROOT).with_suffix("").parts
    return ".".join(parts[:-1] if parts[-1] == "__init__" else parts)


def room_of(module: str) -> str:
    """The room a module stands in: render.flight.air -> render.flight, render.command_x -> render.command."""
    top, *rest = module.split(".")
    if top != "render" or not rest:
        return top
    return "render.command" if rest[0].startswith("command") else f"render.{rest[0]}"


def modules() -> dict[str, ast.Module]:
    return {name_of(path): ast.parse(path.read_text(encoding="utf-8"), str(path)) for path in SOURCES}


TREES = modules()


def imports(name: str, tree: ast.Module) -> Iterator[tuple[int, str]]:
    """Line and full name of everything a module imports, wherever in it; ``from a import b`` gives a.b if a module."""
    is_package = (ROOT / name.replace(".", "/")).is_dir()
    for node in ast.walk(tree):
        if isinstance(node, ast.Import):
            for alias in node.names:
                yield node.lineno, alias.name
        elif isinstance(node, ast.ImportFrom):
            base = node.module or ""
            if node.level:
                parts = name.split(".") if is_package else name.split(".")[:-1]
                parts = parts[: len(parts) - node.level + 1]
                base = ".".join([*parts, base] if base else parts)
            for alias in node.names:
                inner = f"{base}.{alias.name}"
                yield node.lineno, inner if inner in TREES else base


def test_every_room_has_a_floor() -> None:
    assert {room_of(name) for name in TREES} <= set(FLOORS)


def test_no_arrow_runs_back() -> None:
    wrong = []
    for name, tree in TREES.items():
        here = room_of(name)
        for line, target in imports(name, tree):
            if target.split(".")[0] not in OURS or target in EVERYWHERE:
                continue
            there = room_of(target)
            if there != here and not FLOORS[there] < FLOORS[here]:
                wrong.append(f"{name}:{line} imports {target}")
    assert wrong == []


def test_terrain_imports_nothing_of_ours() -> None:
    wrong = [f"{name}:{line} imports {target}" for name, tree in TREES.items() if room_of(name) == "terrain"
             for line, target in imports(name, tree)
             if target.split(".")[0] in ("render", "scenes") and target not in EVERYWHERE]
    assert wrong == []


def test_the_base_knows_no_room() -> None:
    for name in EVERYWHERE:
        assert [target for _, target in imports(name, TREES[name]) if target.split(".")[0] in OURS] == []


def test_drawing_and_films_stay_in_their_rooms() -> None:
    wrong = [f"{name}:{line} imports {target}" for name, tree in TREES.items() for line, target in imports(name, tree)
             if room_of(name) != ALONE.get(target.split(".")[0], room_of(name))]
    assert wrong == []


def calls(tree: ast.Module) -> Iterator[tuple[int, str]]:
    """Line and name of every call: print, sys.exit, sys.stdout.write."""
    for node in ast.walk(tree):
        if isinstance(node, ast.Call):
            yield node.lineno, ast.unparse(node.func)


def test_only_the_command_prints_and_ends_the_program() -> None:
    forbidden = {"print", "input", "exit", "quit", "sys.exit", "os._exit", "sys.stdout.write", "sys.stderr.write"}
    wrong = [f"{name}:{line} calls {call}" for name, tree in TREES.items()
             if room_of(name) != "render.command" and name not in WORKERS
             for line, call in calls(tree) if call in forbidden]
    assert wrong == []


def test_workers_are_programs_of_their_own() -> None:
    for name in WORKERS & set(TREES):
        assert any(isinstance(node, ast.If) and "__name__" in ast.unparse(node.test) for node in TREES[name].body), name


def test_no_module_keeps_a_global_that_changes() -> None:
    wrong = [f"{name}:{node.lineno} global {', '.join(node.names)}" for name, tree in TREES.items()
             for node in ast.walk(tree) if isinstance(node, ast.Global)]
    assert wrong == []


def test_every_module_class_and_function_says_what_it_is() -> None:
    """Public names carry a docstring; dunder methods and properties of a line may go without."""
    missing = []
    for name, tree in TREES.items():
        if ast.get_docstring(tree) is None:
            missing.append(name)
        for node in tree.body:
            if isinstance(node, ast.ClassDef | ast.FunctionDef) and not node.name.startswith("_") \
                    and ast.get_docstring(node) is None:
                missing.append(f"{name}:{node.lineno} {node.name}")
    assert missing == []


def test_no_file_is_too_long() -> None:
    long = {}
    for path in [*SOURCES, *(ROOT / "tests").rglob("*.py")]:
        lines = len(path.read_text(encoding="utf-8").splitlines())
        if lines > LINES_MAX:
            long[str(path.relative_to(ROOT))] = lines
    assert long == {}


def test_the_top_level_holds_what_is_fixed() -> None:
    found = subprocess.run(["git", "ls-files"], cwd=ROOT, capture_output=True, text=True, check=False)
    if found.returncode != 0:
        pytest.skip("not a git tree: what belongs to it can't be told from what was made in it")
    top = {line.split("/")[0] for line in found.stdout.splitlines()}
    fixed = {"README.md", "DEVELOPERS.md", "pyproject.toml", "render", "scenes", "terrain", "tests", "out"}
    assert {name for name in top if not name.startswith(".")} == fixed
    assert {line for line in found.stdout.splitlines() if line.startswith("out/")} == {"out/.gitkeep"}


@cache
def brings(name: str) -> frozenset[str]:
    """Our modules that importing one loads, itself among them: by the imports at their tops, and the rooms around."""
    found, to_do = {name}, [name]
    while to_do:
        here = to_do.pop()
        top = ast.Module([n for n in TREES[here].body if isinstance(n, ast.Import | ast.ImportFrom)], [])
        for target in [*(target for _, target in imports(here, top)), here.rpartition(".")[0]]:
            if target in TREES and target not in found:
                found.add(target)
                to_do.append(target)
    return frozenset(found)


def after(name: str, names: list[str]) -> str:
    """Of the modules that one brings the one that brings most, but not it: it may be there before. "" if none."""
    own = [n for n in brings(name) - {name} if n in names and name not in brings(n)]
    return max(own, key=lambda n: (len(brings(n)), n), default="")


# Loads each module in a process that holds nothing of ours but what that module brings itself: one that needs more, or
# that works only after another, fails. The process knows numpy, scipy, numba and the like (also what numba loads at its
# first compiled function) and forks; each child loads one module and forks for those that bring it.
ALONE_SCRIPT = """
import gc, json, os, sys
import numpy, scipy.interpolate, scipy.optimize, scipy.signal, scipy.special, scipy.stats, numba, yaml
import imageio_ffmpeg, jinja2, matplotlib.figure, matplotlib.backends.backend_agg, matplotlib.backends.backend_svg
import matplotlib.backends.backend_pdf, PIL.Image, PIL.ImageDraw
import concurrent.futures, email.parser, http.client, queue, ssl, urllib.request, webbrowser, xml.sax
from numba.core.registry import cpu_target
cpu_target.typing_context.refresh(), cpu_target.target_context.refresh()
gc.freeze(), gc.disable()

def load(name):
    try:
        more = {m for m in sys.modules if m.split(".")[0] in ("render", "scenes", "terrain")} - set(brings[name])
        assert not more, f"{sorted(more)} were there before"
        __import__(name)
        heavy = {m.split(".")[0] for m in sys.modules} & {"vtk", "vtkmodules", "pyvista"}
        return f"brings {sorted(heavy)}" if heavy and not draws else ""
    except BaseException as exc:
        return f"{type(exc).__name__}: {exc}"

def below(parent):
    for name in [n for n in brings if after[n] == parent]:
        child = os.fork()
        if child == 0:
            print(json.dumps([name, load(name)]), flush=True)
            below(name)
            os._exit(0)
        os.waitpid(child, 0)

for brings, after, draws in json.load(sys.stdin):
    if draws:
        import pyvista
    below("")
"""


@pytest.mark.skipif(sys.platform == "win32", reason="needs fork")
def test_each_module_loads_alone_and_without_vtk() -> None:
    """Those that bring the room that draws may load VTK, and come last; no other may."""
    given: list[tuple[dict[str, list[str]], dict[str, str], bool]] = []
    for draws in (False, True):
        names = [n for n in TREES if any(room_of(m) == "render.picture" for m in brings(n)) is draws]
        given.append(({n: sorted(brings(n)) for n in names}, {n: after(n, names) for n in names}, draws))
    for room in ("terrain", "scenes", "render.flight", "render.margin", "render.sight", "render.study",
                 "render.decide", "render.command"):
        assert room in {room_of(n) for n in given[0][0]}
    done = subprocess.run([sys.executable, "-c", ALONE_SCRIPT], input=json.dumps(given), cwd=ROOT, capture_output=True,
                          text=True, timeout=300, check=True)
    said = dict(json.loads(line) for line in done.stdout.splitlines())
    assert set(said) == set(TREES)
    assert {name: words for name, words in said.items() if words} == {}
