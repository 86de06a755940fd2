"""The command ``batch``: a list of films, flights and maps, made one after another here or on a cluster.

The list is YAML: ``jobs``, each a command with its scene and that command's options by name::

    jobs:
      - film: late_freeze
        slot: left
        draft: yes
      - fly: early_freeze

A finished job leaves ``job.json`` beside its outputs; as long as scene text, options and program are the same,
it is not made again.
"""

from __future__ import annotations

import argparse
import contextlib
import hashlib
import io
import json
import subprocess
import sys
import tempfile
from collections.abc import Callable, Sequence
from dataclasses import dataclass
from pathlib import Path
from typing import Any

from render.command_work import CaseBar

KINDS = ("fly", "film", "still", "map", "gates", "scatter", "shape")
OWN = ("out", "force", "json", "resume", "cluster")  # options a batch decides itself
NOTE = "job.json"


@dataclass(frozen=True, slots=True)
class Job:
    """One line of the list: its folder's name, the command line, the scene's text."""

    name: str
    argv: tuple[str, ...]
    key: str  # hash of the scene's text, the command line and the program


@dataclass(frozen=True, slots=True)
class Made:
    """What a job has made: its exit code, what it said, its files by name."""

    code: int
    said: str
    files: dict[str, bytes]


def add_batch(add: Callable[[str, str], argparse.ArgumentParser]) -> None:
    """Give the command line its ``batch``."""
    sub = add("batch", "make a list of films, flights and maps; what is finished is not made again")
    sub.add_argument("list", metavar="LIST.yaml", type=Path, help="YAML with jobs: commands, scenes, options")
    sub.add_argument("--cluster", metavar="ADDRESS", help="a Dask scheduler, such as tcp://host:8786 (default: here)")
    sub.add_argument("--force", action="store_true", help="make again what another scene text or version has made")
    sub.add_argument("--out", type=Path, help="output folder (default out/<list's name>)")


def read_jobs(path: Path, parser: argparse.ArgumentParser) -> list[Job]:
    """The jobs of a list. Raises SceneError with all faults of the list and its scenes at once."""
    from render.decide.runner import marks, source_hash
    from scenes.complaint import Log, SceneError, any_of, nearest
    from scenes.reader import scene_text
    from scenes.yamlnode import Mapping, Scalar, Sequence, compose, read_text, what

    root = compose(read_text(path), str(path))
    log = Log()
    for key, (mark, _) in root.items.items():
        if key != "jobs":
            log.add(mark, key, f"the key {key}", "jobs", nearest(key, ["jobs"]))
    listed = root.get("jobs")
    if not isinstance(listed, Sequence) or not listed.items:
        log.add(root.mark if listed is None else listed.mark, "jobs", "nothing" if listed is None else what(listed),
                "a list of jobs, such as - film: late_freeze")
        log.raise_if_any()
    assert isinstance(listed, Sequence)
    program = json.dumps({**marks(), "source": source_hash(whole=True)}, sort_keys=True)
    jobs: list[Job] = []
    names: dict[str, int] = {}
    for i, node in enumerate(listed.items):
        where = f"jobs.{i}"
        if not isinstance(node, Mapping):
            log.add(node.mark, where, what(node), f"a mapping that begins with {any_of(KINDS)}")
            continue
        kinds = [key for key in node.items if key in KINDS]
        if len(kinds) != 1:
            log.add(node.mark, where, f"{len(kinds)} commands", f"one of {any_of(KINDS)} with its scene")
            continue
        kind = kinds[0]
        argv, name = [kind], None
        for key, (mark, value) in node.items.items():
            if not isinstance(value, Scalar):
                log.add(value.mark, f"{where}.{key}", what(value), "a single value")
            elif key == kind:
                argv.insert(1, _scene_path(value.text, path))
            elif key == "name":
                name = value.text
            elif key in OWN:
                log.add(mark, f"{where}.{key}", f"the key {key}", "an option that a batch does not decide itself")
            elif value.kind == "bool":
                argv += [f"--{key}"] if value.text.lower() in ("yes", "true", "on") else []
            else:
                argv += [f"--{key}={value.text}"]
        fault = _refused(parser, argv)
        if fault:
            log.add(node.mark, where, " ".join(argv), f"a command line that stands ({fault})")
            continue
        try:
            text = scene_text(argv[1])
        except SceneError as exc:
            for c in exc.complaints:
                if c.file:
                    log.complaints.append(c)
                else:
                    log.add(node.mark, f"{where}.{kind}", c.read, c.wanted, c.nearest)
            continue
        base = name or f"{kind}_{Path(argv[1]).stem}"
        names[base] = names.get(base, 0) + 1
        if name is not None and (names[base] > 1 or "/" in name or name.startswith(".")):
            log.add(node.mark, f"{where}.name", name, "a name for a folder that no other job has")
        full = base if names[base] == 1 else f"{base}_{names[base]}"
        key_text = json.dumps([text, argv, program])
        jobs.append(Job(full, tuple(argv), hashlib.sha256(key_text.encode()).hexdigest()))
    log.raise_if_any()
    return jobs


