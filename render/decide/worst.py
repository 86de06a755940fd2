"""The worst of all freezes: from which point of the loop a frozen surface leaves the least."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from render.decide.left import Left, only, unlike_slots, work_left
from render.flight.inside import frozen_at
from render.flight.plan import Plan
from render.frames import Array
from render.types import freeze_arrays
from terrain.ground import Ground

LAST_RAD = np.radians(350.0)  # a freeze later than this changes nothing that is left of the loop
Count = Callable[[int], None]
"""Called with the number of flights just worked through."""


@dataclass(frozen=True, slots=True, eq=False)
class Worst:
    """N twins, A freeze points: the least left of all, for the observers O early, likely, late."""

    angle_rad: Array  # (A,)
    each_s: Array  # (N, A, O) least of all slots; infinity: clears by itself; minus infinity: never noticed
    clears_m: Array  # (N, A) lowest height of any slot above the ground if nobody acts
    least_s: Array  # (N, O)
    at_rad: Array  # (N, O) the freeze that leaves it
    cue: tuple[tuple[str, ...], ...]  # (N, O) what shows it, empty if nothing does
    cut: NDArray[np.bool_]  # (N, O) whether that flight leaves the model's range

    def __post_init__(self) -> None:
        freeze_arrays(self)


def freeze_angles(from_rad: float, step_rad: float) -> Array:
    """Freeze points from an angle to the last that matters."""
    count = max(round((LAST_RAD - from_rad) / step_rad), 1)
    return np.linspace(from_rad, LAST_RAD, count + 1)


def worst_freezes(
    twins: Sequence[Plan], scale: Array, angle_rad: Array, ground: Ground, seconds: float, *, offset_s: float = 0.0,
    from_hand: bool = True, every_slot: bool = False, count: Count | None = None,
) -> Worst:
    """Freeze each twin at each angle and find what is left for the likely and the other observers.

    twins (N,) of one shape, begun inside the loop or not; scale (N,). from_hand: what is left when his hand moves,
    after his reaction; otherwise when he notices. every_slot: mirror images too.
    """
    flown = [p if every_slot else only(p, unlike_slots(p)) for p in twins]
    n, m = len(twins), len(angle_rad)
    faulted = [frozen_at(p, float(angle)) for p in flown for angle in angle_rad]
    left = work_left(flown, scale, faulted, [i for i in range(n) for _ in range(m)], ground, seconds, offset_s=offset_s)
    if count is not None:
        count(n * m)
    return worst_of(left, n, angle_rad, from_hand=from_hand)


def worst_of(left: Left, n: int, angle_rad: Array, *, from_hand: bool = True) -> Worst:
    """The worst of the freezes of n twins, in twin-major order."""
    m = len(angle_rad)
    hand = (left.in_hand_s() if from_hand else left.at_notice_s()).reshape(n, m, len(left.slots), -1)
    each = np.min(hand, axis=2)
    at = np.argmin(each, axis=1)  # (N, O)
    o = np.arange(each.shape[2])
    rows = np.arange(n)[:, None]
    slot = np.argmin(hand[rows, at, :, o], axis=-1)
    cues = tuple(
        tuple(left.cue[i * m + at[i, j]][slot[i, j]][j] for j in o) for i in range(n)
    )
    cut = ~left.whole.reshape(n, m)[rows, at]
    return Worst(angle_rad.copy(), each, np.min(left.low_m.reshape(n, m, -1), axis=2), each[rows, at, o],
                 angle_rad[at], cues, cut)
