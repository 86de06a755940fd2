"""Standard atmosphere with a temperature offset, and airspeeds through the compressible pitot relation.

Scalar functions are compiled (numba) and check nothing: the integrator calls them a million times
and looks at the range itself. The ``*_column`` functions take arrays and refuse what isn't valid.

Source: U.S. Standard Atmosphere 1976 / ISO 2533, troposphere and lower stratosphere
(-500 m to 15 000 m here; the formulas hold to 20 000 m geopotential).
"""

from __future__ import annotations

import math

import numpy as np
from numba import njit
from numpy.typing import ArrayLike

from render.errors import FlightError
from render.frames import Array

G0_MPS2 = 9.80665
GAS_CONSTANT = 287.05287  # J/(kg K), dry air
HEAT_RATIO = 1.4
EARTH_RADIUS_M = 6_356_766.0  # of the geopotential relation, US Std Atm 1976 eq. 18
SEA_LEVEL_K = 288.15
SEA_LEVEL_PA = 101_325.0
SEA_LEVEL_KGM3 = SEA_LEVEL_PA / (GAS_CONSTANT * SEA_LEVEL_K)
SEA_LEVEL_SOUND_MPS = math.sqrt(HEAT_RATIO * GAS_CONSTANT * SEA_LEVEL_K)
LAPSE_KPM = 0.0065
TROPOPAUSE_M = 11_000.0  # geopotential
TROPOPAUSE_K = SEA_LEVEL_K - LAPSE_KPM * TROPOPAUSE_M
PRESSURE_EXPONENT = G0_MPS2 / (GAS_CONSTANT * LAPSE_KPM)
TROPOPAUSE_PA = SEA_LEVEL_PA * (TROPOPAUSE_K / SEA_LEVEL_K) ** PRESSURE_EXPONENT
HEIGHT_MIN_M = -500.0
HEIGHT_MAX_M = 15_000.0


@njit(cache=True)
def geopotential(height_m: float) -> float:
    """Geopotential height of a geometric height above sea level, m: r h / (r + h) (US Std Atm 1976 eq. 18)."""
    return EARTH_RADIUS_M * height_m / (EARTH_RADIUS_M + height_m)


@njit(cache=True)
def geometric(geopotential_m: float) -> float:
    """Geometric height above sea level of a geopotential height, m: r H / (r - H) (US Std Atm 1976 eq. 19)."""
    return EARTH_RADIUS_M * geopotential_m / (EARTH_RADIUS_M - geopotential_m)


@njit(cache=True)
def gravity_at(height_m: float) -> float:
    """Acceleration of gravity at a geometric height above sea level, m/s2 (US Std Atm 1976 eq. 17)."""
    ratio = EARTH_RADIUS_M / (EARTH_RADIUS_M + height_m)
    return G0_MPS2 * ratio * ratio


@njit(cache=True)
def air_at_geopotential(geopotential_m: float, temp_offset_k: float) -> tuple[float, float, float, float]:
    """Temperature K, pressure Pa, density kg/m3, speed of sound m/s at a geopotential height.

    The pressure is that of the standard column (a height is a pressure height), the temperature is
    standard plus the offset. Source: US Std Atm 1976 eq. 23, 33a, 33b, 42, 50. No range check.
    """
    if geopotential_m < TROPOPAUSE_M:
        standard_k = SEA_LEVEL_K - LAPSE_KPM * geopotential_m
        pressure_pa = SEA_LEVEL_PA * (standard_k / SEA_LEVEL_K) ** PRESSURE_EXPONENT
    else:
        standard_k = TROPOPAUSE_K
        above_m = geopotential_m - TROPOPAUSE_M
        pressure_pa = TROPOPAUSE_PA * math.exp(-G0_MPS2 * above_m / (GAS_CONSTANT * TROPOPAUSE_K))
    temperature_k = standard_k + temp_offset_k
    density_kgm3 = pressure_pa / (GAS_CONSTANT * temperature_k)
    sound_mps = math.sqrt(HEAT_RATIO * GAS_CONSTANT * temperature_k)
    return temperature_k, pressure_pa, density_kgm3, sound_mps


@njit(cache=True)
def air_at(height_m: float, temp_offset_k: float) -> tuple[float, float, float, float]:
    """Temperature K, pressure Pa, density kg/m3, speed of sound m/s at a geometric height above sea level, m.

    Valid -500 to 15 000 m; not checked here (the integrator does, ``air_column`` does).
    """
    return air_at_geopotential(geopotential(height_m), temp_offset_k)


@njit(cache=True)
def impact_pressure(tas_mps: float, pressure_pa: float, sound_mps: float) -> float:
    """Pitot minus static pressure of subsonic flow, Pa: p ((1 + 0.2 M^2)^3.5 - 1), isentropic flow, valid M < 1.

    Written with log1p and expm1, since the plain form loses digits at walking speed.
    """
    mach = tas_mps / sound_mps
    return pressure_pa * math.expm1(3.5 * math.log1p(0.2 * mach * mach))


