"""The three observers, early, likely and late, and the scatter of technique, each number with where it is from.

Ids are those of NOTICING.md. Status: ``published`` (value read in the source named), ``from memory`` (the
source exists, the number is remembered) or ``guess`` (an engineering bridge). Pages print all three.

Inattention is described by three things there: K (a pilot who expects nothing), a (attention) and lapse.
They must never be stacked at their worst, so one of them carries it here:

- ground seen off the gaze (flow, growth, closing) and the lead: attention a = 1, 0.5, 0.25 with K = 1 and no
  lapse. On the line of sight a = 0.25 widens a threshold by four, which is what K = 4 (1.50, crash data
  against laboratory) would do; both together would count the same thing twice, sixteen-fold.
- tilt and turning: their rows (1, 3, 5 deg; 1, 2, 4 deg/s) are no laboratory fractions but bridges to a
  horizon that isn't looked at (1.30: 1 deg in the fovea, 3 deg at 30 deg off it, 5 deg at 60 deg), so a and
  K would count that again. The true eccentricity still widens them where it asks for more.
- felt cues (load, felt rate, force on the hand): attention doesn't apply and K is for laboratory values of
  vision only, so neither; the spread of their thresholds holds it (active task: 2.7).
- lapse is a probability (0.1, 0.3, 0.5), not a threshold. Detector A has no place for a coin; it serves
  detector B (``accumulate.py``), where passes are counted.

Every threshold grows from early to likely to late at every instant, so their order in time is certain.
"""

from __future__ import annotations

from dataclasses import dataclass
from types import MappingProxyType

import numpy as np

from render.frames import Array
from render.types import OBSERVERS

DEG = float(np.pi / 180.0)


@dataclass(frozen=True, slots=True)
class Figure:
    """A number with its unit, the ids it stands on and how far it can be trusted."""

    value: float
    unit: str
    ids: str
    status: str  # published | from memory | guess


@dataclass(frozen=True, slots=True)
class Observer:
    """One observer: the noise of each sense (one sigma), attention, reaction."""

    name: str
    weber: MappingProxyType[str, Figure]  # cue -> fraction, angle or rate
    field_factor: Figure  # K
    attention: Figure  # a
    reach: Figure  # E0
    integration: Figure  # T_int, against T_0 = 1 s
    lapse: Figure  # probability, detector B only
    reaction: Figure


# A wing pilot holds his slot to so much, one sigma: "set by control, not eye, 0.3-1 m at 10-20 m" (1.51, from
# memory); the upper value, since it is a loop. A smaller movement of the lead he flies out without a thought.
HELD_M = 1.0
VISUAL = ("tilt", "turning", "flow", "closing", "growth", "lead")  # off while the eyes are inside
INTEGRATION_REFERENCE_S = 1.0  # T_0
ATTENTION_FLOOR = 0.1  # g(E) never less (1.44: bounded below; the value a guess)
VISION_DELAY_S = 0.1  # section 6.1
FELT_DELAY_S = 0.05  # section 6.1
DWELL_S = 0.3  # detector A, section 6.3
SIGMAS = 2.0  # detector A, section 6.3
TILT_FOVEA_RAD, TILT_SLOPE = 1.0 * DEG, 4.0 / 60.0  # 1.30: 1, 3, 5 deg at 0, 30, 60 deg (bridge, guess)
CLOSING_LIMIT_S = 10.0  # no credit above (1.8, published)

_ROWS: dict[str, tuple[str, tuple[tuple[float, str, str], ...]]] = {
    "tilt": ("rad", ((1 * DEG, "1.29", "from memory"), (3 * DEG, "1.30", "guess"), (5 * DEG, "1.30", "guess"))),
    "turning": ("rad/s", ((1 * DEG, "1.26, 1.27", "from memory"), (2 * DEG, "1.27", "from memory"),
                          (4 * DEG, "1.27", "from memory"))),
    "flow": ("ln ratio", ((0.06, "1.10", "published"), (0.10, "between 1.11 and 1.15", "guess"),
                          (0.20, "1.15", "from memory"))),
    "growth": ("ln ratio", ((0.06, "as flow", "guess"), (0.10, "as flow", "guess"), (0.20, "as flow", "guess"))),
    "closing": ("ln ratio", ((0.07, "1.2", "from memory"), (0.10, "1.2", "from memory"),
                             (0.13, "1.2", "from memory"))),
    "load": ("ln ratio", ((0.07, "2.10, 2.11 carried to several g", "guess"),
                          (0.10, "2.10, 2.11, 2.12", "guess"), (0.20, "2.12", "guess"))),
    "felt rate": ("rad/s", ((1 * DEG, "2.4", "published"), (2 * DEG, "2.3", "published"),
                            (4 * DEG, "2.3 with 2.7", "from memory"))),
    "lead": ("rad", ((1 / 60 * DEG, "1.51", "from memory"), (2 / 60 * DEG, "1.51", "from memory"),
                     (4 / 60 * DEG, "1.51", "from memory"))),
    "stick force": ("ratio", ((0.07, "force on the hand, no id", "from memory"),
                              (0.10, "force on the hand, no id", "from memory"),
                              (0.20, "twice the likely one", "guess"))),
    # In units of what the instruments can be read to; half, since 2 sigma is asked for.
    "gauge": ("readings", ((0.5, "one reading step", "guess"), (1.0, "two reading steps", "guess"),
                           (2.0, "four reading steps", "guess"))),
    "call": ("heard", ((0.25, "heard or not", "guess"),) * 3),
}

