"""The house rules of DESIGN.md and DEVELOPERS.md, read off the source: arrows, rooms, printing, sizes, top level."""

from __future__ import annotations

import ast
import json
import subprocess
import sys
from collections.abc import Iterator
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


def reaches(name: str, goal: str, seen: set[str]) -> bool:
    """Whether importing a module brings a room with it, by the imports at its top."""
    if name in seen:
        return False
    seen.add(name)
    top = ast.Module([n for n in TREES[name].body if isinstance(n, ast.Import | ast.ImportFrom)], [])
    targets = [target for _, target in imports(name, top)]
    if any(room_of(t) == goal for t in targets if t in TREES):
        return True
    return any(reaches(t, goal, seen) for t in targets if t in TREES)


# Loads each module alone: the process knows numpy, scipy, numba and the like, forks, and each child imports one. What
# numba itself loads at its first compiled function, half a second of it, is loaded before too, and our source is
# compiled to bytecode but once.
ALONE_SCRIPT = """
import gc, json, os, sys
import numpy, scipy.interpolate, scipy.optimize, scipy.signal, scipy.special, scipy.stats, numba, yaml
import imageio_ffmpeg, jinja2, matplotlib.figure, matplotlib.backends.backend_agg, matplotlib.backends.backend_svg
import matplotlib.backends.backend_pdf, PIL.Image, PIL.ImageDraw
import concurrent.futures, email.parser, http.client, queue, ssl, urllib.request, webbrowser, xml.sax
from numba.core.registry import cpu_target
cpu_target.typing_context.refresh(), cpu_target.target_context.refresh()
gc.freeze(), gc.disable()
sys.dont_write_bytecode, sys.pycache_prefix = False, sys.argv[1]

def load(name, write):
    try:
        assert not [m for m in sys.modules if m.split(".")[0] in ("render", "scenes", "terrain")]
        __import__(name)
        heavy = {m.split(".")[0] for m in sys.modules} & {"vtk", "vtkmodules", "pyvista"}
        said = f"brings {sorted(heavy)}" if heavy else ""
    except BaseException as exc:
        said = f"{type(exc).__name__}: {exc}"
    os.write(write, said.encode()[:4000])
    os._exit(0)

failed, names, running = {}, json.load(sys.stdin), []
while names or running:
    while names and len(running) < 3:
        read, write = os.pipe()
        name = names.pop()
        child = os.fork()
        if child == 0:
            load(name, write)
        os.close(write)
        running.append((name, child, read))
    name, child, read = running.pop(0)
    said = b""
    while part := os.read(read, 4096):
        said += part
    os.close(read)
    os.waitpid(child, 0)
    if said:
        failed[name] = said.decode()
print(json.dumps(failed))
"""


@pytest.mark.skipif(sys.platform == "win32", reason="needs fork")
def test_each_module_loads_alone_and_without_vtk(tmp_path: Path) -> None:
    names = [n for n in TREES if room_of(n) != "render.picture" and not reaches(n, "render.picture", set())]
    for room in ("terrain", "scenes", "render.flight", "render.margin", "render.sight", "render.study",
                 "render.decide", "render.command"):
        assert room in {room_of(n) for n in names}
    done = subprocess.run([sys.executable, "-c", ALONE_SCRIPT, str(tmp_path)], input=json.dumps(names), cwd=ROOT,
                          capture_output=True, text=True, timeout=300, check=True)
    assert json.loads(done.stdout.splitlines()[-1]) == {}
