"""Single frames of a film as PNG."""

from __future__ import annotations

from contextlib import nullcontext
from pathlib import Path

import numpy as np
from PIL import Image

from render.errors import LatepullError
from render.files import claim_output, whole_file
from render.output.overlay import Frame, Overlay
from render.output.shot import default_range, even_size, event_caption, key_events
from render.output.source import FrameSource, SourceSpec, caption_bottom_px
from render.types import Study


def still_frame(
    study: Study,
    slot: str,
    time_s: float,
    source: FrameSource,
    size_px: tuple[int, int],
    *,
    overlay: bool = True,
    caption: str = "",
    note: str = "",
) -> Frame:
    """The frame of a study instant, as the film shows it; raises LatepullError outside the flight.

    note: a line that stays in the caption.
    """
    first, last = float(study.faulted.time_s[0]), float(study.faulted.time_s[-1])
    if not first <= time_s <= last:
        raise LatepullError(f"a still at {time_s:g} s: the flight runs from {first:g} s to {last:g} s")
    frame = np.array(source.frame(time_s))
    if overlay:
        start_s, end_s = default_range(study, slot)
        drawn = Overlay(study, slot, size_px, min(start_s, time_s), max(end_s, time_s), note,
                        caption_bottom_px(source))
        drawn.draw(frame, time_s, caption)
    return frame


def write_still(
    study: Study,
    slot: str,
    time_s: float,
    path: str | Path,
    *,
    size_px: tuple[int, int] | None = None,
    overlay: bool = True,
    caption: str = "",
    note: str = "",
    force: bool = False,
    source: SourceSpec | None = None,
) -> Path:
    """Write the PNG of one instant; size defaults to the scene's film. Raises OutputExists, MachineError."""
    claim_output(Path(path), force=force)
    size = even_size(*(size_px or (study.scene.film.width_px, study.scene.film.height_px)))
    with (source or SourceSpec()).open(study, slot, size) as opened:
        frame = still_frame(study, slot, time_s, opened, size, overlay=overlay, caption=caption, note=note)
    _save(frame, Path(path), force)
    return Path(path)


def write_key_stills(
    study: Study,
    slot: str,
    folder: str | Path,
    *,
    size_px: tuple[int, int] | None = None,
    note: str = "",
    force: bool = False,
    source: SourceSpec | None = None,
) -> tuple[Path, ...]:
    """Write one PNG for each key moment (fault, visible, last pull) with its caption; returns the paths."""
    events = key_events(study, slot)
    paths = tuple(Path(folder) / f"{slot}_{event.kind}.png" for event in events)
    for path in paths:
        claim_output(path, force=force)
    size = even_size(*(size_px or (study.scene.film.width_px, study.scene.film.height_px)))
    context = (source or SourceSpec()).open(study, slot, size) if events else nullcontext()
    with context as opened:
        for event, path in zip(events, paths, strict=True):
            assert opened is not None
            caption = event_caption(event, study.faulted.fault_s, study.scene.film.captions)
            _save(still_frame(study, slot, event.time_s, opened, size, caption=caption, note=note), path, force)
    return paths


def _save(frame: Frame, path: Path, force: bool) -> None:
    with whole_file(path, force=force) as part:
        Image.fromarray(frame).save(part, format="PNG", compress_level=4)
