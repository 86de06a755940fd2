"""The control path: stick -> feel -> actuator -> stabilator, and what a fault does to it.

The stick force comes from spring and bob weight alone: the control is irreversible, so the
hand feels nothing of the surface. Aft stick is positive, a pull moves the surface negative.
"""

from __future__ import annotations

from typing import Any

from numba import njit

from render.flight.records import (
    FAULT_AUTHORITY,
    FAULT_ENGINES,
    FAULT_FREEZE,
    FAULT_IDLE,
    FAULT_SLOW,
    FAULT_TRAIL,
)


@njit(cache=True)
def stick_force(af: Any, stick: float, load_factor: float) -> float:
    """Stick force, N, pull positive: spring on the grip's travel plus bob weight on the load factor.

    Bob weight: what the pilot must hold against n - 1.
    """
    return af.feel_spring_npm * af.stick_travel_m * stick + af.feel_bob_n * (load_factor - 1.0)


@njit(cache=True)
def surface_asked(af: Any, stick: float) -> float:
    """Stabilator angle the stick asks for, rad: linear, aft stop = nose-up travel, within the travel."""
    asked = af.stab_trim_rad - stick * (af.stab_trim_rad - af.stab_min_rad)
    return min(max(asked, af.stab_min_rad), af.stab_max_rad)


@njit(cache=True)
def surface_rate(af: Any, case: Any, stick: float, stab_rad: float, fault_on: bool, stab_at_fault_rad: float) -> float:
    """Rate of the stabilator, rad/s: first-order actuator with a rate limit, changed by the fault."""
    kind = int(case.fault_kind) if fault_on else 0
    if kind == FAULT_FREEZE:
        return 0.0
    if kind == FAULT_TRAIL:
        return (af.stab_no_load_rad - stab_rad) / case.fault_over_s
    asked = surface_asked(af, stick)
    limit = af.stab_rate_radps
    if kind == FAULT_AUTHORITY:
        asked = stab_at_fault_rad + case.fault_fraction * (asked - stab_at_fault_rad)
    elif kind == FAULT_SLOW:
        limit = min(limit, case.fault_rate_radps)
    rate = (asked - stab_rad) / af.stab_lag_s
    return min(max(rate, -limit), limit)


@njit(cache=True)
def engine_target(af: Any, case: Any, throttle: float, fault_on: bool) -> float:
    """Thrust, as a part of full, that the engines run to: idle .. full, less what has stopped."""
    kind = int(case.fault_kind) if fault_on else 0
    if kind == FAULT_IDLE:
        throttle = 0.0
    target = af.thrust_idle + (1.0 - af.thrust_idle) * throttle
    if kind == FAULT_ENGINES:
        lost = case.fault_lost
        target = (1.0 - lost) * target + lost * af.thrust_stopped
    return target
