"""A study to an H.264 film: workers draw runs of frames, their segments are joined without encoding again.

Both cores of a small machine are then full; what limits a film is the work per frame, not the pipe.
"""

from __future__ import annotations

import itertools
import json
import os
import queue
import re
import signal
import subprocess
import sys
import threading
import time
from collections.abc import Callable
from dataclasses import asdict, replace
from pathlib import Path
from typing import Any

import numpy as np

from render.errors import LatepullError, MachineError
from render.files import claim_output, move_whole
from render.output.card import card_texts
from render.output.encode import encoder_path, join_segments
from render.output.events import slot_title
from render.output.film_worker import Job, segment_paths
from render.output.parts import film_folder, film_key
from render.output.shot import Shot, plan_shot
from render.output.source import SourceSpec
from render.output.words import CAUTION
from render.study_io import save_study
from render.types import Study

Reports = queue.Queue[tuple[int, dict[str, Any] | None]]
Progress = Callable[[int, int], None]
END_WAIT_S = 3.0
PIECE = 120  # frames of a piece that is kept when the work is cut off
REPEATED_COST = 0.15  # a held frame or a card against a drawn one, to share the work evenly


def write_film(
    study: Study,
    slot: str,
    path: str | Path,
    *,
    shot: Shot | None = None,
    overlay: bool = True,
    plain_path: str | Path | None = None,
    force: bool = False,
    source: SourceSpec | None = None,
    workers: int = 2,
    note: str = "",
    preset: str = "superfast",
    progress: Progress | None = None,
    keep: bool = False,
    resume: bool = False,
) -> Path:
    """Film a slot into ``path`` (mp4: H.264, yuv420p, fast start); returns the path.

    shot: default ``plan_shot(study, slot)``. overlay False: the plain version. plain_path: also write the plain
    version, from the same drawing. note: a line that stays in the caption. progress(done, total) is called in
    this thread. Each film appears whole or not at all, also on Ctrl-C; no process is left. keep: pieces finished
    when the work is cut off stay, hidden beside the film (``parts.kept_frames``); resume: go on with them.
    Raises OutputExists, MachineError (encoder, drawing, disk), LatepullError.
    """
    shot = plan_shot(study, slot) if shot is None else shot
    target = Path(path)
    targets = {("overlay" if overlay else "plain"): target}
    if plain_path is not None and overlay:
        targets["plain"] = Path(plain_path)
    for one in targets.values():
        claim_output(one, force=force)
    encoder_path()
    jobs = _jobs(shot, targets, source or SourceSpec(), workers, note, preset, PIECE if keep else len(shot))
    with film_folder(target, film_key(study, jobs), keep=keep, resume=resume) as folder:
        try:
            save_study(study, folder / "study")
            jobs = [_placed(job, folder, i) for i, job in enumerate(jobs)]
            _run(jobs, folder, progress)
            for kind in targets:
                segments = [p for job in jobs for i in range(len(job.pieces)) for p in segment_paths(job, i)
                            if p.name.startswith(kind)]
                metadata = film_metadata(study, slot, plain=kind == "plain", note=note)
                join_segments(segments, folder / f"{kind}.mp4", metadata)
        except MachineError as exc:
            # the user knows the film he asked for, not the scratch files beside it
            raise MachineError(re.sub(re.escape(str(folder)) + r"[^\s:,;]*", str(target), str(exc))) from exc
        for kind, one in targets.items():
            move_whole(folder / f"{kind}.mp4", one)
    return target


def film_metadata(study: Study, slot: str, *, plain: bool, note: str = "") -> dict[str, str]:
    """What stands inside the file; the plain version's title gives nothing away. note: what its picture shows."""
    texts = card_texts(study, slot, note)
    title = f"Formation flight, {slot_title(slot).lower()}" if plain else f"{texts.title} ({texts.slot.lower()})"
    picture = f" Picture: {note}." if note else ""
    return {"title": title, "comment": f"{CAUTION} {texts.source} {texts.viewing}{picture}"}


def _placed(job: Job, folder: Path, index: int) -> Job:
    """A job with its files in the film's folder."""
    def at(kind: str | None) -> str | None:
        return None if kind is None else str(folder / f"{kind}{index}.mp4")

    return replace(job, study=str(folder / "study"), overlay_path=at(job.overlay_path), plain_path=at(job.plain_path))


