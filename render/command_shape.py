"""The command ``shape``: the pull over the back half that leaves the most in the worst freeze, as scene and chart."""

from __future__ import annotations

import argparse
import math
from collections.abc import Callable
from functools import partial
from pathlib import Path

from render.command_gates import option
from render.command_work import CaseBar, add_work_options, interrupted, may_replace, plain_json, say

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
    add_work_options(sub)


def _positive(name: str, value: float | None) -> None:
    from render.errors import LatepullError

    if value is not None and not (math.isfinite(value) and value > 0.0):
        raise LatepullError(f"{name}: read {value:g}, wanted a number above zero")


def shape_command(args: argparse.Namespace) -> int:
    """Search, write the found scene, the chart and the figures; returns the exit code."""
    import numpy as np

    from render.decide.chunks import Folder, estimate, refuse_too_much, work_hash
    from render.decide.ledger import Ledger
    from render.decide.runner import runner
    from render.decide.shape import make_job, unlike_slots
    from render.decide.shape_flights import Flights
    from render.decide.shape_scene import found_scene, map_of
    from render.decide.shape_search import PEOPLE, find_shape
    from render.decide.values import common_of
    from render.errors import LatepullError
    from render.files import write_text
    from render.output.map_chart import write_map_chart
    from render.output.shape_chart import write_shape_chart
    from render.output.shape_words import plain_shape, shape_text
    from scenes.reader import read_airframe, read_scene, read_scene_text, scene_text
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
    ground = read_ground(scene.ground, scene.seed)
    # by name from a table, so that a worker elsewhere needs none of our files
    job = make_job(scene, common_of(scene, read_airframe, ground).airframes.__getitem__, ground, points)
    folder = args.out or Path("out") / scene.name
    unfinished = folder / "shape.unfinished"
    new = f"{scene.name}_shaped.yaml"
    names = (f"{CHART}.png", f"{CHART}.svg", TABLE, FIGURES, new, *([] if args.no_maps else MAPS))
    force = may_replace(args, folder, names, resumed=args.resume and unfinished.is_dir())
    bar = CaseBar(at_most=True)
    expected = estimate(args.budget, True, len(unlike_slots(scene).formation))
    refuse_too_much(expected, force=args.force_size)
    if not args.json:
        bar.note(f"at most {expected.words()}" if args.cluster is None else
                 f"at most {args.budget:,} cases on the cluster at {args.cluster}")
    degree = math.pi / 180.0
    slope = None if args.slope is None else args.slope / degree
    bend = None if args.bend is None else args.bend / degree**2
    asked = ["shape", max_g, onset, slope, bend, points.tolist(), args.trade, args.budget, args.seed]
    work = Folder(unfinished, work_hash(scene_text(args.scene), asked), None)
    with runner(args.cluster) as run:
        try:
            ledger = Ledger(run, work, resume=args.resume, force=args.force)

            def tell(what: str, done: int, total: int) -> None:
                if ledger.fresh == 0:
                    bar.before(done)
                bar.show(done, total, what)

            shape = find_shape(job, load_factor=max_g, onset_gps=onset, slope_gprad=slope, bend_gprad2=bend,
                               budget=args.budget, seed=args.seed, steps=args.trade, tell=tell,
                               flights=Flights(job, ledger))
            text = None if shape.best is None else found_scene(args.scene, shape, folder)
            maps = {}
            if text is not None and not args.no_maps:
                for name, one in (("map_before", scene), ("map_after", read_scene_text(text, folder / new))):
                    drawn = CaseBar()
                    maps[name] = map_of(one, job.airframe_of, ground, ledger, partial(drawn.show, stage=name))
            bar.clear()
            made = [*write_shape_chart(shape, folder / CHART, force=force)]
            words, figures = shape_text(shape), plain_shape(shape)
            made.append(write_text(folder / TABLE, words, force=force))
            made.append(write_text(folder / FIGURES, plain_json(figures), force=force))
            if text is not None:
                made.append(write_text(folder / new, text, force=force))
            for name, found in maps.items():
                made += write_map_chart(found, folder / name, force=force)
            ledger.close()
        except KeyboardInterrupt:
            return interrupted(bar, work.path)
        finally:
            bar.clear()
    return say(args, words, figures, made)
