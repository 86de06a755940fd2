"""The latepull command line. Printing and exit codes live here alone.

Exit 0 done, 2 the input is wrong, 3 this machine can't, 130 interrupted.
"""

from __future__ import annotations

import argparse
import json
import os
import signal
import sys
import threading
import time
from collections.abc import Callable, Sequence
from pathlib import Path
from typing import Any

from render.command_batch import add_batch, batch_command
from render.command_gates import add_gates, gates_command
from render.command_map import add_map, map_command
from render.command_page import add_page, page_command
from render.command_scatter import add_scatter, scatter_command
from render.command_shape import add_shape, shape_command

PURPOSE = ("How late a lead's lost pitch control becomes visible in a low formation loop, and how little is left then: "
           "fly a scene, film what a wing pilot sees, print the figures.")
CAUTION = (
    "A training illustration, not a clearance. The authority's rules, the aircraft's manual and licensed practice "
    "come first."
)


def build_parser() -> argparse.ArgumentParser:
    """The command line's parser."""
    parser = argparse.ArgumentParser(prog="latepull", description=PURPOSE,
                                     epilog=CAUTION)
    parser.add_argument("--json", action="store_true", help="print what a program reads")
    commands = parser.add_subparsers(dest="command", required=True)

    def add(name: str, help_text: str) -> argparse.ArgumentParser:
        sub = commands.add_parser(name, help=help_text, epilog=CAUTION)
        sub.add_argument("--json", action="store_true", default=argparse.SUPPRESS, help="print what a program reads")
        return sub

    for name, text in (("check", "read a scene and report all its faults"),
                       ("fly", "fly a scene and print its table"),
                       ("film", "film what a wing pilot sees"), ("still", "draw one instant")):
        sub = add(name, text)
        sub.add_argument("scene", metavar="SCENE", nargs="+" if name == "check" else None,
                         help="a shipped name or a path")
        if name == "check":
            continue
        sub.add_argument("--out", type=Path, help="output file or folder (default under out/)")
        sub.add_argument("--force", action="store_true", help="replace an output that is there")
        if name in ("film", "still"):
            sub.add_argument("--slot", help="whose eye (default: the scene's)")
            sub.add_argument("--draft", action="store_true", help="half size, half rate, edges not smoothed")
            sub.add_argument("--plain", action="store_true", help="no overlay")
            sub.add_argument("--view", default="seat", choices=("seat", "chase", "spectator"),
                             help="from where (default: the slot's seat)")
            sub.add_argument("--look", default="gaze", choices=("gaze", "lead", "ahead", "ground"),
                             help="which way from the seat (default gaze: as the scene's watch says)")
            sub.add_argument("--twin", choices=("side", "stack", "ghost"),
                             help="with the flight without the fault: side by side, one above the other, or its lead "
                                  "as a faint outline")
            sub.add_argument("--peripheral", action="store_true",
                             help="blur what acuity does not give away from the gaze")
        if name == "film":
            sub.add_argument("--from", dest="start_s", type=float, metavar="S", help="first second of the script")
            sub.add_argument("--to", dest="end_s", type=float, metavar="S", help="last second of the script")
            sub.add_argument("--both", action="store_true", help="also the plain version, from the same drawing")
            sub.add_argument("--holds", action="store_true", help="hold the picture at the key moments, with words")
            sub.add_argument("--slow", action="append", default=[], metavar="FROM:TO:TIMES",
                             help="slow motion between two seconds of the script, as 33:35:4; may be given again")
            sub.add_argument("--resume", action="store_true", help="go on with what an interrupted film has kept")
        if name == "still":
            sub.add_argument("--at", dest="at_s", type=float, metavar="S", help="second of the script")
            sub.add_argument("--key-moments", action="store_true", help="one still for each key moment")
    add("list", "list shipped scenes and airframes")
    add("schema", "print the JSON Schema of the scene file").add_argument(
        "--airframe", action="store_true", help="that of the airframe file")
    add("doctor", "can this machine draw and encode")
    add_page(add)
    add_gates(add)
    add_scatter(add)
    add_map(add)
    add_batch(add)
    add_shape(add)
    return parser


