"""A study to an H.264 film: workers draw runs of frames, their segments are joined without encoding again.

Both cores of a small machine are then full; what limits a film is the work per frame, not the pipe.
"""

from __future__ import annotations

import itertools
import re
from contextlib import ExitStack
from dataclasses import replace
from pathlib import Path

import numpy as np
from numpy.typing import NDArray

from render.errors import MachineError
from render.files import claim_output, move_whole
from render.frames import Array
from render.output.card import card_texts
from render.output.drawers import Drawers, Progress
from render.output.encode import encoder_path, join_segments
from render.output.events import slot_title
from render.output.film_worker import Job, segment_paths
from render.output.parts import film_folder, film_key
from render.output.shot import Shot, plan_shot
from render.output.source import SourceSpec
from render.output.words import CAUTION
from render.study_io import save_study
from render.types import Study

PIECE, LEAST_PIECE = 60, 15  # frames of a piece that is kept when the work is cut off: at most, at least
REPEATED_COST = 0.15  # a held frame or a card against a drawn one, to share the work evenly
LEAST_WORK = 8  # drawn frames for which a second worker is worth its start


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
    drawers: Drawers | None = None,
) -> Path:
    """Film a slot into ``path`` (mp4: H.264, yuv420p, fast start); returns the path.

    shot: default ``plan_shot(study, slot)``. overlay False: the plain version. plain_path: also write the plain
    version, from the same drawing. note: a line that stays in the caption. progress(done, total) is called in
    this thread. Each film appears whole or not at all, also on Ctrl-C; no process is left. keep: pieces finished
    when the work is cut off stay, hidden beside the film (``parts.kept_frames``); resume: go on with them.
    drawers: processes started earlier, still unused; the caller closes them.
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
    source = source or SourceSpec(smooth=True)
    job = _job(shot, Path(), list(targets), source, workers, note, preset)
    with film_folder(target, film_key(study, job), keep=keep, resume=resume) as folder, ExitStack() as stack:
        try:
            if drawers is None:
                drawers = stack.enter_context(Drawers(str(target), source.modules))
            save_study(study, folder / "study")
            job = replace(job, folder=str(folder))
            drawers.draw(job, progress)
            for i, kind in enumerate(targets):
                segments = [segment_paths(job, piece)[i] for piece in range(len(job.pieces))]
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


def _job(
    shot: Shot, folder: Path, kinds: list[str], source: SourceSpec, workers: int, note: str, preset: str
) -> Job:
    """The shot as a job cut into pieces."""
    repeated = shot.card | np.concatenate(([False], np.diff(shot.time_s) == 0.0))
    work = np.cumsum(np.where(repeated, REPEATED_COST, 1.0))
    count = max(1, min(workers, int(work[-1] // LEAST_WORK)))
    return Job(
        folder=str(folder),
        slot=shot.slot,
        size_px=shot.size_px,
        rate_fps=shot.rate_fps,
        start_s=shot.start_s,
        end_s=shot.end_s,
        time_s=shot.time_s.tolist(),
        caption=list(shot.caption),
        card=shot.card.tolist(),
        factory=source.factory,
        options=dict(source.options),
        kinds=kinds,
        note=note,
        preset=preset,
        pieces=_pieces(repeated, work, count),
        workers=count,
    )


def _pieces(repeated: NDArray[np.bool_], work: Array, workers: int) -> list[int]:
    """Frames of each piece: half of what is left for each worker, so that none has long to wait for another.

    A piece begins on a drawn frame: a hold must not be drawn twice, and a plain piece must not be empty.
    """
    cuts = [0]
    while cuts[-1] < len(work):
        left = work[-1] - (work[cuts[-1] - 1] if cuts[-1] else 0.0)
        size = min(PIECE, max(LEAST_PIECE, round(left / (2 * workers))))
        cuts.append(min(_next_drawn(repeated, cuts[-1] + size), len(work)))
    return [b - a for a, b in itertools.pairwise(cuts)]


def _next_drawn(repeated: NDArray[np.bool_], index: int) -> int:
    while index < len(repeated) and repeated[index]:
        index += 1
    return index
