"""Light of the day: where the sun stands and the colours that follow from its height; haze from visibility."""

from __future__ import annotations

from dataclasses import dataclass

import numpy as np

from render.frames import Array
from scenes.model import Day

#: Luminous contrast of a black object falls to 2 % at the meteorological visibility: ln(0.02) = -3.912.
#: Source: Koschmieder 1924 as in WMO-No. 8 (Guide to Instruments), chapter "Measurement of visibility".
KOSCHMIEDER = 3.912

# Colours against the sun's height, by eye, no source: degrees; sun, sky light, horizon, zenith, glow under the sun.
_HEIGHTS_DEG = np.array([1.0, 6.0, 15.0, 35.0, 60.0, 90.0])
_SUN = np.array(
    [
        [0.45, 0.24, 0.10],
        [0.72, 0.46, 0.24],
        [0.84, 0.68, 0.48],
        [0.84, 0.77, 0.66],
        [0.84, 0.79, 0.70],
        [0.84, 0.80, 0.72],
    ]
)
_SKY = np.array(
    [
        [0.22, 0.24, 0.33],
        [0.28, 0.31, 0.40],
        [0.34, 0.38, 0.46],
        [0.36, 0.41, 0.48],
        [0.38, 0.42, 0.49],
        [0.38, 0.42, 0.49],
    ]
)
_RIM = np.array(
    [
        [0.62, 0.58, 0.60],
        [0.70, 0.69, 0.70],
        [0.72, 0.76, 0.80],
        [0.73, 0.79, 0.85],
        [0.74, 0.80, 0.86],
        [0.74, 0.80, 0.86],
    ]
)
_ZENITH = np.array(
    [
        [0.17, 0.23, 0.38],
        [0.20, 0.30, 0.50],
        [0.22, 0.38, 0.63],
        [0.22, 0.42, 0.70],
        [0.21, 0.42, 0.72],
        [0.20, 0.41, 0.72],
    ]
)
_GLOW = np.array(
    [
        [0.30, 0.12, -0.08],
        [0.22, 0.12, 0.0],
        [0.14, 0.10, 0.04],
        [0.08, 0.06, 0.03],
        [0.04, 0.03, 0.02],
        [0.0, 0.0, 0.0],
    ]
)


@dataclass(frozen=True, slots=True, eq=False)
class Light:
    """Direction and colours (sRGB, 0..1) of the day's light; extinction per metre."""

    sun_d: Array  # (3,) toward the sun, display axes
    sun: Array
    sky: Array
    rim: Array
    zenith: Array
    glow: Array
    flat: Array  # what level ground gets from sun and sky
    clear: float  # 0 in thick haze, 1 in clear air: how fast the sky darkens upward
    extinction_per_m: float


def light_of(day: Day) -> Light:
    """The light of a day."""
    height, bearing = day.sun_height_rad, day.sun_from_rad
    sun_d = np.array([np.cos(height) * np.sin(bearing), np.cos(height) * np.cos(bearing), np.sin(height)])

    def at(table: Array) -> Array:
        return np.array([np.interp(np.degrees(height), _HEIGHTS_DEG, table[:, k]) for k in range(3)])

    clear = float(np.clip((day.visibility_m - 1.5e3) / 20e3, 0.0, 1.0))
    rim, zenith, sun, sky = at(_RIM), at(_ZENITH), at(_SUN), at(_SKY)
    # A camera and an eye open up when the light is low: level ground darkens only with the 0.3 power of its light.
    bare = sun * sun_d[2] + sky
    opened = float(np.mean(bare)) ** -0.7
    sun, sky = sun * opened, sky * opened
    return Light(
        sun_d,
        sun,
        sky,
        rim,
        zenith + 0.5 * (1.0 - clear) * (rim - zenith),
        at(_GLOW),
        sun * sun_d[2] + sky,
        clear,
        KOSCHMIEDER / day.visibility_m,
    )