# One offset per flight, never averaged away (section 8: all guesses until a team's own loops are known).
TECHNIQUE: MappingProxyType[str, Figure] = MappingProxyType({
    "tilt": Figure(4 * DEG, "rad", "section 8", "guess"),
    "turning": Figure(2 * DEG, "rad/s", "section 8", "guess"),
    "flow": Figure(0.15, "ln ratio", "section 8", "guess"),
    "growth": Figure(0.20, "ln ratio", "as time to contact, section 8", "guess"),
    "closing": Figure(0.20, "ln ratio", "section 8", "guess"),
    "load": Figure(0.08, "ln ratio", "section 8", "guess"),
    "felt rate": Figure(2 * DEG, "rad/s", "section 8", "guess"),
    "lead": Figure(1 * DEG, "rad", "1.51, or 1 m at the lead's distance if more", "from memory"),
    "stick force": Figure(0.08, "ratio", "as load, section 8", "guess"),
    "gauge": Figure(0.0, "readings", "in the reading steps", "guess"),
    "call": Figure(0.0, "heard", "none", "guess"),
})


def _observer(i: int) -> Observer:
    weber = {cue: Figure(row[i][0], unit, row[i][1], row[i][2]) for cue, (unit, row) in _ROWS.items()}
    return Observer(
        OBSERVERS[i],
        MappingProxyType(weber),
        Figure(1.0, "", "1.50 carried by attention", "guess"),
        Figure((1.0, 0.5, 0.25)[i], "", "6.2, 1.42-1.47", "guess"),
        Figure((90.0, 75.0, 60.0)[i] * DEG, "rad", "1.48, 1.49", "guess"),
        Figure(1.0, "s", "1.13 (0.5-1.5 s)", "guess"),
        Figure((0.1, 0.3, 0.5)[i], "", "1.46", "guess"),
        Figure((0.8, 1.5, 3.0)[i], "s", "3.15", "guess"),
    )


TABLE: MappingProxyType[str, Observer] = MappingProxyType({name: _observer(i) for i, name in enumerate(OBSERVERS)})


def attention_gain(eccentricity_rad: Array, observer: Observer) -> Array:
    """g(E) = max(0.1, a (1 - E/E0)) (6.2; 1.49 for the linear fall), same shape as the eccentricity."""
    return np.maximum(ATTENTION_FLOOR, observer.attention.value * (1.0 - eccentricity_rad / observer.reach.value))


def sensory_sigma(cue: str, observer: Observer, eccentricity_rad: Array | None, widening: Array | float = 1.0) -> Array:
    """Noise of the sense alone, W K / g(E) / sqrt(T_int/T_0), in the cue's unit (6.2).

    eccentricity_rad: None for what isn't seen. widening: a further factor on W (slow flow: 1.10). Tilt and
    turning take no attention (see the head of this module): tilt the larger of its row and 1.30, turning
    1/(1 - E/E0).
    """
    weber: Array | float = observer.weber[cue].value * widening
    if cue == "tilt" and eccentricity_rad is not None:
        weber = np.maximum(weber, TILT_FOVEA_RAD + TILT_SLOPE * eccentricity_rad)
    elif cue == "turning" and eccentricity_rad is not None:
        weber = weber / np.maximum(ATTENTION_FLOOR, 1.0 - eccentricity_rad / observer.reach.value)
    elif eccentricity_rad is not None:
        weber = weber * observer.field_factor.value / attention_gain(eccentricity_rad, observer)
    return np.asarray(weber / np.sqrt(observer.integration.value / INTEGRATION_REFERENCE_S))


def effective_sigma(
    cue: str,
    observer: Observer,
    eccentricity_rad: Array | None,
    widening: Array | float = 1.0,
    scatter: Array | float = 0.0,
) -> Array:
    """Sense and technique together: sigma^2 = (W K / g)^2 / (T_int/T_0) + sigma_tech^2 (6.2).

    scatter: what technique amounts to at the time, where that is more than its row (holding the slot).
    """
    technique = np.maximum(TECHNIQUE[cue].value, scatter)
    return np.hypot(sensory_sigma(cue, observer, eccentricity_rad, widening), technique)


def source(cue: str) -> str:
    """Where a cue's thresholds come from, in words for a briefing."""
    parts = [f"{name} {TABLE[name].weber[cue].ids} ({TABLE[name].weber[cue].status})" for name in OBSERVERS]
    return "; ".join([*parts, f"technique {TECHNIQUE[cue].ids} ({TECHNIQUE[cue].status})"])
