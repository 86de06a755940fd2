"""The command ``shape``: the pull over the back half that leaves the most in the worst freeze, as scene and chart."""

from __future__ import annotations

import argparse
import json
import math
import sys
import time
from collections.abc import Callable
from functools import partial
from pathlib import Path

from render.command_gates import option

CHART, TABLE, FIGURES = "shape", "shape.txt", "shape.json"
MAPS = tuple(f"map_{when}{suffix}" for when in ("before", "after") for suffix in (".png", ".pdf", ".svg"))
FIRST_RAD, LAST_RAD = math.pi, math.radians(345.0)


def add_shape(add: Callable[[str, str], argparse.ArgumentParser]) -> None:
    """Give the command line its ``shape``."""
    sub = add("shape", "seek the pull over the back half of the loop that leaves the most in the worst freeze")
    sub.add_argument("scene", metavar="SCENE", help="a shipped name or a path; its fault is left out")
    sub.add_argument("--max-g", metavar="G", help="greatest load factor on the way down (default: as in the scene)")
    sub.add_argument("--onset", metavar="RATE", help="greatest onset there, such as 2g/s (default: as in the scene)")
    sub.add_argument("--slope", metavar="G", type=float,
                     help="greatest change of g per degree of loop angle (default: as in the scene)")
    sub.add_argument("--bend", metavar="G", type=float,
                     help="greatest change of that slope, g per degree per degree (default: as in the scene)")
    sub.add_argument("--freeze-step", default="15 deg", metavar="ANGLE",
                     help="between freeze points in the search (default 15 deg); checked at a fifth of it at the end")
    sub.add_argument("--trade", type=int, default=4, metavar="N", help="load factors to solve for (default 4)")
    sub.add_argument("--budget", type=int, default=6000, metavar="CASES",
                     help="freezes flown in the search (default 6000, about 30 a second and core pair)")
    sub.add_argument("--no-maps", action="store_true", help="leave out the maps before and after")
    sub.add_argument("--seed", type=int, default=1, help="of the search's draws (default 1)")
    sub.add_argument("--out", type=Path, help="folder (default out/<scene>)")
    sub.add_argument("--force", action="store_true", help="replace what is there")


def _positive(name: str, value: float | None) -> None:
    from render.errors import LatepullError

    if value is not None and not (math.isfinite(value) and value > 0.0):
        raise LatepullError(f"{name}: read {value:g}, wanted a number above zero")


def _tell() -> Callable[[str, int, int], None] | None:
    if not sys.stderr.isatty():
        return None
    begun = time.monotonic()

    def show(what: str, done: int, total: int) -> None:
        sys.stderr.write(f"\r\033[K{what}: {done:,} of at most {total:,} cases, {time.monotonic() - begun:.0f} s ")
        sys.stderr.flush()

    return show


def shape_command(args: argparse.Namespace) -> int:
    """Search, write the found scene, the chart and the figures; returns the exit code."""
    import numpy as np

    from render.decide.shape import make_job
    from render.decide.shape_scene import found_scene, map_of
    from render.decide.shape_search import PEOPLE, find_shape
    from render.errors import LatepullError
    from render.files import claim_output, write_text
    from render.output.map_chart import write_map_chart
    from render.output.shape_chart import write_shape_chart
    from render.output.shape_words import plain_shape, shape_text
    from scenes.reader import read_airframe, read_scene
    from terrain.ground import read_ground

    max_g = None if args.max_g is None else option("--max-g", "load_factor", args.max_g, 1.2, 12.0)
    onset = None if args.onset is None else option("--onset", "g_rate", args.onset, 0.1, 20.0)
    step_rad = option("--freeze-step", "angle", args.freeze_step, math.radians(1.0), math.radians(45.0))
    _positive("--slope", args.slope)
    _positive("--bend", args.bend)
    if not 1 <= args.trade <= 12:
        raise LatepullError(f"--trade: read {args.trade}, wanted 1 to 12")
    points = np.linspace(FIRST_RAD, LAST_RAD, max(round((LAST_RAD - FIRST_RAD) / step_rad), 1) + 1)
    if args.budget < args.trade * PEOPLE * len(points):
        raise LatepullError(f"--budget: read {args.budget}, wanted at least {args.trade * PEOPLE * len(points):,}: one "
                            f"generation of {PEOPLE} pulls at {len(points)} freeze points for each of {args.trade} "
                            "load factors")
    if args.seed < 0:
        raise LatepullError(f"--seed: read {args.seed}, wanted 0 or more")
    scene = read_scene(args.scene)
    job = make_job(scene, read_airframe, read_ground(scene.ground, scene.seed), points)
    folder = args.out or Path("out") / scene.name
    force = args.force or args.out is None  # the default folder is the tool's own
    new = f"{scene.name}_shaped.yaml"
    for name in (f"{CHART}.png", f"{CHART}.svg", TABLE, FIGURES, new, *([] if args.no_maps else MAPS)):
        claim_output(folder / name, force=force)
    degree = math.pi / 180.0
    shape = find_shape(
        job, load_factor=max_g, onset_gps=onset, slope_gprad=None if args.slope is None else args.slope / degree,
        bend_gprad2=None if args.bend is None else args.bend / degree**2, budget=args.budget, seed=args.seed,
        steps=args.trade, tell=(tell := _tell()),
    )
    made = [*write_shape_chart(shape, folder / CHART, force=force)]
    text, figures = shape_text(shape), plain_shape(shape)
    made.append(write_text(folder / TABLE, text, force=force))
    made.append(write_text(folder / FIGURES, json.dumps(figures, indent=2, allow_nan=False) + "\n", force=force))
    if shape.best is not None:
        made.append(write_text(folder / new, found_scene(args.scene, shape, folder), force=force))
    if shape.best is not None and not args.no_maps:
        for name, one in (("map_before", scene), ("map_after", read_scene(folder / new))):
            found = map_of(one, read_airframe, job.ground, None if tell is None else partial(tell, name))
            made += write_map_chart(found, folder / name, force=force)
    if tell is not None:
        sys.stderr.write("\r\033[K")
    if args.json:
        print(json.dumps({**figures, "written": [str(p) for p in made]}, allow_nan=False))
    else:
        print(text)
        print(f"written: {', '.join(str(p) for p in made)}")
    return 0
