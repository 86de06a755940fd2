"""A whole scene as text for the reader's tests, and its faults as lines."""

from __future__ import annotations

import pytest

from scenes.complaint import SceneError
from scenes.reader import read_scene_text

WHOLE = """\
title: A loop
airframe: jet_trainer
day: {field_elevation: 210 ft, temperature: 24 degC, wind: {from: 240 deg, speed: 8 kt}}
ground: heath
floor: 100 ft
script:
  - level: {speed: 370 kt, height: 300 ft, heading: 80 deg, for: 3 s}
  - loop:
      load_factor: {0: 1.2, 8: 4.6, 90: 3.1, 180: 0.6, 270: 2.8, 330: 4.9, 358: 1.2}
      power: full
      close_at: 300 ft
  - level: {for: 3 s}
fault: {kind: freeze, at: {loop_angle: 245 deg}}
formation:
  right: {aft: 0 m, right: 14 m, down: 0 m}
  left: {aft: 0 m, right: -14 m, down: 0 m}
break_out: {load_factor: 6.0, onset: 3 g/s, bank_away: 0 deg, power: full}
watch: {look_at: lead, gauges_every: never, call: none}
film: {from: right, field: 75 deg, size: 1280x720, rate: 30}
"""


def with_line(old: str, new: str, text: str = WHOLE) -> str:
    """The text with one piece replaced; the piece must be there once."""
    assert text.count(old) == 1, old
    return text.replace(old, new)


def faults(text: str) -> list[str]:
    """The lines of the error that a text gives."""
    with pytest.raises(SceneError) as caught:
        read_scene_text(text, "s.yaml")
    assert caught.value.exit_code == 2
    lines = str(caught.value).split("\n")
    assert lines == [str(c) for c in caught.value.complaints]
    return lines
