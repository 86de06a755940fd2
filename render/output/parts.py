"""The pieces of a film on their way: kept when it is interrupted, so that drawn frames are not drawn again."""

from __future__ import annotations

import hashlib
import json
import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import asdict
from pathlib import Path

from render.errors import LatepullError
from render.files import output_error, scratch_folder
from render.output.drawers import JOB
from render.output.film_worker import Job, is_drawn, read_job, segment_paths
from render.types import Study

KEY = "key.json"


def film_key(study: Study, job: Job) -> str:
    """What the pieces are of: the scene's text, the versions and figures behind it, and each frame's plan."""
    plan = {k: v for k, v in asdict(job).items() if k != "folder"}
    data = {"scene": study.scene_text, "versions": dict(study.versions), "verdict": dict(study.verdict), "plan": plan}
    return hashlib.sha256(json.dumps(data, sort_keys=True, default=str).encode()).hexdigest()


def kept_folder(target: Path) -> Path:
    """Where the pieces of an interrupted film stay, hidden beside it."""
    return target.with_name(f".{target.name}.kept")


def kept_frames(target: Path) -> tuple[int, int]:
    """How many frames of an interrupted film are kept, and of how many; (0, 0) if none."""
    try:
        data = json.loads((kept_folder(target) / KEY).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return 0, 0
    return int(data.get("done", 0)), int(data.get("total", 0))


def done_frames(job: Job) -> int:
    """Frames of a job's finished pieces."""
    return sum(size for piece, size in enumerate(job.pieces) if is_drawn(job, piece))


@contextmanager
def film_folder(target: Path, key: str, *, keep: bool, resume: bool) -> Iterator[Path]:
    """The folder a film is made in; with ``keep`` its finished pieces stay when the work is cut off.

    resume: go on with what is there, if anything. Raises LatepullError if that is of another film.
    """
    if not keep:
        with scratch_folder(target) as folder:
            yield folder
        return
    folder = kept_folder(target)
    try:
        if folder.exists():
            _take_over(folder, target, key, resume=resume)
        folder.mkdir(parents=True, exist_ok=True)
        (folder / KEY).write_text(json.dumps({"key": key}), encoding="utf-8")
    except OSError as exc:
        raise output_error(exc, target) from exc
    finished = False
    try:
        yield folder
        finished = True
    except OSError as exc:
        raise output_error(exc, target) from exc
    finally:
        if finished or not _keep(folder, key):
            shutil.rmtree(folder, ignore_errors=True)


def _take_over(folder: Path, target: Path, key: str, *, resume: bool) -> None:
    try:
        data = json.loads((folder / KEY).read_text(encoding="utf-8"))
    except (OSError, ValueError):
        data = {}
    if resume and data.get("key") != key:
        raise LatepullError(
            f"--resume: the frames kept for {target} are of another film (the scene, its plan, an option or a version "
            "changed since); leave --resume out to begin anew"
        )
    if not resume:
        shutil.rmtree(folder, ignore_errors=True)


def _keep(folder: Path, key: str) -> bool:
    """Note what is finished and clear what is not; False if there is nothing worth keeping."""
    try:
        job = read_job(str(folder / JOB))
        done, total = done_frames(job), len(job.time_s)
        if not done:
            return False
        wanted = {path for piece in range(len(job.pieces)) for path in segment_paths(job, piece)}
        for path in folder.iterdir():
            if path.is_file() and path not in wanted:
                path.unlink(missing_ok=True)
            elif path.is_dir():
                shutil.rmtree(path, ignore_errors=True)
        (folder / KEY).write_text(json.dumps({"key": key, "done": done, "total": total}), encoding="utf-8")
    except (OSError, ValueError, TypeError):
        return False
    return True
