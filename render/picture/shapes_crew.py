"""Helmeted crew and their seats, at true size; the eye is where the airframe puts it."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np

from render.frames import Array
from render.picture.loft import Colour, Surf, merge, moved
from render.picture.paint import paint
from render.picture.shapes_sections import box, ellipsoid, spindle

SEAT: Colour = (34, 36, 38)
MASK: Colour = (52, 56, 58)
VISOR: Colour = (16, 20, 26)

#: The neck's axis, aft of and below the eye, m. Common size of a helmeted head; no source.
NECK_AFT_M = 0.11


def head(eye_m: Sequence[float] | Array, shell: Colour, stripe: Colour) -> Surf:
    """A helmeted head: shell with a stripe over the crown, dark visor, mask and hose. Eyes at ``eye_m``."""
    crown = ellipsoid((0.0, 0.0, 0.0), (0.155, 0.128, 0.148), shell, 11, 20)
    crown = paint(crown, lambda p: np.abs(p[:, 1]) - 0.026, stripe)
    # The visor: the front between brow and cheek.
    crown = paint(crown, lambda p: np.maximum.reduce([0.045 - p[:, 0], p[:, 2] - 0.05, -p[:, 2] - 0.055]), VISOR)
    mask = spindle([(0.165, 0, 0.085, 0.012), (0.15, 0, 0.082, 0.05), (0.09, 0, 0.075, 0.066), (0.0, 0, 0.07, 0.05)],
                   MASK, 10)  # fmt: skip
    hose = spindle([(0.15, 0.02, 0.10, 0.018, 0.03), (0.10, 0.03, 0.19, 0.018, 0.03), (0.02, 0.05, 0.24, 0.018, 0.03)],
                   MASK, 6)  # fmt: skip
    ears = [ellipsoid((-0.015, s * 0.118, 0.035), (0.055, 0.03, 0.065), shell, 5, 8) for s in (-1, 1)]
    neck = spindle([(0.05, 0.0, 0.13, 0.02, 0.04), (0.03, 0.0, 0.16, 0.062, 0.07), (-0.07, 0.0, 0.16, 0.062, 0.07),
                    (-0.09, 0.0, 0.14, 0.02, 0.04)], MASK, 8)  # fmt: skip
    whole = merge([crown, mask, hose, neck, *ears])
    return moved(whole, shift=np.asarray(eye_m, float) + np.array([-NECK_AFT_M, 0.0, -0.01]))


def torso(eye_m: Sequence[float] | Array, suit: Colour) -> Surf:
    """Shoulders, chest and arms towards stick and throttle, with harness straps."""
    chest = ellipsoid((0.0, 0.0, 0.52), (0.16, 0.22, 0.33), suit, 8, 14)
    chest = paint(chest, lambda p: np.abs(np.abs(p[:, 1]) - 0.085) - 0.024, (196, 188, 160))
    shoulders = ellipsoid((-0.02, 0.0, 0.285), (0.095, 0.235, 0.085), suit, 7, 14)
    arms = [spindle([(0.34, s * 0.16, 0.60, 0.045), (0.18, s * 0.24, 0.55, 0.055), (0.0, s * 0.235, 0.38, 0.062),
                     (-0.05, s * 0.22, 0.30, 0.03)], suit, 8) for s in (-1, 1)]  # fmt: skip
    return moved(merge([chest, shoulders, *arms]), shift=np.asarray(eye_m, float) + np.array([-0.15, 0.0, 0.0]))


def seat(eye_m: Sequence[float] | Array, head_box: Colour) -> Surf:
    """An ejection seat's back and head box behind the head, with its two coloured handles."""
    back = box((-0.22, -0.21, -0.02), (-0.10, 0.21, 0.75), SEAT, lean=0.12)
    top = box((-0.26, -0.13, -0.17), (-0.13, 0.13, 0.10), head_box, lean=0.12)
    rails = [box((-0.27, s * 0.16 - 0.02, -0.13), (-0.21, s * 0.16 + 0.02, 0.75), SEAT, lean=0.12) for s in (-1, 1)]
    return moved(merge([back, top, *rails]), shift=np.asarray(eye_m, float) + np.array([-0.17, 0.0, 0.0]))
