"""What is drawn of one instant: where each aircraft is, how it stands, what its surfaces do."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from render.frames import Array
from render.types import Flight, freeze_arrays

#: Drawn travel of an aileron at the greatest roll rate; a plausible figure, no source.
AILERON_MAX_RAD = float(np.radians(18.0))

ROLL_STEP_S = 0.06


@dataclass(frozen=True, slots=True, eq=False)
class Instant:
    """K aircraft at one time (0 = the lead)."""

    time_s: float
    pos_e_m: Array  # (K, 3)
    quat_eb: Array  # (K, 4) body -> earth, w first
    stabilator_rad: Array  # (K,) positive trailing edge down
    aileron_rad: Array  # (K,) positive rolls right: right trailing edge up, left down by the same angle
    alive: tuple[bool, ...]  # (K,) False from contact on

    def __post_init__(self) -> None:
        freeze_arrays(self)


def instant_at(flight: Flight, time_s: float) -> Instant:
    """The instant of a flight, interpolated between its samples; held at the flight's ends.

    Positions linearly (samples 0.02 s apart part from the curve by less than 3 mm at 5 g, and every aircraft
    alike), attitudes by spherical interpolation (Shoemake 1985).
    """
    i, part = _place(flight.time_s, time_s)
    pos = (1.0 - part) * flight.pos_e_m[i] + part * flight.pos_e_m[i + 1]
    stab = (1.0 - part) * flight.stabilator_rad[i] + part * flight.stabilator_rad[i + 1]
    return Instant(
        time_s=float(time_s),
        pos_e_m=pos,
        quat_eb=slerp(flight.quat_eb[i], flight.quat_eb[i + 1], part),
        stabilator_rad=stab,
        aileron_rad=drawn_aileron_rad(flight, time_s),
        alive=tuple(met is None or time_s < met for met in flight.contact_s),
    )


def slerp(first: Array, second: Array, part: float) -> Array:
    """Spherical interpolation between unit quaternions (..., 4), the short way round; part 0..1.

    Source: K. Shoemake, Animating rotation with quaternion curves, SIGGRAPH 1985, section 3.3.
    """
    cosine = np.sum(first * second, axis=-1, keepdims=True)
    second = np.where(cosine < 0.0, -second, second)
    angle = np.arccos(np.clip(np.abs(cosine), 0.0, 1.0))
    sine = np.sin(angle)
    near = sine < 1e-6
    safe = np.where(near, 1.0, sine)
    a = np.where(near, 1.0 - part, np.sin((1.0 - part) * angle) / safe)
    b = np.where(near, part, np.sin(part * angle) / safe)
    result = a * first + b * second
    return np.asarray(result / np.linalg.norm(result, axis=-1, keepdims=True))


def drawn_aileron_rad(flight: Flight, time_s: float) -> Array:
    """Aileron angle to draw, (K,), from what the aircraft's roll does: a rule for the picture, no flight model.

    Roll answers its control as a first-order lag, so the control asked for the steady rate p + T dp/dt;
    the drawn angle is that rate as a part of the greatest, limited to the drawn travel.
    """
    # 0.06 s to each side: a finer difference shows the integrator's steps
    before, now, after = (_rolling(flight, time_s + shift) for shift in (-ROLL_STEP_S, 0.0, ROLL_STEP_S))
    change = (after - before) / (2.0 * ROLL_STEP_S)
    lag = np.array([frame.roll_s for frame in flight.airframes])
    most = np.array([frame.roll_rate_max_radps for frame in flight.airframes])
    return np.asarray(np.clip((now + lag * change) / most, -1.0, 1.0) * AILERON_MAX_RAD)


def _rolling(flight: Flight, time_s: float) -> Array:
    """Roll rates (K,) at a time, rad/s."""
    i, part = _place(flight.time_s, time_s)
    roll = flight.rate_b_radps[:, :, 0]
    return np.asarray((1.0 - part) * roll[i] + part * roll[i + 1])


def _place(times_s: Array, time_s: float) -> tuple[int, float]:
    """The sample before a time, and how far it is to the next one, 0..1."""
    i = int(np.clip(np.searchsorted(times_s, time_s, side="right") - 1, 0, len(times_s) - 2))
    part = (time_s - times_s[i]) / (times_s[i + 1] - times_s[i])
    return i, float(np.clip(part, 0.0, 1.0))