def progress_bar() -> Callable[[int, int], None] | None:
    """A progress bar with time left on stderr, or None where nobody watches."""
    if not sys.stderr.isatty():
        return None
    begun = time.monotonic()

    def show(done: int, total: int) -> None:
        spent = time.monotonic() - begun
        left = spent / done * (total - done) if done else 0.0
        bar = "#" * int(30 * done / max(total, 1))
        end = "\n" if done >= total else ""
        sys.stderr.write(f"\r[{bar:<30}] {done}/{total} frames, {left:4.0f} s left {end}")
        sys.stderr.flush()

    return show


def _study(name: str, folder: Path) -> Any:
    """The study of a scene: the saved one if its scene is unchanged, else flown now and saved."""
    from render.study_io import StudyError, load_study, save_study
    from scenes.reader import read_airframe, read_scene, scene_text

    scene, text = read_scene(name), scene_text(name)
    try:
        return load_study(folder, scene_text=text)
    except StudyError:
        # only here: the flight code takes a second to load, and a still of a saved study shows after three
        from render.study import work_through
        from terrain.ground import read_ground

        study = work_through(scene, read_airframe, read_ground(scene.ground, scene.seed), text)
        save_study(study, folder)
        return study


def _fly(args: argparse.Namespace) -> int:
    from render.output.tables import study_table, write_tables
    from render.study import work_through
    from render.study_io import save_study
    from scenes.reader import read_airframe, read_scene, scene_text
    from terrain.ground import read_ground

    scene = read_scene(args.scene)
    folder = args.out or Path("out") / scene.name
    study = work_through(scene, read_airframe, read_ground(scene.ground, scene.seed), scene_text(args.scene))
    # the default folder is the tool's own; a named one is kept unless --force
    paths = write_tables(study, folder, force=args.force or args.out is None)
    save_study(study, folder)
    if args.json:
        print(json.dumps(dict(study.verdict), default=float))
    else:
        print(study_table(study))
        print(f"\nwritten: {', '.join(str(p) for p in paths)}")
    return 0


def _target(out: Path | None, folder: Path, name: str) -> Path:
    """Where an output goes: ``--out`` as a file or an existing folder, else a name in the scene's own folder."""
    if out is None:
        return folder / name
    return out / name if out.is_dir() else out


def _slot(study: Any, wanted: str | None) -> str:
    from render.errors import LatepullError

    slot: str = wanted or study.scene.film.slot
    if slot not in study.faulted.names:
        raise LatepullError(f"--slot: read {slot}, wanted one of {', '.join(study.faulted.names)}")
    return slot


def _picture(args: argparse.Namespace, size_px: tuple[int, int]) -> tuple[Any, str]:
    """The source of frames that the options ask for, and what the film has to say of it."""
    from render.output.stage_options import StageOptions, picture_words, stage_spec

    options = StageOptions(view=args.view, look=args.look, twin=args.twin, peripheral=args.peripheral,
                           smooth=not args.draft)
    return stage_spec(options, size_px, overlay=not args.plain,
                      plain_too=getattr(args, "both", False)), picture_words(options)


def _kind(args: argparse.Namespace) -> str:
    """What tells the default file of one picture from another's, as a part of its name."""
    words = [args.view if args.view != "seat" else "", args.look if args.look != "gaze" else "", args.twin or "",
             "peripheral" if args.peripheral else "", "plain" if args.plain else "", "draft" if args.draft else ""]
    return "".join(f"_{word}" for word in words if word)


def _slow(texts: Sequence[str]) -> tuple[Any, ...]:
    from render.errors import LatepullError
    from render.output.shot import Slow

    made = []
    for text in texts:
        try:
            start_s, end_s, times = (float(part) for part in text.split(":"))
        except ValueError:
            start_s = end_s = times = float("nan")
        if not (start_s < end_s and 1.0 <= times <= 100.0):
            raise LatepullError(f"--slow: read {text}, wanted FROM:TO:TIMES in seconds of the script and times slower "
                                "(1 to 100), as 33:35:4")
        made.append(Slow(start_s, end_s, times))
    return tuple(made)


