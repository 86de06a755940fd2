"""Whether two places of a formation put one aircraft inside another: plain boxes of fuselage and wing."""

from __future__ import annotations

from dataclasses import dataclass

from scenes.airframe import Airframe

# Boxes of an aircraft about its centre, halves as parts of its length: common practice, no source.
FUSELAGE_HALF_WIDTH = 0.06
FUSELAGE_HALF_HEIGHT = 0.10  # the fin counted in
WING_HALF_HEIGHT_M = 0.25


@dataclass(frozen=True, slots=True)
class Placed:
    """An aircraft and its place against the lead's: behind, right, below, m, centre to centre."""

    name: str
    airframe: Airframe
    aft_m: float = 0.0
    right_m: float = 0.0
    down_m: float = 0.0

    def centre(self) -> tuple[float, float, float]:
        """Behind, right of and below the lead, m."""
        return self.aft_m, self.right_m, self.down_m

    def boxes(self) -> tuple[tuple[float, float, float], ...]:
        """Halves of fuselage and wing box: along, across, high, m."""
        a = self.airframe
        fuselage = (a.length_m / 2.0, FUSELAGE_HALF_WIDTH * a.length_m, FUSELAGE_HALF_HEIGHT * a.length_m)
        return fuselage, (a.chord_m / 2.0, a.wing_span_m / 2.0, WING_HALF_HEIGHT_M)


def clear_right(one: Placed, other: Placed) -> float | None:
    """None if the two don't overlap; else the least distance across, m, at which they would not."""
    along, across, high = (abs(p - q) for p, q in zip(one.centre(), other.centre(), strict=True))
    needed = [b[1] + c[1] for b in one.boxes() for c in other.boxes() if along < b[0] + c[0] and high < b[2] + c[2]]
    least = max(needed, default=0.0)
    return least if across < least else None
