"""The drawing side of a film: ``python -m render.output.film_worker NAME MODULE ...``.

It loads the modules that drawing needs (NAME is only for the system's list of processes), then reads one line from
its standard input: the path of a job. The scene is built once; then it forks (on Linux; elsewhere it starts) one
process for each worker, before any of them touches the graphics driver. Workers take the film's pieces from a common
pipe until none is left, so that they end together.

Reports are one JSON object a line on standard output: {"run": i, "done": n}, {"error": words, "exit_code": n} and
{"run": i, "exit": code}. When the starting process is gone the report fails and the worker ends with it.
"""

from __future__ import annotations

import gc
import importlib
import json
import os
import signal
import subprocess
import sys
import time
import traceback
from collections.abc import Generator, Iterator
from contextlib import ExitStack, closing
from dataclasses import dataclass
from itertools import islice
from pathlib import Path
from typing import Any

import numpy as np

from render.errors import LatepullError
from render.output.card import card_frame
from render.output.encode import SegmentWriter
from render.output.overlay import Frame, Overlay
from render.output.source import FrameSource, SourceSpec, caption_bottom_px
from render.study_io import load_study

REPORT_EVERY_S = 0.2
FORKS = sys.platform.startswith("linux")  # elsewhere a system's graphics may not outlive a fork
NUMBER_BYTES = 4  # of a piece's number in the pipe; far below what a pipe hands over whole


@dataclass(frozen=True, slots=True)
class Job:
    """What is drawn of a film; plain JSON in a file of the scratch folder, beside the study."""

    folder: str  # of the study and the pieces
    slot: str
    size_px: tuple[int, int]
    rate_fps: float
    start_s: float
    end_s: float
    time_s: list[float]
    caption: list[str]
    card: list[bool]
    factory: str
    options: dict[str, Any]
    kinds: list[str]  # overlay, plain: the versions wanted
    note: str
    preset: str
    pieces: list[int]  # frames of each piece; a finished piece need not be drawn again
    workers: int


def segment_paths(job: Job, piece: int) -> list[Path]:
    """The files of one piece, one for each version wanted."""
    return [Path(job.folder) / f"{kind}_{piece:03d}.mp4" for kind in job.kinds]


def is_drawn(job: Job, piece: int) -> bool:
    """Whether all files of a piece are there."""
    return all(path.exists() for path in segment_paths(job, piece))


class Drawing:
    """A job opened: the source of its frames, its overlay and its cards. A context manager."""

    def __init__(self, job: Job) -> None:
        """Raises LatepullError; the graphics driver is touched by the first frame only."""
        self.job = job
        self._stack = ExitStack()
        study = load_study(Path(job.folder) / "study")
        source = SourceSpec(job.factory, job.options).open(study, job.slot, job.size_px)
        self._source: FrameSource = self._stack.enter_context(source)
        self._overlay = None
        if "overlay" in job.kinds:
            self._overlay = Overlay(study, job.slot, job.size_px, job.start_s, job.end_s, job.note,
                                    caption_bottom_px(self._source))
        self._cards = {kind: card_frame(study, job.slot, job.size_px, plain=kind == "plain", note=job.note)
                       for kind in job.kinds}

    def __enter__(self) -> Drawing:
        return self

    def __exit__(self, *_: object) -> None:
        self._stack.close()

    def frames(self, first: int, last: int) -> Generator[list[Frame | None], None, None]:
        """Frames ``first`` to before ``last``: of each version its picture, None where a plain one stands still."""
        job = self.job
        picture: Frame | None = None
        canvas = np.empty((job.size_px[1], job.size_px[0], 3), np.uint8)
        shown = float("nan")
        for time_s, caption, card in zip(*(row[first:last] for row in (job.time_s, job.caption, job.card)),
                                         strict=True):
            if card:
                yield [self._cards[kind] for kind in job.kinds]
                continue
            held = time_s == shown
            if not held or picture is None:
                picture = self._source.frame(time_s)
                shown = time_s
            if self._overlay is not None:
                np.copyto(canvas, picture)
                self._overlay.draw(canvas, time_s, caption)
            yield [canvas if kind == "overlay" else None if held else picture for kind in job.kinds]

    def piece(self, number: int) -> Iterator[int]:
        """Draw and encode one piece; yields after each frame. Raises LatepullError."""
        job = self.job
        paths = segment_paths(job, number)
        parts = [path.with_suffix(".part") for path in paths]
        first = sum(job.pieces[:number])
        drawn = self.frames(first, first + job.pieces[number])
        with closing(drawn), ExitStack() as stack:
            writers = [stack.enter_context(SegmentWriter(part, job.size_px, job.rate_fps, job.preset))
                       for part in parts]
            for versions in islice(drawn, job.pieces[number]):
                for writer, frame in zip(writers, versions, strict=True):
                    if frame is not None:
                        writer.write(frame)
                yield 1
        for part, path in zip(parts, paths, strict=True):
            os.replace(part, path)


