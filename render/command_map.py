"""The command ``map``: a grid over two values of a scene, its chart, tables and two sentences."""

from __future__ import annotations

import argparse
from collections.abc import Callable
from pathlib import Path

from render.command_work import CaseBar, add_work_options, interrupted, may_replace, say


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


def map_command(args: argparse.Namespace) -> int:
    """Fly and draw a map; returns the exit code."""
    from render.decide.chunks import Folder, chunk_count, estimate, refuse_too_much, work_hash, work_in_chunks
    from render.decide.map import grid_values, make_map, map_axes, own_twins
    from render.decide.runner import runner
    from render.decide.values import common_of
    from render.output.map_tables import FILES, map_text, summary, write_map
    from scenes.reader import read_airframe, read_scene, scene_text
    from terrain.ground import read_ground

    scene = read_scene(args.scene)
    mapped, x, y = map_axes(scene, args.x, args.y)
    folder = args.out or Path("out") / scene.name / "map"
    force = may_replace(args, folder, (*FILES, "map.png", "map.pdf", "map.svg"))
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
            return interrupted(bar, work.path)
    found = make_map(scene, mapped, x, y, cases)
    return say(args, map_text(found), summary(found), write_map(found, folder, force=force), "files")
