"""The command ``scatter``: many passes of a scene, no two alike."""

from __future__ import annotations

import argparse
import json
from collections.abc import Callable
from pathlib import Path

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
    sub.add_argument("--chunk", type=int, default=64, metavar="N", help="passes worked on together (default 64)")
    sub.add_argument("--out", type=Path, help="folder (default out/<scene>)")
    sub.add_argument("--force", action="store_true", help="replace what is there")


def scatter_command(args: argparse.Namespace) -> int:
    """Fly the passes and write what they show; returns the exit code."""
    from render.command_gates import Ticker
    from render.decide.scatter import study_scatter
    from render.decide.tracks import measured_scatter
    from render.errors import LatepullError
    from render.files import claim_output, write_text
    from render.output.scatter_chart import write_scatter_chart
    from render.output.scatter_words import passes_csv, plain_study, study_text
    from scenes.reader import read_airframe, read_scene
    from terrain.ground import read_ground

    wrong = []
    for name, value, least, most in (("--passes", args.passes, 2, MOST_PASSES), ("--seed", args.seed, 0, 2**31 - 1),
                                     ("--chunk", args.chunk, 1, 1000)):
        if not least <= value <= most:
            wrong.append(f"{name}: read {value}, wanted {least} to {most}")
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
    folder = args.out or Path("out") / scene.name
    force = args.force or args.out is None
    for name in (SHEET, TABLE, FIGURES, PASSES):
        claim_output(folder / name, force=force)
    ticker = Ticker()
    ticker.tell(f"{args.passes} passes")
    try:
        study = study_scatter(scene, scatter, read_airframe, read_ground(scene.ground, scene.seed),
                              passes=args.passes, seed=args.seed, measured=args.tracks is not None, chunk=args.chunk,
                              count=ticker.count)
    finally:
        ticker.close()
    text, figures = study_text(study), plain_study(study)
    made = [write_scatter_chart(study, folder / SHEET, force=force),
            write_text(folder / TABLE, text, force=force),
            write_text(folder / FIGURES, json.dumps(figures, indent=2, allow_nan=False) + "\n", force=force),
            write_text(folder / PASSES, passes_csv(study), force=force)]
    if args.json:
        print(json.dumps({**figures, "written": [str(p) for p in made]}, allow_nan=False))
    else:
        print(text)
        print(f"written: {', '.join(str(p) for p in made)}")
    return 0
