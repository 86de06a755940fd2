"""One film of the benchmark in a process of its own, start-up included: ``python -m tests.benchmarks.filmed JSON``.

Prints a line of JSON: seconds of the drawing loop (naive) or nothing but the frames' number.
"""

from __future__ import annotations

import json
import sys
from pathlib import Path
from typing import Any


def main(kind: str, **words: Any) -> dict[str, Any]:
    """Film late_freeze from ``start_s`` to ``end_s``, without a card: ours, plain, raw, naive, or write the scene."""
    if kind in ("naive", "scene"):
        return by_hand(kind, **words)
    from render.output.drawers import Drawers
    from render.output.source import SourceSpec

    raw = SourceSpec("tests.benchmarks.raw_draw:open_raw", {"scene": words.pop("scene")})
    with Drawers(kind, (raw if kind == "raw" else SourceSpec(smooth=True)).modules) as drawers:  # as the command does
        from render.output.film import write_film
        from render.output.stage_options import StageOptions, stage_spec

        loaded, shot = planned(**words)
        overlay = kind == "ours"
        ours = stage_spec(StageOptions(twin=words.get("twin")), shot.size_px, overlay=overlay)
        write_film(loaded, "right", Path(words["out"]), shot=shot, overlay=overlay,
                   source=raw if kind == "raw" else ours, force=True, drawers=drawers)
    return {"frames": len(shot)}


def planned(study: str, size_px: list[int], start_s: float, end_s: float, rate_fps: float | None = None,
            **_: Any) -> tuple[Any, Any]:
    """The study and the shot."""
    from render.output.shot import plan_shot
    from render.study_io import load_study

    loaded = load_study(Path(study))
    return loaded, plan_shot(loaded, "right", start_s=start_s, end_s=end_s, size_px=(size_px[0], size_px[1]),
                             card_s=0.0, rate_fps=rate_fps)


def by_hand(kind: str, scene: str, out: str, frames: int = 1, **words: Any) -> dict[str, Any]:
    """The naive loop, or the scene written down."""
    from render.output.stage_source import StageSource, open_stage

    loaded, shot = planned(**words)
    times = [float(t) for t in shot.time_s]
    with open_stage(loaded, "right", shot.size_px) as source:
        assert isinstance(source, StageSource)
        if kind == "scene":
            from tests.benchmarks.raw_gl import take_scene

            take_scene(source, loaded, times, Path(scene))
            return {"frames": len(shot)}
        from tests.benchmarks.naive import film_naively

        few = times[:: max(1, len(times) // frames)]
        return {"frames": len(few), "loop_s": film_naively(source, loaded, few, shot.rate_fps, Path(out)),
                "all_frames": len(shot)}


if __name__ == "__main__":
    print(json.dumps(main(**json.loads(sys.argv[1]))))
