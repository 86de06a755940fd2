"""The pictures of a page: both films from one drawing, stills of the key moments; kept for the next page.

They lie in a folder of their own beside the study, with a note of which study they were drawn from. Pictures of
another study, size or source are never shown: they are drawn again.
"""

from __future__ import annotations

import hashlib
import json
from collections.abc import Callable
from contextlib import nullcontext
from dataclasses import asdict, dataclass
from pathlib import Path
from typing import Any

from PIL import Image

from render.files import whole_file, write_text
from render.output.events import Event, slot_index, study_events
from render.output.film import write_film
from render.output.shot import Shot, default_range, event_caption, key_events, plan_shot
from render.output.source import SourceSpec
from render.output.stills import still_frame
from render.types import Study

FORMAT = 1
JPEG_QUALITY = 88
AFTER_ACT_S = 1.5  # shown after the last observer's hand has moved, if the flight lasts so long
QUIET_KINDS = ("top", "vertical_down", "bottom")  # what a flight without a fault is shown by


@dataclass(frozen=True, slots=True)
class Still:
    """One key moment as a picture."""

    kind: str
    time_s: float
    caption: str
    path: Path


@dataclass(frozen=True, slots=True, eq=False)
class Pictures:
    """What a page shows of one slot: the films' plan, both films, the stills."""

    shot: Shot
    annotated: Path
    plain: Path
    stills: tuple[Still, ...]


def page_range(study: Study, slot: str) -> tuple[float, float]:
    """First and last instant of a page's film, s: the default film's, on until the last observer has acted."""
    start, end = default_range(study, slot)
    flight = study.faulted
    contact = flight.contact_s[slot_index(study, slot)]
    limit = float(flight.time_s[-1]) if contact is None else min(contact, float(flight.time_s[-1]))
    acts = [n.time_s + n.reaction_s + AFTER_ACT_S for n in study.notices.get(slot, ()) if n.time_s is not None]
    return start, max(end, min(max(acts, default=end), limit))


def page_shot(study: Study, slot: str, *, draft: bool = False) -> Shot:
    """The page's film: at life speed and without holds, which in the plain version would give the moments away."""
    start, end = page_range(study, slot)
    return plan_shot(study, slot, start_s=start, end_s=end, draft=draft)


def page_moments(study: Study, slot: str) -> tuple[Event, ...]:
    """The moments a page has stills of: the key moments, or the points of the loop where nothing fails."""
    found = key_events(study, slot)
    return found or tuple(e for e in study_events(study, slot) if e.kind in QUIET_KINDS)


def study_key(study: Study) -> str:
    """What tells one flown study from another, hexadecimal: scene, versions, flight, notices, last pulls."""
    digest = hashlib.sha256(study.scene_text.encode("utf-8"))
    digest.update(json.dumps(dict(study.versions), sort_keys=True).encode())
    for flight in (study.healthy, study.faulted):
        digest.update(flight.time_s.tobytes())
        digest.update(flight.pos_e_m.tobytes())
        digest.update(flight.quat_eb.tobytes())
    for name, notes in sorted(study.notices.items()):
        digest.update(repr((name, [(n.observer, n.time_s, n.cue, n.reaction_s) for n in notes])).encode())
    digest.update(repr((study.margin.last_pull_floor_s, study.margin.last_pull_ground_s)).encode())
    return digest.hexdigest()


def make_pictures(
    study: Study,
    slot: str,
    folder: str | Path,
    *,
    shot: Shot | None = None,
    draft: bool = False,
    again: bool = False,
    source: SourceSpec | None = None,
    progress: Callable[[int, int], None] | None = None,
) -> Pictures:
    """Films and stills of a slot in ``folder``, those that are there if they belong to this study, else drawn now.

    shot: default ``page_shot``; draft: half size and rate. again: draw anew in any case. Raises as write_film does.
    """
    shot = page_shot(study, slot, draft=draft) if shot is None else shot
    source = source or SourceSpec(smooth=True)
    folder = Path(folder)
    stem = f"{slot}_draft" if draft else slot
    moments = page_moments(study, slot)
    fault_s = study.faulted.fault_s
    stills = tuple(
        Still(e.kind, e.time_s, event_caption(e, fault_s) if e.kind not in QUIET_KINDS else e.label.capitalize(),
              folder / f"{stem}_{e.kind}.jpg") for e in moments)
    made = Pictures(shot, folder / f"{stem}.mp4", folder / f"{stem}_plain.mp4", stills)
    note = {"format": FORMAT, "study": study_key(study), "size_px": list(shot.size_px), "rate_fps": shot.rate_fps,
            "times": hashlib.sha256(shot.time_s.tobytes()).hexdigest(), "source": asdict(source)}
    record = folder / f"{stem}.json"
    if not again and _recorded(record) == {**note, "files": _sizes(made)}:
        return made
    record.unlink(missing_ok=True)  # from here on the old pictures are no longer whole
    write_film(study, slot, made.annotated, shot=shot, plain_path=made.plain, force=True, source=source,
               progress=progress)
    context = source.open(study, slot, shot.size_px) if stills else nullcontext()
    with context as opened:
        for still in stills:
            assert opened is not None
            frame = still_frame(study, slot, still.time_s, opened, shot.size_px, caption=still.caption)
            with whole_file(still.path, force=True) as part:
                Image.fromarray(frame).save(part, format="JPEG", quality=JPEG_QUALITY, optimize=True)
    write_text(record, json.dumps({**note, "files": _sizes(made)}, default=str), force=True)
    return made


def _sizes(made: Pictures) -> dict[str, int]:
    """Sizes of the files, -1 for one that is missing."""
    paths = (made.annotated, made.plain, *(still.path for still in made.stills))
    return {path.name: path.stat().st_size if path.is_file() else -1 for path in paths}


def _recorded(record: Path) -> dict[str, Any] | None:
    try:
        data = json.loads(record.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return None
    return data if isinstance(data, dict) else None