def _jobs(
    shot: Shot, targets: dict[str, Path], source: SourceSpec, workers: int, note: str, preset: str, piece: int
) -> list[Job]:
    """The shot cut into contiguous runs of about equal work, each in pieces of about ``piece`` frames."""
    repeated = shot.card | np.concatenate(([False], np.diff(shot.time_s) == 0.0))
    work = np.cumsum(np.where(repeated, REPEATED_COST, 1.0))
    count = max(1, min(workers, int(work[-1] // 8)))  # a worker takes a second to start: not for a handful of frames
    ends = [int(np.searchsorted(work, work[-1] * (i + 1) / count - 1e-9)) + 1 for i in range(count)]
    # a run begins on a drawn frame: a hold must not be drawn twice, and a plain run must not be empty
    ends = [_next_drawn(repeated, end) for end in ends[:-1]] + [len(shot)]
    jobs = []
    for first, last in zip([0, *ends[:-1]], ends, strict=True):
        if first >= last:
            continue
        cuts = [first]
        while cuts[-1] < last:
            cuts.append(min(_next_drawn(repeated, cuts[-1] + piece), last))
        jobs.append(
            Job(
                study="",
                slot=shot.slot,
                size_px=shot.size_px,
                rate_fps=shot.rate_fps,
                start_s=shot.start_s,
                end_s=shot.end_s,
                time_s=shot.time_s[first:last].tolist(),
                caption=list(shot.caption[first:last]),
                card=shot.card[first:last].tolist(),
                factory=source.factory,
                options=dict(source.options),
                overlay_path="overlay" if "overlay" in targets else None,
                plain_path="plain" if "plain" in targets else None,
                note=note,
                preset=preset,
                pieces=[b - a for a, b in itertools.pairwise(cuts)],
            )
        )
    return jobs


def _next_drawn(repeated: np.ndarray[Any, np.dtype[np.bool_]], index: int) -> int:
    while index < len(repeated) and repeated[index]:
        index += 1
    return index


def _run(jobs: list[Job], folder: Path, progress: Progress | None) -> None:
    """Start the workers, pass on their progress, end them all when one fails or on Ctrl-C."""
    total = sum(len(job.time_s) for job in jobs)
    done = [0] * len(jobs)
    reports: Reports = queue.Queue()
    processes: list[subprocess.Popen[str]] = []
    try:
        for i, job in enumerate(jobs):
            processes.append(_start(i, job, folder))
            threading.Thread(target=_listen, args=(i, processes[i], reports), daemon=True).start()
        open_runs = set(range(len(jobs)))
        while open_runs:
            # a finite wait, so that Ctrl-C is taken on every system
            try:
                i, report = reports.get(timeout=0.5)
            except queue.Empty:
                continue
            if report is None:
                open_runs.discard(i)
                _check(processes[i].wait(), done[i], jobs[i], folder / f"worker{i}.log")
            elif "error" in report:
                kind = MachineError if report["exit_code"] == MachineError.exit_code else LatepullError
                raise kind(report["error"])
            else:
                done[i] = int(report["done"])
                if progress is not None:
                    progress(sum(done), total)
    finally:
        for process in processes:
            _end(process)


def _start(index: int, job: Job, folder: Path) -> subprocess.Popen[str]:
    path = folder / f"job{index}.json"
    path.write_text(json.dumps(asdict(job)), encoding="utf-8")
    env = {**os.environ, "PYTHONPATH": os.pathsep.join(p or os.getcwd() for p in sys.path)}
    with (folder / f"worker{index}.log").open("wb") as log:
        return subprocess.Popen(
            [sys.executable, "-m", "render.output.film_worker", str(path)],
            stdin=subprocess.DEVNULL,
            stdout=subprocess.PIPE,
            stderr=log,
            env=env,
            text=True,
            start_new_session=True,  # its ffmpeg can be ended with it; Ctrl-C reaches only this process
        )


def _listen(index: int, process: subprocess.Popen[str], reports: Reports) -> None:
    assert process.stdout is not None
    with process.stdout as lines:
        for line in lines:
            try:
                report = json.loads(line)
            except ValueError:
                continue  # a library's chatter
            if isinstance(report, dict) and report.keys() & {"done", "error"}:
                reports.put((index, report))
    reports.put((index, None))


def _check(code: int, done: int, job: Job, log: Path) -> None:
    if code == 0 and done == len(job.time_s):
        return
    if code < 0:
        raise MachineError(
            f"a drawing process was ended by signal {-code} ({signal.Signals(-code).name}) after {done} frames: "
            "out of memory, or no working software OpenGL; `latepull doctor` tells"
        )
    words = [line for line in log.read_text(encoding="utf-8", errors="replace").splitlines() if line.strip()]
    raise MachineError(f"a drawing process failed after {done} frames: {words[-1] if words else f'exit code {code}'}")


def _end(process: subprocess.Popen[str]) -> None:
    """End a worker and its ffmpeg, if they still run, and wait until they are gone."""
    if process.poll() == 0:
        return
    if os.name != "posix":
        process.kill()
        process.wait()
        return
    # the group: a worker that crashed leaves its ffmpeg behind for a moment
    signal_now: signal.Signals | int = signal.SIGKILL
    until = time.monotonic() + END_WAIT_S
    try:
        while time.monotonic() < until:
            os.killpg(process.pid, signal_now)
            process.poll()
            signal_now = 0  # from now on only asks whether anyone is left
            time.sleep(0.01)
    except (ProcessLookupError, PermissionError):
        pass
    process.wait()
