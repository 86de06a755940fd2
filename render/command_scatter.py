"""The command ``scatter``: many passes of a scene, no two alike; here or on a cluster."""

from __future__ import annotations

import argparse
from collections.abc import Callable
from pathlib import Path

from render.command_work import CaseBar, add_work_options, interrupted, may_replace, plain_json, say

SHEET, TABLE, FIGURES, PASSES = "scatter.png", "scatter.txt", "scatter.json", "scatter.csv"
MOST_PASSES = 20_000


def add_scatter(add: Callable[[str, str], argparse.ArgumentParser]) -> None:
    """Give the command line its ``scatter``."""
    sub = add("scatter", "fly many passes with the team's scatter: in how many would he have known in time")
    sub.add_argument("scene", metavar="SCENE", help="a shipped name or a path; a scene with a fault")
    sub.add_argument("--passes", type=int, default=500, metavar="N", help="how many (default 500)")
    sub.add_argument("--seed", type=int, default=1, metavar="N", help="of the draws (default 1)")
    sub.add_argument("--tracks", type=Path, metavar="FOLDER",
                     help="take the scatter from recordings of the team's own passes (*.csv, or */tracks.csv)")
    add_work_options(sub)


def scatter_command(args: argparse.Namespace) -> int:
    """Fly the passes and write what they show; returns the exit code."""
    from dataclasses import astuple

    from render.decide.chunks import Folder, chunk_count, estimate, refuse_too_much, work_hash
    from render.decide.runner import runner
    from render.decide.scatter import sum_up
    from render.decide.scatter_work import CHUNK, fly_passes, prepare
    from render.decide.tracks import measured_scatter
    from render.errors import LatepullError
    from render.files import write_text
    from render.output.scatter_chart import write_scatter_chart
    from render.output.scatter_words import passes_csv, plain_study, study_text
    from scenes.reader import read_airframe, read_scene, scene_text
    from terrain.ground import read_ground

    wrong = [
        f"{name}: read {value}, wanted {least} to {most}"
        for name, value, least, most in (("--passes", args.passes, 2, MOST_PASSES), ("--seed", args.seed, 0, 2**31 - 1))
        if not least <= value <= most
    ]
    if wrong:
        raise LatepullError("\n".join(wrong))
    scene = read_scene(args.scene)
    if args.tracks is not None:
        scatter, _ = measured_scatter(args.tracks, scene)
    elif scene.scatter is not None:
        scatter = scene.scatter
    else:
        raise LatepullError(f"{scene.source or scene.name}: no scatter in the scene; wanted a scatter: block with the "
                            "team's own figures, such as scatter: {entry_speed: 4 kt, load_factor: 4 %, reaction: 45 "
                            "%}, or --tracks with a folder of its recordings")
    folder = args.out or Path("out") / scene.name / "scatter"
    force = may_replace(args, folder, (SHEET, TABLE, FIGURES, PASSES))
    bar = CaseBar()
    expected = estimate(args.passes, True, len(scene.formation))
    refuse_too_much(expected, force=args.force_size)
    if not args.json:
        bar.note(expected.words() if args.cluster is None else f"{args.passes} passes on the cluster at {args.cluster}")
    measured = args.tracks is not None
    key = work_hash(scene_text(args.scene), ["scatter", astuple(scatter), measured, args.passes, args.seed, CHUNK])
    kept = Folder(folder / "scatter.unfinished", key, chunk_count(args.passes, CHUNK))
    with runner(args.cluster) as run:
        work = prepare(scene, scatter, read_airframe, read_ground(scene.ground, scene.seed), args.seed,
                       measured=measured)
        try:
            found = fly_passes(work, args.passes, run=run, folder=kept, resume=args.resume, force=args.force,
                               progress=bar.show)
        except KeyboardInterrupt:
            return interrupted(bar, kept.path)
    study = sum_up(work, *found)
    text, figures = study_text(study), plain_study(study)
    made = [write_scatter_chart(study, folder / SHEET, force=force),
            write_text(folder / TABLE, text, force=force),
            write_text(folder / FIGURES, plain_json(figures), force=force),
            write_text(folder / PASSES, passes_csv(study), force=force)]
    return say(args, text, figures, made)
