"""How a study may be pictured; loads no drawing, so that a film's workers are started at once."""

from __future__ import annotations

from dataclasses import asdict, dataclass, replace

from render.output.overlay import strip_px
from render.output.source import SourceSpec


@dataclass(frozen=True, slots=True)
class StageOptions:
    """How a study is pictured; checked by ``open_stage``.

    view: seat, chase or spectator. look (from the seat): lead, ahead, ground, or gaze, which is the scene's own:
    where its ``watch`` rests the eyes, with its looks at the gauges. flight: faulted or healthy. twin: healthy and
    faulted ``side`` by side or in a ``stack`` (healthy left or above), or the healthy lead as a ``ghost``.
    peripheral: what acuity leaves away from the gaze. panini: None takes it for fields above 100 deg.
    smooth: whether silhouettes are antialiased.
    field_rad: None takes the film's (a spectator: 40 deg). clear_px: rows kept free at the bottom of a twin.
    unseen_px: rows at the bottom that an overlay covers: left black where that saves drawing.
    """

    view: str = "seat"
    look: str = "gaze"
    flight: str = "faulted"
    twin: str | None = None
    peripheral: bool = False
    panini: bool | None = None
    smooth: bool = True
    field_rad: float | None = None
    clear_px: int = 0
    unseen_px: int = 0


def stage_spec(
    options: StageOptions, size_px: tuple[int, int], *, overlay: bool, plain_too: bool = False
) -> SourceSpec:
    """The stage by name for a film's workers.

    Under an overlay the halves of a twin keep clear of its strip, and what it covers of one picture is not drawn,
    unless the plain version is made from the same drawing.
    """
    strip = strip_px(size_px[1]) if overlay else 0
    if options.twin in ("side", "stack"):
        return SourceSpec(options=asdict(replace(options, clear_px=strip)), smooth=options.smooth)
    return SourceSpec(options=asdict(replace(options, unseen_px=0 if plain_too else strip)), smooth=options.smooth)


def picture_words(options: StageOptions) -> str:
    """What the film has to say of a picture that isn't plainly what a wing pilot's eye has, "" if there is nothing."""
    words = []
    if options.twin in ("side", "stack"):
        first, second = ("above", "below") if options.twin == "stack" else ("left", "right")
        words.append(f"{first}: without the fault, {second}: with it; not at true size")
    if options.twin == "ghost":
        words.append("faint: the lead without the fault")
    if options.flight == "healthy" and options.twin is None:
        words.append("the flight without the fault")
    if options.view == "chase":
        words.append("seen from a chase aircraft")
    if options.view == "spectator":
        words.append("seen from the ground")
    if options.view == "seat" and options.look in ("ahead", "ground"):
        words.append("eyes ahead" if options.look == "ahead" else "eyes on the ground")
    if options.peripheral:
        words.append("blurred as acuity falls away from the gaze (motion is seen better than this)")
    return "; ".join(words)