def _film(args: argparse.Namespace) -> int:
    from render.output.drawers import Drawers
    from render.output.film import write_film
    from render.output.parts import kept_frames
    from render.output.shot import key_holds, plan_shot
    from render.output.source import SourceSpec
    from scenes.reader import read_scene

    folder = Path("out") / read_scene(args.scene).name
    slow = _slow(args.slow)
    with Drawers(args.scene, SourceSpec(smooth=not args.draft).modules) as drawers:  # load while the scene is flown
        study = _study(args.scene, folder)
        slot = _slot(study, args.slot)
        target = _target(args.out, folder, f"{slot}{_kind(args)}.mp4")
        shot = plan_shot(study, slot, start_s=args.start_s, end_s=args.end_s, draft=args.draft, slow=slow,
                         holds=key_holds(study, slot) if args.holds and not args.plain else ())
        source, note = _picture(args, shot.size_px)
        plain = target.with_name(f"{target.stem}_plain.mp4") if args.both and not args.plain else None
        try:
            write_film(study, slot, target, shot=shot, overlay=not args.plain, plain_path=plain, force=args.force,
                       source=source, note=note, progress=progress_bar(), keep=True, resume=args.resume,
                       drawers=drawers)  # fmt: skip
        except BaseException:
            done, total = kept_frames(target)
            if done:
                print(f"\n{done} of {total} frames are kept; the same command with --resume goes on from them",
                      file=sys.stderr)
            raise
    films = [str(target), *([str(plain)] if plain else [])]
    _say(args, {"films": films, "frames": len(shot)}, f"{', '.join(films)}: {len(shot)} frames")
    return 0