@njit(cache=True)
def speed_from_impact(impact_pa: float, pressure_pa: float, sound_mps: float) -> float:
    """Airspeed, m/s, whose impact pressure this is in air of that pressure and speed of sound; valid M < 1."""
    return sound_mps * math.sqrt(5.0 * math.expm1(math.log1p(impact_pa / pressure_pa) / 3.5))


@njit(cache=True)
def cas_from_tas(tas_mps: float, pressure_pa: float, sound_mps: float) -> float:
    """Calibrated airspeed, m/s: the sea-level standard speed of the same impact pressure; valid below Mach 1."""
    return speed_from_impact(impact_pressure(tas_mps, pressure_pa, sound_mps), SEA_LEVEL_PA, SEA_LEVEL_SOUND_MPS)


@njit(cache=True)
def tas_from_cas(cas_mps: float, pressure_pa: float, sound_mps: float) -> float:
    """True airspeed, m/s, of a calibrated airspeed in air of that pressure and speed of sound; valid below Mach 1."""
    return speed_from_impact(impact_pressure(cas_mps, SEA_LEVEL_PA, SEA_LEVEL_SOUND_MPS), pressure_pa, sound_mps)


@njit(cache=True)
def eas_from_tas(tas_mps: float, density_kgm3: float) -> float:
    """Equivalent airspeed, m/s: the sea-level standard speed of the same dynamic pressure."""
    return tas_mps * math.sqrt(density_kgm3 / SEA_LEVEL_KGM3)


@njit(cache=True)
def tas_from_eas(eas_mps: float, density_kgm3: float) -> float:
    """True airspeed, m/s, of an equivalent airspeed in air of that density."""
    return eas_mps * math.sqrt(SEA_LEVEL_KGM3 / density_kgm3)


def temp_offset(field_elevation_m: float, temperature_k: float | None) -> float:
    """How much warmer than standard the day is, K: from the air temperature at the field; None is a standard day.

    field_elevation_m: geometric, above sea level. Raises FlightError outside the atmosphere's range.
    """
    if temperature_k is None:
        return 0.0
    check_height(field_elevation_m)
    standard_k: float = air_at(field_elevation_m, 0.0)[0]
    return temperature_k - standard_k


def check_height(height_m: ArrayLike, time_s: ArrayLike | None = None) -> None:
    """Raise FlightError with time, value and limit at the first height outside the atmosphere's range.

    height_m: any shape, geometric above sea level; time_s: broadcast against it, or None. NaN is outside.
    """
    heights = np.asarray(height_m, dtype=np.float64)
    outside = ~((heights >= HEIGHT_MIN_M) & (heights <= HEIGHT_MAX_M))
    if not outside.any():
        return
    first = int(np.argmax(outside))
    value = float(heights.flat[first])
    limit = HEIGHT_MIN_M if value < HEIGHT_MIN_M else HEIGHT_MAX_M
    time = None if time_s is None else float(np.broadcast_to(time_s, heights.shape).flat[first])
    when = "" if time is None else f" at {time:.2f} s"
    raise FlightError(
        f"height above sea level is {value:.0f} m{when}; the atmosphere is valid from "
        f"{HEIGHT_MIN_M:.0f} m to {HEIGHT_MAX_M:.0f} m",
        time_s=time,
        quantity="height above sea level, m",
        value=value,
        limit=limit,
    )


@njit(cache=True)
def _air_loop(heights_m: Array, temp_offset_k: float, out: Array) -> None:
    for i in range(heights_m.size):
        out[0, i], out[1, i], out[2, i], out[3, i] = air_at(heights_m[i], temp_offset_k)


def air_column(height_m: ArrayLike, temp_offset_k: float = 0.0) -> tuple[Array, Array, Array, Array]:
    """Temperature K, pressure Pa, density kg/m3, speed of sound m/s, each of the shape of ``height_m``.

    height_m: geometric above sea level, any shape. Raises FlightError outside -500 to 15 000 m.
    """
    check_height(height_m)
    heights = np.asarray(height_m, dtype=np.float64)
    out = np.empty((4, heights.size))
    _air_loop(np.ascontiguousarray(heights).reshape(-1), temp_offset_k, out)
    shaped = out.reshape((4, *heights.shape))
    return shaped[0], shaped[1], shaped[2], shaped[3]


def cas_column(tas_mps: ArrayLike, height_m: ArrayLike, temp_offset_k: float = 0.0) -> Array:
    """Calibrated airspeeds, m/s, of true airspeeds at geometric heights above sea level; shapes broadcast.

    Raises FlightError outside the atmosphere's range or at Mach 1 and above (the pitot relation is subsonic).
    """
    _, pressure, _, sound = air_column(height_m, temp_offset_k)
    tas = np.asarray(tas_mps, dtype=np.float64)
    mach = tas / sound
    if not (mach < 1.0).all():
        worst = float(np.max(mach))
        raise FlightError(
            f"Mach number is {worst:.3f}; calibrated airspeed here is valid below 1",
            quantity="Mach number",
            value=worst,
            limit=1.0,
        )
    impact = pressure * np.expm1(3.5 * np.log1p(0.2 * mach * mach))
    result: Array = SEA_LEVEL_SOUND_MPS * np.sqrt(5.0 * np.expm1(np.log1p(impact / SEA_LEVEL_PA) / 3.5))
    return result
