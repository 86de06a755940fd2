"""Forces and pitching moment of an airframe: scalar functions for the kernels.

Lift is linear to buffet, smooth to the greatest lift coefficient, falling beyond; drag is a
parabolic polar, with flat-plate drag added past the stall (its size is an engineering guess).
"""

from __future__ import annotations

import math
from typing import Any

from numba import njit

from render.flight.air import SEA_LEVEL_KGM3


@njit(cache=True)
def _lift_curve(alpha_rad: float, slope: float, cl_buffet: float, cl_max: float) -> float:
    """Lift coefficient for alpha >= 0 from the zero-lift line."""
    alpha_buffet = cl_buffet / slope
    if alpha_rad <= alpha_buffet or cl_max <= cl_buffet:
        # cl_max == cl_buffet: linear with a sharp top, as in the published check cases
        return min(slope * alpha_rad, cl_max) if cl_max <= cl_buffet else slope * alpha_rad
    # A parabola that leaves the line with its slope and is level at the top.
    width = 2.0 * (cl_max - cl_buffet) / slope
    x = (alpha_rad - alpha_buffet) / width
    if x <= 1.0:
        return cl_buffet + (cl_max - cl_buffet) * x * (2.0 - x)
    # Beyond the top: falls by 30 % over 0.2 rad, then stays (guess, the shape of a gentle stall).
    y = min((alpha_rad - alpha_buffet - width) / 0.2, 1.0)
    return cl_max * (1.0 - 0.3 * y * y * (3.0 - 2.0 * y))


@njit(cache=True)
def lift_coefficient(af: Any, alpha_rad: float) -> float:
    """Lift coefficient at an angle of attack (both signs)."""
    a = alpha_rad - af.alpha_zero_rad
    if a >= 0.0:
        return _lift_curve(a, af.lift_slope, af.cl_buffet, af.cl_max)
    return -_lift_curve(-a, af.lift_slope, af.cl_buffet * (-af.cl_min / af.cl_max), -af.cl_min)


@njit(cache=True)
def drag_coefficient(af: Any, cl: float, alpha_rad: float) -> float:
    """Drag coefficient CD0 + k CL^2, and flat-plate drag past the stall."""
    cd = af.cd_zero + af.cd_induced * cl * cl
    over = abs(alpha_rad - af.alpha_zero_rad) - (2.0 * af.cl_max - af.cl_buffet) / af.lift_slope
    if over > 0.0 and af.cl_max > af.cl_buffet:
        cd += 2.0 * math.sin(over) ** 2
    return cd


@njit(cache=True)
def alpha_for_lift(af: Any, cl: float) -> float:
    """Angle of attack for a lift coefficient within the limits of the curve, rad."""
    top, buffet, sign = af.cl_max, af.cl_buffet, 1.0
    if cl < 0.0:
        top, buffet, sign = -af.cl_min, af.cl_buffet * (-af.cl_min / af.cl_max), -1.0
    c = min(abs(cl), top)
    if c <= buffet or top <= buffet:
        return af.alpha_zero_rad + sign * c / af.lift_slope
    width = 2.0 * (top - buffet) / af.lift_slope
    x = 1.0 - math.sqrt(max(1.0 - (c - buffet) / (top - buffet), 0.0))
    return af.alpha_zero_rad + sign * (buffet / af.lift_slope + width * x)


@njit(cache=True)
def thrust_full(af: Any, density_kgm3: float, sound_mps: float, speed_mps: float) -> float:
    """Full thrust, N: density ratio to a power, quadratic in Mach, falling as 1/V for a propeller."""
    mach = speed_mps / sound_mps
    thrust = af.thrust_static_n * (density_kgm3 / SEA_LEVEL_KGM3) ** af.thrust_density_exponent
    thrust *= 1.0 + mach * (af.thrust_mach_1 + mach * af.thrust_mach_2)
    if af.thrust_speed_mps > 0.0:
        thrust *= min(1.0, af.thrust_speed_mps / max(speed_mps, 1.0))
    return thrust


@njit(cache=True)
def pitching_moment(af: Any, alpha_rad: float, pitch_radps: float, speed_mps: float, stab_rad: float) -> float:
    """Pitching moment coefficient Cm0 + Cma a + Cmq q c/2V + Cmd d."""
    return (
        af.cm_zero
        + af.cm_alpha * alpha_rad
        + af.cm_q * pitch_radps * af.chord_m / (2.0 * speed_mps)
        + af.cm_delta * stab_rad
    )


@njit(cache=True)
def stab_for_steady(af: Any, alpha_rad: float, pitch_radps: float, speed_mps: float) -> float:
    """Stabilator angle that balances a steady alpha and pitch rate, rad."""
    moment = pitching_moment(af, alpha_rad, pitch_radps, speed_mps, 0.0)
    return -moment / af.cm_delta
