"""Cases A, B and F of REFERENCES.md section 3, flown by our code: invented aircraft with a prescribed surface."""

from __future__ import annotations

import math
from dataclasses import dataclass
from typing import Any

import numpy as np

from render.flight.kinematics import fly_fixed
from render.frames import Array
from tests.reference.bare import bare_airframe, bare_case, state

TRAINER: dict[str, Any] = dict(
    cl_buffet=1.05, cl_max=1.05, cl_min=-1.05, cd_zero=0.022, cd_induced=0.14, thrust_static_n=23e3,
    thrust_density_exponent=0.7,
)
LIGHT: dict[str, Any] = dict(
    mass_kg=680.0, wing_area_m2=10.2, chord_m=1.35, inertia_pitch_kgm2=1500.0, lift_slope=4.5, cl_buffet=1.35,
    cl_max=1.35, cl_min=-1.35, cd_zero=0.035, cd_induced=0.077, cm_alpha=-0.6, cm_q=-12.0, cm_delta=-1.4,
    thrust_static_n=3500.0, thrust_density_exponent=1.0, thrust_speed_mps=35.0,
)


@dataclass(frozen=True, slots=True)
class Case:
    """One plane case: airframe figures, start, surface knots."""

    figures: dict[str, Any]
    speed_mps: float
    gamma_rad: float
    height_m: float
    alpha_rad: float
    time_s: tuple[float, ...]
    stab_rad: tuple[float, ...]
    end_s: float

    def stab_at(self, time_s: float) -> float:
        return float(np.interp(time_s, self.time_s, self.stab_rad))

    def thrust_at(self, time_s: float, density_kgm3: float, speed_mps: float) -> float:
        """Thrust as the reference states it: T0 sigma^k, for the light aircraft times min(1, 35/V)."""
        f = self.figures
        full: float = f["thrust_static_n"] * (density_kgm3 / 1.225) ** f["thrust_density_exponent"]
        limit = f.get("thrust_speed_mps", 0.0)
        return full * (min(1.0, limit / speed_mps) if limit else 1.0)


CASES = {
    "A_jam_1g_trim_60dive": Case(TRAINER, 154.333333, -math.pi / 3, 3000.0, 0.0557, (0.0,), (-0.0192808,), 40.0),
    "B_jam_3g_trim_60dive": Case(TRAINER, 154.333333, -math.pi / 3, 1500.0, 0.1671, (0.0,), (-0.0578423,), 20.0),
    "F_light_loop": Case(LIGHT, 72.022222, 0.0, 500.0, 0.0455, (0.0, 0.5, 1.2), (-0.0195, -0.0195, -0.0857143), 16.0),
}


def fly_ours(case: Case, dt_s: float = 0.01) -> tuple[Array, Array]:
    """Time and states of a case in our code: flat earth, constant gravity, standard atmosphere."""
    af = bare_airframe(thrust_equals_drag=False, **case.figures)
    y0 = state(case.speed_mps, case.gamma_rad, case.height_m, alpha_rad=case.alpha_rad)
    steps = round(case.end_s / dt_s)
    times, stab = np.array(case.time_s), np.array(case.stab_rad)
    y = fly_fixed(y0, af, bare_case(density_kgm3=-1.0), times, stab, 1.0, dt_s, steps)
    return np.arange(steps + 1, dtype=np.float64) * dt_s, y


def sampled(time_s: Array, values: Array, at_s: Array) -> Array:
    """A column of a fine history at given times, linear between its steps."""
    return np.asarray(np.interp(at_s, time_s, values))