def _scene_path(text: str, list_path: Path) -> str:
    """A scene as the command takes it: a shipped name as it is, a path from where the list stands."""
    from scenes import shelf

    return str((list_path.parent / text).resolve()) if shelf.is_path(text) else text


def _refused(parser: argparse.ArgumentParser, argv: Sequence[str]) -> str | None:
    """Why the parser does not take a command line, or None if it does."""
    said = io.StringIO()
    try:
        with contextlib.redirect_stderr(said):
            parser.parse_args(argv)
    except SystemExit:
        return said.getvalue().strip().rpartition("error: ")[2] or "not understood"
    return None


def run_job(common: None, job: Job) -> Made:
    """Run one job in a process and a folder of its own; a chunk of work for a runner."""
    with tempfile.TemporaryDirectory(prefix="latepull-") as folder:
        ran = subprocess.run([sys.executable, "-m", "render.command", *job.argv], cwd=folder, text=True,
                             capture_output=True, check=False)
        files = {}
        if ran.returncode == 0:
            for file in sorted(Path(folder).rglob("*")):
                # below out/<scene>: the job's own folder takes that place
                inside = file.relative_to(folder).parts[2:]
                if file.is_file() and inside and not any(part.startswith(".") for part in inside):
                    files["/".join(inside)] = file.read_bytes()
        return Made(ran.returncode, (ran.stderr or ran.stdout).strip(), files)


def finished(job: Job, folder: Path) -> bool | None:
    """Whether a job has been made: True, False, or None if another scene text or version has made it."""
    try:
        note = json.loads((folder / NOTE).read_text(encoding="utf-8"))
        files = [folder / name for name in note["files"]]
    except (OSError, ValueError, KeyError, TypeError):
        return False
    if not all(file.is_file() for file in files):
        return False
    return True if note.get("key") == job.key else None


def keep(job: Job, made: Made, folder: Path) -> None:
    """Write a job's files, each whole or not at all, and last the note that says it is finished."""
    from render.files import whole_file, write_text

    (folder / NOTE).unlink(missing_ok=True)
    for name, data in made.files.items():
        target = folder / name
        target.parent.mkdir(parents=True, exist_ok=True)
        with whole_file(target, force=True) as part:
            part.write_bytes(data)
    note = {"key": job.key, "command": list(job.argv), "files": sorted(made.files)}
    write_text(folder / NOTE, json.dumps(note, indent=2) + "\n", force=True)


def batch_command(args: argparse.Namespace) -> int:
    """Make what is not finished; returns the exit code: 0, or the highest of the jobs that failed."""
    from render.command import build_parser
    from render.decide.runner import runner
    from render.errors import LatepullError

    jobs = read_jobs(args.list, build_parser())
    out = args.out or Path("out") / args.list.stem
    states = {job.name: finished(job, out / job.name) for job in jobs}
    changed = [name for name, state in states.items() if state is None]
    if changed and not args.force:
        raise LatepullError(f"made from another scene text, options or version: {', '.join(changed)}; give --force to "
                            f"make them again, or --out with another folder than {out}")
    todo = [job for job in jobs if not states[job.name]]
    bar = CaseBar("jobs")
    results: dict[str, dict[str, Any]] = {
        job.name: {"exit_code": 0, "made": False, "folder": str(out / job.name)} for job in jobs}
    if not args.json:
        bar.note(f"{len(jobs)} jobs, {len(jobs) - len(todo)} of them finished already")
    worst, done = 0, len(jobs) - len(todo)
    with runner(args.cluster) as run:
        try:
            bar.show(done, len(jobs))
            for number, made in run.run(run_job, None, list(enumerate(todo))):
                job = todo[number]
                if made.code == 0:
                    keep(job, made, out / job.name)
                else:
                    bar.note(f"\n{job.name}: {made.said}")
                worst = max(worst, made.code)
                results[job.name] |= {"exit_code": made.code, "made": made.code == 0}
                done += 1
                bar.show(done, len(jobs))
        except KeyboardInterrupt:
            bar.note(f"\ninterrupted; {done} of {len(jobs)} jobs are finished, the same command goes on from them")
            return 130
    if args.json:
        print(json.dumps({"jobs": results, "exit_code": worst}))
    else:
        made_now = sum(bool(r["made"]) for r in results.values())
        failed = sum(r["exit_code"] != 0 for r in results.values())
        print(f"{out}: {made_now} made, {len(jobs) - len(todo)} finished before, {failed} failed")
    return worst
