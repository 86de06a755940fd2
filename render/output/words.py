"""Numbers with their units and words for codes: the only place where outputs turn SI into text."""

from __future__ import annotations

from dataclasses import dataclass

# exact by definition: international foot 1959, international nautical mile 1929
FOOT_M = 0.3048
KNOT_MPS = 1852.0 / 3600.0

CAUTION = (
    "A training illustration, not a clearance. The authority's rules, the aircraft's manual and "
    "licensed practice come first."
)

CUE_WORDS = {
    "tilt": "horizon's tilt",
    "turning": "view's turning",
    "flow": "ground flow",
    "closing": "ground closing",
    "growth": "ground growing",
    "load": "felt g",
    "felt rate": "felt pitch rate",
    "lead": "lead moves",
    "gauge": "gauge look",
    "call": "lead's call",
    "stick force": "stick force",
}

FAULT_WORDS = {
    "freeze": "stabilator frozen",
    "authority": "stabilator answers in part",
    "slow": "stabilator slow",
    "trail": "stabilator trails free",
    "engines": "engine power lost",
    "idle": "lead closes the throttle",
    "departed": "the lead departs from the briefed flight",
}


def cue_words(cue: str | None) -> str:
    """A cue's code in words; an unknown one as it stands, None as ``never noticed``."""
    if cue is None:
        return "never noticed"
    return CUE_WORDS.get(cue, cue.replace("_", " "))


def fault_words(kind: str) -> str:
    """A fault's kind in words."""
    return FAULT_WORDS.get(kind, kind.replace("_", " "))


def seconds(value_s: float) -> str:
    """Seconds to a tenth: ``3.4 s``; never a minus before a zero."""
    return f"{round(value_s, 1) + 0.0:.1f} s"


def lateness_words(lateness_s: float | None) -> str:
    """Lateness with its sign in words: ``too late by 2.3 s`` or ``0.8 s in hand``; None as a dash."""
    if lateness_s is None:
        return "-"
    rounded = round(lateness_s, 1) + 0.0
    if rounded > 0.0:
        return f"too late by {rounded:.1f} s"
    return f"{-rounded + 0.0:.1f} s in hand"


@dataclass(frozen=True, slots=True)
class Units:
    """Units of an output: ``feet`` (feet, knots) or ``metres`` (metres, kilometres an hour)."""

    name: str

    @property
    def length_unit(self) -> str:
        """``ft`` or ``m``."""
        return "ft" if self.name == "feet" else "m"

    @property
    def speed_unit(self) -> str:
        """``kt`` or ``km/h``."""
        return "kt" if self.name == "feet" else "km/h"

    def length_value(self, length_m: float) -> float:
        """A length in this unit."""
        return length_m / FOOT_M if self.name == "feet" else length_m

    def length(self, length_m: float) -> str:
        """A length to the whole unit: ``1,236 ft``."""
        return f"{_whole(self.length_value(length_m)):,} {self.length_unit}"

    def height_calm(self, height_m: float) -> str:
        """A height that runs in a film: to 10 units from 200 up (the last digit would only flicker), else to 1."""
        value = self.length_value(height_m)
        step = 10 if abs(value) >= 200 else 1
        return f"{_whole(value / step) * step:,} {self.length_unit}"

    def speed(self, speed_mps: float) -> str:
        """A speed to the whole unit: ``293 kt``."""
        return f"{_whole(speed_mps / KNOT_MPS if self.name == 'feet' else speed_mps * 3.6):,} {self.speed_unit}"

    def clearance(self, clearance_m: float | None, over: str) -> str:
        """How far a path clears the ``floor`` or ``ground``, the sign in words; None as a dash."""
        if clearance_m is None:
            return "-"
        above = "above" if clearance_m >= 0.0 else "below"
        return f"{self.length(abs(clearance_m))} {above} the {over}"


def _whole(value: float) -> int:
    """Nearest whole number, halves up (so that neighbours in a film don't jump by banker's rounding)."""
    return int(value + 0.5) if value >= 0 else -int(-value + 0.5)
