"""Speed of films and stills, as ratios within one run; by hand: ``pytest -n 0 -m benchmark -s tests/benchmarks``.

Every film is made by processes of its own, start-up and encoding included: late_freeze, 12 s at 30 frames a second
(LATEPULL_BENCH_S for another length). ``ours``: overlay and smoothed silhouettes. ``plain``: no overlay. ``raw``: raw
OpenGL with the same meshes, shaders, workers and encoder, without either (raw_gl.py). ``naive``: the pyvista movie
loop, of which NAIVE_FRAMES are drawn; start-up plus the loop's time times all frames over those drawn.
Wall time depends on what else the machine does, so each round makes all of them, one after another.
"""

from __future__ import annotations

import json
import os
import resource
import subprocess
import sys
import threading
import time
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass, field
from pathlib import Path
from statistics import median
from typing import Any

import pytest

pytest.importorskip("moderngl")

pytestmark = [pytest.mark.benchmark, pytest.mark.draws]

ROOT = Path(__file__).parents[2]
LENGTH_S = float(os.environ.get("LATEPULL_BENCH_S", "12"))
ROUNDS = int(os.environ.get("LATEPULL_BENCH_ROUNDS", "2"))
START_S = 24.0
NAIVE_FRAMES = 24
NAIVE_WANTED, RAW_WANTED = 6.0, 0.85


@dataclass
class Spent:
    """Seconds of each round."""

    wall_s: list[float] = field(default_factory=list)
    cpu_s: list[float] = field(default_factory=list)
    frames: int = 0


@contextmanager
def timed(into: Spent) -> Iterator[None]:
    """Add a round: wall and CPU seconds of the processes started within."""
    before, begun = resource.getrusage(resource.RUSAGE_CHILDREN), time.perf_counter()
    yield
    into.wall_s.append(time.perf_counter() - begun)
    after = resource.getrusage(resource.RUSAGE_CHILDREN)
    into.cpu_s.append(after.ru_utime + after.ru_stime - before.ru_utime - before.ru_stime)


def python(*words: str, cwd: Path = ROOT) -> str:
    """Run the interpreter on words; returns what it printed."""
    env = {**os.environ, "PYTHONPATH": str(ROOT)}
    done = subprocess.run([sys.executable, *words], cwd=cwd, env=env, capture_output=True, text=True)
    assert done.returncode == 0, done.stderr[-2000:]
    return done.stdout


@pytest.fixture(scope="module")
def home(tmp_path_factory: pytest.TempPathFactory) -> Path:
    """A folder in which late_freeze has been flown."""
    folder = tmp_path_factory.mktemp("bench")
    python("-m", "render.command", "fly", "late_freeze", cwd=folder)
    return folder


def film(home: Path, kind: str, size: tuple[int, int], length_s: float = LENGTH_S, **options: Any) -> dict[str, Any]:
    """One film of the benchmark (filmed.py)."""
    words = {"kind": kind, "study": str(home / "out" / "late_freeze"), "out": str(home / f"{kind}.mp4"),
             "size_px": size, "start_s": START_S, "end_s": START_S + length_s,
             "scene": str(home / f"scene{size[1]}.pkl"), **options}  # fmt: skip
    answer: dict[str, Any] = json.loads(python("-m", "tests.benchmarks.filmed", json.dumps(words)).splitlines()[-1])
    return answer


def table(title: str, rows: dict[str, Spent], base: str) -> None:
    """Print medians, and how many times faster each is than the base."""
    print(f"\n{title}\n{'':<12}{'wall s':>8}{'CPU s':>8}{'frames/s':>10}{'speed':>8}{'by CPU':>8}")
    for name, spent in rows.items():
        wall, cpu = median(spent.wall_s), median(spent.cpu_s)
        print(f"{name:<12}{wall:>8.1f}{cpu:>8.1f}{spent.frames / wall:>10.1f}"
              f"{median(rows[base].wall_s) / wall:>8.2f}{median(rows[base].cpu_s) / cpu:>8.2f}")