def work(drawing: Drawing, run: int, numbers: Iterator[int]) -> int:
    """Draw pieces by number until there are no more, reporting; returns the exit code."""
    said, done = 0.0, 0
    try:
        for number in numbers:
            for one in drawing.piece(number):
                done += one
                now = time.monotonic()
                if now - said >= REPORT_EVERY_S:
                    said = now
                    report(run=run, done=done)
        report(run=run, done=done)
    except BrokenPipeError:
        return 1  # nobody listens any more
    except LatepullError as exc:
        return failed(exc)
    except Exception:
        traceback.print_exc()
        return 1
    return 0


def report(**words: Any) -> None:
    """One line to the starting process; whole, though several processes share the pipe."""
    os.write(1, (json.dumps(words) + "\n").encode())


def failed(exc: LatepullError) -> int:
    """Tell the starting process of an error in words; returns the exit code."""
    report(error=str(exc), exit_code=exc.exit_code)
    return exc.exit_code


def queue_of(numbers: list[int]) -> int:
    """The reading end of a pipe that holds pieces' numbers and then ends."""
    reading, writing = os.pipe()
    room = 4096 // NUMBER_BYTES  # the least a pipe holds without a reader
    if len(numbers) > room:
        raise ValueError(f"{len(numbers)} pieces, wanted at most {room}")
    os.write(writing, b"".join(number.to_bytes(NUMBER_BYTES, "big") for number in numbers))
    os.close(writing)
    return reading


def taken(reading: int) -> Iterator[int]:
    """Numbers from the common pipe until it is empty."""
    while data := os.read(reading, NUMBER_BYTES):
        yield int.from_bytes(data, "big")


def forked(drawing: Drawing, reading: int, count: int) -> dict[int, int]:
    """Fork ``count`` workers; their run numbers by process id."""
    gc.collect()
    gc.freeze()  # neither looked through again and again nor copied to each worker
    runs = {}
    for run in range(count):
        pid = os.fork()
        if pid == 0:
            code = 1
            try:
                code = work(drawing, run, taken(reading))
                drawing.__exit__()
            finally:
                sys.stderr.flush()
                os._exit(code)  # what is left to tidy belongs to the process that forked
        runs[pid] = run
    return runs


def wait_for(runs: dict[int, int]) -> int:
    """Report the end of each forked worker; the worst exit code."""
    worst = 0
    while runs:
        pid, status = os.wait()
        if pid in runs:
            code = os.waitstatus_to_exitcode(status)
            worst = max(worst, abs(code))
            report(run=runs.pop(pid), exit=code)
    return worst


def started(path: str, shares: list[list[int]]) -> int:
    """Where forking is not to be had: a process for each worker with its share of the pieces; the worst exit code."""
    command = [sys.executable, "-m", "render.output.film_worker", "share", path]
    running = {run: subprocess.Popen([*command, str(run), *map(str, share)], stdin=subprocess.DEVNULL)
               for run, share in enumerate(shares)}
    worst = 0
    while running:
        time.sleep(REPORT_EVERY_S)
        for run, process in list(running.items()):
            code = process.poll()
            if code is not None:
                worst = max(worst, abs(code))
                report(run=run, exit=code)
                del running[run]
    return worst


def read_job(path: str) -> Job:
    """A job from its file."""
    data = json.loads(Path(path).read_text(encoding="utf-8"))
    return Job(**{**data, "size_px": tuple(data["size_px"])})


def draw(path: str, forks: bool) -> int:
    """Have all missing pieces of a job drawn; returns the exit code."""
    job = read_job(path)
    missing = [number for number in range(len(job.pieces)) if not is_drawn(job, number)]
    report(run=-1, done=sum(job.pieces) - sum(job.pieces[number] for number in missing))
    count = min(job.workers, len(missing))
    if not forks:
        return started(path, [missing[run::count] for run in range(count)])
    if not missing:
        return 0
    with Drawing(job) as drawing:
        reading = queue_of(missing)
        runs = forked(drawing, reading, count)
        os.close(reading)
        return wait_for(runs)


def main(words: list[str], forks: bool = FORKS) -> int:
    """Wait for a job and have it drawn, or draw a share of one (``share JOB RUN PIECE ...``); returns the exit code."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)  # the starting process decides what Ctrl-C ends
    try:
        if words[:1] == ["share"]:
            with Drawing(read_job(words[1])) as drawing:
                return work(drawing, int(words[2]), iter(map(int, words[3:])))
        for name in words[1:] if forks else ():
            module = importlib.import_module(name)
            if hasattr(module, "warm_up"):
                module.warm_up()
        path = sys.stdin.readline().strip()
        return draw(path, forks) if path else 0
    except BrokenPipeError:
        return 1
    except LatepullError as exc:
        return failed(exc)


if __name__ == "__main__":
    raise SystemExit(main(sys.argv[1:]))
