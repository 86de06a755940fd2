"""The command ``map``: a grid over two values of a scene, its chart, tables and two sentences."""

from __future__ import annotations

import argparse
import json
import sys
import time
from collections.abc import Callable
from pathlib import Path


def add_work_options(sub: argparse.ArgumentParser, *, chunk: bool = False) -> None:
    """Options of every command that works through many cases; chunk: whether their number in a chunk can be given."""
    sub.add_argument("--cluster", metavar="ADDRESS", help="a Dask scheduler, such as tcp://host:8786 (default: here)")
    sub.add_argument("--resume", action="store_true", help="go on from the chunks an interrupted run has left")
    sub.add_argument("--force", action="store_true", help="replace outputs and unfinished work that are there")
    sub.add_argument("--force-size", action="store_true", help="start work above the limits of time, memory and cases")
    if chunk:
        sub.add_argument("--chunk", type=int, metavar="N", help="cases worked on and kept together (default 128, fewer "
                         "on a cluster)")
    sub.add_argument("--out", type=Path, help="output folder (default under out/<scene>)")


def chunk_size(args: argparse.Namespace, cases: int) -> int:
    """Cases in a chunk: as asked, or large here, where each begins with the flights they share, and small far away."""
    from render.decide.cases import CHUNK
    from render.errors import LatepullError

    if args.chunk is not None:
        if not 1 <= args.chunk <= 1000:
            raise LatepullError(f"--chunk: read {args.chunk}, wanted 1 to 1000")
        return int(args.chunk)
    return CHUNK if args.cluster is None else min(max(-(-cases // 12), 16), CHUNK)


def add_map(add: Callable[[str, str], argparse.ArgumentParser]) -> None:
    """Give the command line its ``map``."""
    sub = add("map", "fly a grid over two values of a scene: where it clears, where it shows in time, where too late")
    sub.add_argument("scene", metavar="SCENE", help="a shipped name or a path")
    forms = "PATH=FROM:TO:STEP with a unit, PATH=FROM:TO/COUNT or PATH=A,B,C; the path may be its last part alone"
    sub.add_argument("--x", metavar="AXIS", help=f"{forms} (default: where in the loop the fault comes on)")
    sub.add_argument("--y", metavar="AXIS", help="as --x (default: the amount of the fault)")
    add_work_options(sub, chunk=True)


class CaseBar:
    """A bar with cases (or other things) done and time left on stderr, where somebody watches."""

    def __init__(self, what: str = "cases", *, at_most: bool = False) -> None:
        """at_most: the work may end before all that is granted is done."""
        self._what, self._most = what, " at most" if at_most else ""
        self._watched, self._begun = sys.stderr.isatty(), time.monotonic()
        self._had: int | None = None

    def before(self, done: int) -> None:
        """So many were done before this run: they say nothing about its speed."""
        self._begun, self._had = time.monotonic(), done

    def show(self, done: int, total: int, stage: str = "") -> None:
        """So many of all cases are done; the first call says how many were done before."""
        if self._had is None:
            self.before(done)
        if not self._watched:
            return
        new, spent = done - (self._had or 0), time.monotonic() - self._begun
        left = f"{spent / new * max(total - done, 0):5.0f} s left" if new > 0 else "   … s left"
        bar = "#" * int(30 * min(done / max(total, 1), 1.0))
        ends = "\n" if done >= total and not stage else ""
        sys.stderr.write(f"\r\033[K{stage + ' ' if stage else ''}[{bar:<30}] {done:,}/{total:,} {self._what}, "
                         f"{left}{self._most} {ends}")
        sys.stderr.flush()

    def clear(self) -> None:
        """Leave the line clean."""
        if self._watched:
            sys.stderr.write("\r\033[K")
            sys.stderr.flush()

    def note(self, text: str) -> None:
        """A line on stderr, watched or not."""
        sys.stderr.write(f"{text}\n")
        sys.stderr.flush()


def map_command(args: argparse.Namespace) -> int:
    """Fly and draw a map; returns the exit code."""
    from render.decide.chunks import Folder, chunk_count, estimate, refuse_too_much, work_hash, work_in_chunks
    from render.decide.map import grid_values, make_map, map_axes, own_twins
    from render.decide.runner import runner
    from render.decide.values import common_of
    from render.files import claim_output
    from render.output.map_tables import FILES, map_text, summary, write_map
    from scenes.reader import read_airframe, read_scene, scene_text
    from terrain.ground import read_ground

    scene = read_scene(args.scene)
    mapped, x, y = map_axes(scene, args.x, args.y)
    folder = args.out or Path("out") / scene.name / "map"
    for name in (*FILES, "map.png", "map.pdf", "map.svg"):
        # the default folder is the tool's own; a named one is kept unless --force
        claim_output(folder / name, force=args.force or args.out is None)
    bar = CaseBar()
    own = own_twins(x, y) or scene.briefed is not None
    expected = estimate(len(x.values) * len(y.values), own, len(scene.formation))
    refuse_too_much(expected, force=args.force_size)
    if not args.json:
        bar.note(f"{len(x.values)} x {len(y.values)}: {expected.words()}" if args.cluster is None else
                 f"{len(x.values)} x {len(y.values)} = {expected.cases:,} cases on the cluster at {args.cluster}")
    values = grid_values(x, y)
    chunk = chunk_size(args, len(values))
    key = work_hash(scene_text(args.scene), ["map", x.path, x.values, y.path, y.values, chunk])
    work = Folder(folder / "map.unfinished", key, chunk_count(len(values), chunk))
    common = common_of(mapped, read_airframe, read_ground(mapped.ground, mapped.seed))
    with runner(args.cluster) as run:
        try:
            cases = work_in_chunks(common, values, run, work, resume=args.resume, force=args.force, chunk=chunk,
                                   progress=bar.show)
        except KeyboardInterrupt:
            bar.note(f"\ninterrupted; finished chunks are kept in {work.path}: give --resume to go on")
            return 130
    found = make_map(scene, mapped, x, y, cases)
    paths = write_map(found, folder, force=args.force or args.out is None)
    if args.json:
        print(json.dumps({**summary(found), "files": [str(p) for p in paths]}))
    else:
        print(map_text(found))
        print(f"written: {', '.join(str(p) for p in paths)}")
    return 0
