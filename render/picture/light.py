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
_SUN = np.array([[.45, .24, .10], [.72, .46, .24], [.84, .68, .48], [.84, .77, .66], [.84, .79, .70], [.84, .80, .72]])
_SKY = np.array([[.22, .24, .33], [.28, .31, .40], [.34, .38, .46], [.36, .41, .48], [.38, .42, .49], [.38, .42, .49]])
_RIM = np.array([[.62, .58, .60], [.70, .69, .70], [.72, .76, .80], [.73, .79, .85], [.74, .80, .86], [.74, .80, .86]])
_ZENITH = np.array([[.17, .23, .38], [.20, .30, .50], [.22, .38, .63], [.22, .42, .70], [.21, .42, .72], [.20, .41, .72]])
_GLOW = np.array([[.30, .12, -.08], [.22, .12, .0], [.14, .10, .04], [.08, .06, .03], [.04, .03, .02], [.0, .0, .0]])


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
        sun_d, sun, sky, rim, zenith + 0.5 * (1.0 - clear) * (rim - zenith), at(_GLOW), sun * sun_d[2] + sky, clear,
        KOSCHMIEDER / day.visibility_m,
    )