def test_a_film_against_the_naive_loop_and_raw_opengl(home: Path) -> None:
    size = (1280, 720)
    film(home, "scene", size)
    kinds = ("naive", "raw", "ours", "plain")
    spent = {kind: Spent() for kind in kinds}
    for _ in range(ROUNDS):
        for kind in kinds:
            with timed(spent[kind]):
                made = film(home, kind, size, frames=NAIVE_FRAMES)
            spent[kind].frames = made.get("all_frames", made["frames"])
            if kind == "naive":  # start-up and closing once, the loop for all frames
                more = made["loop_s"] * (made["all_frames"] / made["frames"] - 1.0)
                wall, cpu = spent[kind].wall_s, spent[kind].cpu_s
                cpu[-1] *= 1.0 + more / wall[-1]  # taken as spread evenly
                wall[-1] += more
    table(f"{LENGTH_S:g} s at 1280x720, start-up and encoding included, {ROUNDS} rounds", spent, "ours")
    by_naive = [a / b for a, b in zip(spent["naive"].wall_s, spent["ours"].wall_s, strict=True)]
    by_raw = [a / b for a, b in zip(spent["raw"].wall_s, spent["ours"].wall_s, strict=True)]
    print(f"against the naive loop {median(by_naive):.1f} times, against raw OpenGL {median(by_raw):.2f}")
    assert median(by_naive) >= NAIVE_WANTED
    assert median(by_raw) >= RAW_WANTED


def test_other_sizes_and_the_twin(home: Path) -> None:
    length = min(LENGTH_S, 6.0)
    cases: dict[str, tuple[tuple[int, int], dict[str, str]]] = {
        "720p": ((1280, 720), {}), "1080p": ((1920, 1080), {}),
        "twin side": ((1280, 720), {"twin": "side"}), "twin stack": ((1280, 720), {"twin": "stack"}),
    }  # fmt: skip
    spent = {name: Spent() for name in cases}
    for name, (size, options) in cases.items():
        with timed(spent[name]):
            spent[name].frames = film(home, "ours", size, length, **options)["frames"]
    table(f"{length:g} s each, start-up and encoding included", spent, "720p")
    # 2.25 times the pixels; two half pictures are not worth two whole ones
    assert median(spent["1080p"].cpu_s) < 2.6 * median(spent["720p"].cpu_s)
    assert median(spent["twin side"].cpu_s) < 1.6 * median(spent["720p"].cpu_s)


def test_drafts(home: Path) -> None:
    """The first frame of ``still --draft`` and the hero's ``film --draft``, against starting the interpreter."""
    commands = {"python": ["-c", "pass"],
                "still": ["-m", "render.command", "still", "late_freeze", "--draft", "--force"],
                "film": ["-m", "render.command", "film", "late_freeze", "--draft", "--force"]}  # fmt: skip
    spent = {name: Spent(frames=1) for name in commands}
    for _ in range(3):
        for name, words in commands.items():
            with timed(spent[name]):
                python(*words, cwd=home)
    table("drafts of late_freeze, from the command's start (wanted on a quiet machine: still 3 s, film 15 s)", spent,
          "still")
    assert median(spent["film"].cpu_s) < 12 * median(spent["still"].cpu_s)


def test_memory_stays_flat(home: Path) -> None:
    """2,000 frames at 720p: all processes together, sampled each half second."""
    frames = int(os.environ.get("LATEPULL_BENCH_FRAMES", "2000"))
    samples: list[float] = []
    over = threading.Event()

    def watch() -> None:
        while not over.wait(0.5):
            samples.append(tree_mb(os.getpid()) - tree_mb(os.getpid(), children=False))

    watcher = threading.Thread(target=watch, daemon=True)
    watcher.start()
    try:
        film(home, "ours", (1280, 720), start_s=21.0, end_s=21.0 + frames / 120.0, rate_fps=120.0)
    finally:
        over.set()
        watcher.join()
    third = len(samples) // 3
    early, late = median(samples[third : 2 * third]), median(samples[2 * third : -4])
    print(f"\nmemory over {frames} frames, all processes: middle third {early:.0f} MB, last third {late:.0f} MB, "
          f"most {max(samples):.0f} MB")  # fmt: skip
    assert late < 1.05 * early
    assert max(samples) < 1000.0


def tree_mb(root: int, children: bool = True) -> float:
    """Memory of a process and, if wanted, all under it: shared pages shared out (PSS), MB."""
    total = 0.0
    waiting = [root]
    while waiting:
        pid = waiting.pop()
        try:
            for line in Path(f"/proc/{pid}/smaps_rollup").read_text().splitlines():
                if line.startswith("Pss:"):
                    total += float(line.split()[1]) / 1000.0
            if children:
                for task in Path(f"/proc/{pid}/task").iterdir():
                    waiting += [int(x) for x in (task / "children").read_text().split()]
        except OSError:
            continue
    return total
