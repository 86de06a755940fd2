"""One of a film's drawing processes: ``python -m render.output.film_worker JOB``.

Draws a contiguous run of frames into one segment per version (with overlay, plain) and reports on its
standard output, one JSON object a line: {"done": n} or {"error": words, "exit_code": n}. When the starting process
is gone the report fails and the worker ends with it.
"""

from __future__ import annotations

import gc
import json
import os
import signal
import sys
import time
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
from render.output.source import SourceSpec
from render.study_io import load_study
from render.types import Study

REPORT_EVERY_S = 0.2


@dataclass(frozen=True, slots=True)
class Job:
    """What one worker draws; plain JSON in a file of the scratch folder."""

    study: str
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
    overlay_path: str | None
    plain_path: str | None
    note: str
    preset: str
    pieces: list[int]  # frames of each piece; a finished piece need not be drawn again


def segment_paths(job: Job, piece: int) -> list[Path]:
    """The files of one piece: with overlay, plain, as wanted."""
    return [Path(p).with_name(f"{Path(p).stem}_{piece:03d}.mp4") for p in (job.overlay_path, job.plain_path) if p]


def frames(job: Job, study: Study, first: int = 0) -> Generator[tuple[Frame | None, Frame | None], None, None]:
    """Each frame with its overlay and plain, None where that version isn't wanted or (plain) stands still in a hold.

    first: the frame to begin with.
    """
    with ExitStack() as stack:
        source = None
        overlay = None
        if job.overlay_path:
            overlay = Overlay(study, job.slot, job.size_px, job.start_s, job.end_s, job.note)
        cards = {plain: card_frame(study, job.slot, job.size_px, plain=plain, note=job.note) for plain in (False, True)}
        picture: Frame | None = None
        canvas = np.empty((job.size_px[1], job.size_px[0], 3), np.uint8)
        shown = float("nan")
        rows = list(zip(job.time_s, job.caption, job.card, strict=True))
        for time_s, caption, card in rows[first:]:
            if card:
                yield (cards[False] if job.overlay_path else None), (cards[True] if job.plain_path else None)
                continue
            held = time_s == shown
            if not held or picture is None:
                if source is None:
                    spec = SourceSpec(job.factory, job.options)
                    source = stack.enter_context(spec.open(study, job.slot, job.size_px))
                picture = source.frame(time_s)
                shown = time_s
            plain = picture if job.plain_path and not held else None
            if overlay is not None:
                np.copyto(canvas, picture)
                overlay.draw(canvas, time_s, caption)
            yield (canvas if overlay is not None else None), plain


def work(job: Job) -> Iterator[int]:
    """Draw and encode a job, piece by piece; yields how many frames are done. Raises LatepullError."""
    study = load_study(job.study)
    done = first = 0
    while first < len(job.pieces) and all(path.exists() for path in segment_paths(job, first)):
        done += job.pieces[first]
        first += 1
    yield done
    drawn = frames(job, study, done)
    with closing(drawn):
        for piece in range(first, len(job.pieces)):
            paths = segment_paths(job, piece)
            parts = [path.with_suffix(".part") for path in paths]
            with ExitStack() as stack:
                made = iter([SegmentWriter(p, job.size_px, job.rate_fps, job.preset) for p in parts])
                writers = [stack.enter_context(next(made)) if wanted else None
                           for wanted in (job.overlay_path, job.plain_path)]
                for versions in islice(drawn, job.pieces[piece]):
                    for writer, frame in zip(writers, versions, strict=True):
                        if writer is not None and frame is not None:
                            writer.write(frame)
                    done += 1
                    yield done
            for part, path in zip(parts, paths, strict=True):
                os.replace(part, path)


def main(path: str) -> int:
    """Run the job in a file; returns the exit code."""
    signal.signal(signal.SIGINT, signal.SIG_IGN)  # the starting process decides what Ctrl-C ends
    data = json.loads(Path(path).read_text(encoding="utf-8"))
    job = Job(**{**data, "size_px": tuple(data["size_px"])})
    said = 0.0
    gc.collect()
    gc.freeze()  # what the imports made stays anyway: not looked through again and again while frames are drawn
    try:
        for done in work(job):
            now = time.monotonic()
            if now - said >= REPORT_EVERY_S or done == len(job.time_s):
                said = now
                print(json.dumps({"done": done}), flush=True)
    except BrokenPipeError:
        sys.stdout = None  # type: ignore[assignment]  # nobody listens any more; no second fault at exit
        return 1
    except LatepullError as exc:
        print(json.dumps({"error": str(exc), "exit_code": exc.exit_code}), flush=True)
        return exc.exit_code
    return 0


if __name__ == "__main__":
    raise SystemExit(main(sys.argv[1]))