def _still(args: argparse.Namespace) -> int:
    from render.output.stills import write_key_stills, write_still
    from scenes.reader import read_scene

    folder = Path("out") / read_scene(args.scene).name
    study = _study(args.scene, folder)
    slot = _slot(study, args.slot)
    plan = study.scene.film
    size = (plan.width_px // 4 * 2, plan.height_px // 4 * 2) if args.draft else (plan.width_px, plan.height_px)
    source, note = _picture(args, size)
    if args.key_moments:
        paths = write_key_stills(study, slot, args.out or folder, size_px=size, force=args.force,
                                  source=source, note=note)
        _say(args, {"stills": [str(p) for p in paths]}, "\n".join(str(p) for p in paths))
        return 0
    fault_s = study.faulted.fault_s
    at = args.at_s if args.at_s is not None else (fault_s if fault_s is not None else study.faulted.events["top"])
    path = write_still(study, slot, at, _target(args.out, folder, f"{slot}_{at:.1f}s.png"), size_px=size,
                       overlay=not args.plain, force=args.force, source=source, note=note)
    _say(args, {"still": str(path), "time_s": at}, str(path))
    return 0


def _say(args: argparse.Namespace, data: dict[str, Any], words: str) -> None:
    print(json.dumps({**data, "caution": CAUTION}) if args.json else f"{words}\n{CAUTION}")


def _check(args: argparse.Namespace) -> int:
    from scenes.reader import SceneError, read_scene

    titles: dict[str, str] = {}
    faulty: dict[str, SceneError] = {}
    for name in dict.fromkeys(args.scene):
        try:
            titles[name] = read_scene(name).title
        except SceneError as exc:
            faulty[name] = exc
    complaints = [one for fault in faulty.values() for one in fault.details()["complaints"]]
    for fault in faulty.values():
        print(fault, file=sys.stderr)
    code = 2 if faulty else 0
    data = {"scenes": titles, "faulty": list(faulty), "complaints": complaints, "exit_code": code}
    words = [f"{name}: no faults found ({title})" for name, title in titles.items()]
    words += [f"{name}: {_count(len(fault.complaints), 'fault')}" for name, fault in faulty.items()]
    _say(args, data, "\n".join(words))
    return code


def _count(number: int, noun: str) -> str:
    return f"{number} {noun}{'' if number == 1 else 's'}"


def _list(args: argparse.Namespace) -> int:
    from scenes.reader import airframe_names, read_scene, scene_names
    from terrain.ground import ground_names

    scenes = {name: read_scene(name).title for name in scene_names()}
    lines = [f"  {name:<24} {title}" for name, title in scenes.items()]
    words = "\n".join(["Scenes:", *lines, f"Airframes: {', '.join(airframe_names())}",
                       f"Terrains: {', '.join(ground_names())}"])
    _say(args, {"scenes": scenes, "airframes": list(airframe_names()), "terrains": list(ground_names())}, words)
    return 0


def _schema(args: argparse.Namespace) -> int:
    from scenes.schema import airframe_schema, scene_schema

    print(json.dumps(airframe_schema() if args.airframe else scene_schema(), indent=2))
    return 0


def _doctor(args: argparse.Namespace) -> int:
    from importlib.metadata import version

    from render.errors import MachineError
    from render.output.encode import encoder_path
    from render.output.page_pdf import require_paper
    from render.picture.probe import probe_drawing

    lines = [f"Python {sys.version.split()[0]}"]
    lines += [f"{name} {version(name)}" for name in ("numpy", "scipy", "numba", "pyvista", "imageio", "PyYAML")]
    good = True
    try:
        lines.append(f"encoder: {encoder_path()}")
    except MachineError as exc:
        good = False
        lines.append(str(exc))
    report = probe_drawing()
    lines.append(f"drawing: {report}")
    good = good and bool(getattr(report, "ok", False))
    try:
        require_paper()
        lines.append("paper: pages can be set as PDF")
    except MachineError as exc:
        lines.append(f"paper: {exc}")  # films and pages do without
    lines.append("The first flight compiles the flight code, about half a minute, once.")
    _say(args, {"ok": good, "report": lines}, "\n".join(lines))
    return 0 if good else 3


COMMANDS: dict[str, Callable[[argparse.Namespace], int]] = {
    "check": _check, "fly": _fly, "film": _film, "still": _still, "list": _list, "schema": _schema, "doctor": _doctor,
    "page": page_command, "gates": gates_command, "scatter": scatter_command, "map": map_command,
    "batch": batch_command, "shape": shape_command,
}


def _interrupted(*_: object) -> None:
    raise KeyboardInterrupt


def main(argv: Sequence[str] | None = None) -> int:
    """Run one command; returns the exit code."""
    if threading.current_thread() is threading.main_thread():
        signal.signal(signal.SIGTERM, _interrupted)  # ends as Ctrl-C does: no process, no half file
    for stream in (sys.stdout, sys.stderr):
        if (stream.encoding or "").lower().replace("-", "") != "utf8" and hasattr(stream, "reconfigure"):
            stream.reconfigure(errors="backslashreplace")  # a title in Greek must not end a command on a Latin terminal
    args = build_parser().parse_args(argv)
    try:
        done = COMMANDS[args.command](args)
        sys.stdout.flush()
        return done
    except BrokenPipeError:
        # whoever read the output (head, less) has had enough; nothing is wrong, and the exit must not try again
        os.dup2(os.open(os.devnull, os.O_WRONLY), sys.stdout.fileno())
        return 0
    except KeyboardInterrupt:
        print("interrupted; nothing half-made is left", file=sys.stderr)
        return 130
    except Exception as exc:
        code = getattr(exc, "exit_code", None)
        if isinstance(exc, OSError) and code is None:
            print(f"{exc.filename or 'file'}: {exc.strerror or exc}", file=sys.stderr)
            return 2
        if code is None or os.environ.get("LATEPULL_DEBUG"):
            raise
        if args.json:
            details = exc.details() if hasattr(exc, "details") else {}
            print(json.dumps({"error": str(exc), "exit_code": code, **details}, default=str))
        print(str(exc), file=sys.stderr)
        return int(code)


if __name__ == "__main__":
    sys.exit(main())
