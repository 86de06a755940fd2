"""Numbers as the compiled kernels take them: records of airframes and cases, indices of the state.

The kernels are scalar code compiled with numba; a flight is one call, a batch is the same
code in a parallel loop. Records keep the names of the frozen types they are made from.
"""

from __future__ import annotations

from typing import Any

import numpy as np
from numpy.typing import NDArray

from scenes.airframe import Airframe

Array = NDArray[np.float64]

# State of one aircraft. pos_e_m 3, speed, quat_ew 4, then scalars; all SI and radians.
N, E, D, V, Q0, Q1, Q2, Q3, ALPHA, PITCH, ROLL, STAB, ENGINE, STICK, INTEG, NDEM, WORK_T, WORK_D = range(18)
NY = 18

# What a step writes beside the state.
(A_N, A_STICK_FORCE, A_THRUST, A_THROTTLE, A_CAS, A_LOOP, A_STEP, A_AGL, A_PUSH, A_NCMD, A_ROLL_CMD,
 A_LIMIT) = range(12)
NA = 12

# Flags in calls between kernels: a bare True is a type of its own to numba, and all it is passed to compiled again.
NO: Any = np.bool_(False)
YES: Any = np.bool_(True)

# Limits that held the demand back (A_LIMIT).
LIMIT_NONE, LIMIT_BUFFET, LIMIT_N_MAX = 0, 1, 2

LEVEL, LOOP, ROLL_STEP, CLIMB, DIVE, PULL_OUT = range(6)
POWER_FULL, POWER_IDLE, POWER_HELD, POWER_PART = range(4)
FAULT_NONE, FAULT_FREEZE, FAULT_AUTHORITY, FAULT_SLOW, FAULT_TRAIL, FAULT_ENGINES, FAULT_IDLE = range(7)
AT_NEVER, AT_LOOP_ANGLE, AT_TIME, AT_AFTER_TOP, AT_HEIGHT = range(5)
FAULT_CODES = {"freeze": 1, "authority": 2, "slow": 3, "trail": 4, "engines": 5, "idle": 6}
AT_CODES = {"loop_angle": AT_LOOP_ANGLE, "time": AT_TIME, "after_top": AT_AFTER_TOP, "height": AT_HEIGHT}
POWER_CODES = {"full": POWER_FULL, "idle": POWER_IDLE, "held": POWER_HELD, "part": POWER_PART}

# Why a flight stopped.
OK, CONTACT, TOO_FAST, TOO_HIGH_MACH, OUT_OF_AIR, NOT_FINITE = range(6)

_AIRFRAME_FIELDS = (
    "mass_kg wing_area_m2 chord_m inertia_pitch_kgm2 lift_slope alpha_zero_rad cl_buffet cl_max cl_min cd_zero "
    "cd_induced cm_zero cm_alpha cm_q cm_delta thrust_static_n thrust_density_exponent thrust_mach_1 thrust_mach_2 "
    "thrust_speed_mps thrust_idle thrust_stopped spool_s engines n_max n_min speed_max_mps mach_max "
    "roll_rate_max_radps roll_s stab_min_rad stab_max_rad stab_rate_radps stab_lag_s stab_no_load_rad "
    "stick_travel_m feel_spring_npm feel_bob_n"
).split()
AIRFRAME_DT = np.dtype([(name, np.float64) for name in _AIRFRAME_FIELDS] + [("stab_trim_rad", np.float64),
                                                                           ("thrust_equals_drag", np.float64)])

CASE_DT = np.dtype(
    [
        (name, np.float64)
        for name in (
            "field_elevation_m temp_offset_k wind_n_mps wind_e_mps fault_kind fault_at fault_value fault_down "
            "fault_fraction fault_rate_radps fault_over_s fault_lost onset_gps loop_scale density_held_kgm3"
        ).split()
    ]
)

ESCAPE_DT = np.dtype(
    [
        (name, np.float64)
        for name in "load_factor onset_gps bank_away_rad power_kind power_part delay_s roll_first".split()
    ]
)


def airframe_record(airframe: Airframe, stab_trim_rad: float, *, thrust_equals_drag: bool = False) -> Any:
    """One airframe as a kernel record, (1,) of AIRFRAME_DT.

    stab_trim_rad: surface angle at stick neutral. thrust_equals_drag: exact-solution checks only.
    """
    rec = np.zeros(1, AIRFRAME_DT)
    for name in _AIRFRAME_FIELDS:
        rec[name] = float(getattr(airframe, name))
    rec["stab_trim_rad"] = stab_trim_rad
    rec["thrust_equals_drag"] = 1.0 if thrust_equals_drag else 0.0
    return rec
