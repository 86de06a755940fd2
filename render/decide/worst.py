"""The worst of all freezes: from which point of the loop a frozen surface leaves the least."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from render.decide.left import only, unlike_slots, work_left
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

    angle_rad: Array  # (N, A)
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
    # rounded, so that the same point is the same number
    angles: Array = np.round(np.linspace(from_rad, LAST_RAD, count + 1), 9)
    return angles


def worst_freezes(
    twins: Sequence[Plan], scale: Array, angle_rad: Array, ground: Ground, seconds: float, *, offset_s: float = 0.0,
    from_hand: bool = True, count: Count | None = None,
) -> Worst:
    """Freeze each twin at each angle and find what is left for the likely and the other observers.

    twins (N,) of one shape, begun inside the loop or not; scale (N,). from_hand: what is left when his hand moves,
    after his reaction; otherwise when he notices. Slots that mirror another are left out.
    """
    n, m = len(twins), len(angle_rad)
    rows = freeze_rows(twins, scale, [(i, float(a)) for i in range(n) for a in angle_rad], ground, seconds,
                       offset_s=offset_s, from_hand=from_hand, count=count)
    return worst_rows([rows[i * m : (i + 1) * m] for i in range(n)], np.broadcast_to(angle_rad, (n, m)))


@dataclass(frozen=True, slots=True)
class Row:
    """One freeze: what it leaves in the worse slot, for the observers O."""

    left_s: tuple[float, ...]  # (O,)
    clears_m: float  # lowest height of any slot above the ground if nobody acts
    cue: tuple[str, ...]  # (O,)
    cut: bool


def freeze_rows(
    twins: Sequence[Plan], scale: Array, freezes: Sequence[tuple[int, float]], ground: Ground, seconds: float, *,
    offset_s: float = 0.0, from_hand: bool = True, count: Count | None = None,
) -> list[Row]:
    """Fly freezes, each given by its twin's number and its angle; otherwise as ``worst_freezes``."""
    flown = [only(p, unlike_slots(p)) for p in twins]
    left = work_left(flown, scale, [frozen_at(flown[i], a) for i, a in freezes], [i for i, _ in freezes], ground,
                     seconds, offset_s=offset_s, every_notice=False)
    if count is not None:
        count(len(freezes))
    hand = left.in_hand_s() if from_hand else left.at_notice_s()  # (F, S, O)
    slot = np.argmin(hand, axis=1)
    return [
        Row(tuple(map(float, hand[f].min(axis=0))), float(left.low_m[f].min()),
            tuple(left.cue[f][k][o] for o, k in enumerate(slot[f])), not bool(left.whole[f]))
        for f in range(len(freezes))
    ]


def worst_rows(rows: Sequence[Sequence[Row]], angle_rad: Array) -> Worst:
    """The worst of freezes: rows and angles (N, A)."""
    each = np.array([[row.left_s for row in many] for many in rows])
    at = np.argmin(each, axis=1)  # (N, O)
    n, o = np.arange(len(rows))[:, None], np.arange(each.shape[2])
    cues = tuple(tuple(rows[i][k].cue[j] for j, k in enumerate(at[i])) for i in range(len(rows)))
    return Worst(angle_rad.copy(), each, np.array([[row.clears_m for row in many] for many in rows]), each[n, at, o],
                 angle_rad[n, at], cues, np.array([[rows[i][k].cut for k in at[i]] for i in range(len(rows))]))
