"""The passes of a scatter study: each a scene of its own, drawn by lot from a seed.

Every pass has its own stream of random numbers, so that the passes are the same however many there are and
however they are cut into chunks.
"""

from __future__ import annotations

import dataclasses
import math
from dataclasses import dataclass

import numpy as np
from scipy import stats

from render.frames import Array
from render.types import freeze_arrays
from scenes.model import Level, Loop, Power, Scatter, Scene, Step, Wind

# What is drawn for the whole formation, and for each wing pilot; standard normal.
COMMON = ("entry speed", "entry height", "g on the way up", "early pull down", "base height", "power", "wind north",
          "wind east")
OWN = ("place aft", "place right", "place down", "attention", "reaction")
LATE_TABLE_RAD = 1.5 * math.pi  # the pull down is earlier or later about vertical down
UP_UNTIL_RAD, DOWN_FROM_RAD = np.radians([150.0, 200.0])
REACTION_LEAST_S, REACTION_MOST_S = 0.6, 5.0  # NOTICING.md 3.15: Gamma, truncated


@dataclass(frozen=True, slots=True, eq=False)
class Draws:
    """Standard normal draws of N passes and S slots."""

    seed: int
    common: Array  # (N, len(COMMON))
    own: Array  # (N, S, len(OWN))

    def __post_init__(self) -> None:
        freeze_arrays(self)


def draw(passes: int, slots: int, seed: int, first: int = 0) -> Draws:
    """The draws of so many passes from the ``first`` on; a longer study begins with the passes of a shorter one."""
    common, own = np.empty((passes, len(COMMON))), np.empty((passes, slots, len(OWN)))
    for i in range(passes):
        rng = np.random.default_rng(np.random.SeedSequence([seed, 0, first + i]))
        common[i] = rng.standard_normal(len(COMMON))
        own[i] = rng.standard_normal((slots, len(OWN)))
    return Draws(seed, common, own)


def pass_scenes(scene: Scene, scatter: Scatter, draws: Draws) -> list[Scene]:
    """The scene of each pass: entry, pull, power, wind and places of the wings moved by what was drawn."""
    return [_pass(scene, scatter, common, own) for common, own in zip(draws.common, draws.own, strict=True)]


def _pass(scene: Scene, scatter: Scatter, common: Array, own: Array) -> Scene:
    speed, height, up, early, base, power, north, east = common
    script: list[Step] = []
    for i, step in enumerate(scene.script):
        if i == 0:
            assert isinstance(step, Level) and step.speed_mps is not None and step.height_m is not None
            step = dataclasses.replace(step, speed_mps=step.speed_mps + float(speed) * scatter.entry_speed_mps,
                                       height_m=step.height_m + float(height) * scatter.entry_height_m)
        elif isinstance(step, Loop):
            step = _pulled(step, scatter.load_factor * float(up), scatter.load_factor * float(early))
            if step.close_at_m is not None:
                step = dataclasses.replace(step, close_at_m=step.close_at_m + float(base) * scatter.base_m)
            step = dataclasses.replace(step, power=_powered(step.power, scatter.power * float(power)))
        script.append(step)
    slots = tuple(
        dataclasses.replace(slot, aft_m=slot.aft_m + scatter.station_m * float(z[0]),
                            right_m=slot.right_m + scatter.station_m * float(z[1]),
                            down_m=slot.down_m + scatter.station_m * float(z[2]))
        for slot, z in zip(scene.formation, own, strict=True)
    )
    day = scene.day
    if scatter.wind_mps > 0.0:
        day = dataclasses.replace(day, wind=_blown(day.wind, scatter.wind_mps * float(north),
                                                   scatter.wind_mps * float(east)))
    return dataclasses.replace(scene, script=tuple(script), formation=slots, day=day)


def _pulled(loop: Loop, up: float, early: float) -> Loop:
    """More g on the way up by ``up``; on the way down more before the vertical and less after it by ``early``.

    A loop that closes is scaled on its way down anyway: what is left there to differ is how early it is pulled.
    """
    x, n = np.array(loop.angle_rad), np.array(loop.load_factor)
    fade = np.clip((x - UP_UNTIL_RAD) / (DOWN_FROM_RAD - UP_UNTIL_RAD), 0.0, 1.0)
    tilt = np.clip((LATE_TABLE_RAD - x) / (0.5 * math.pi), -1.0, 1.0)
    down = early * (tilt if loop.close_at_m is not None else 1.0)
    load = n * (1.0 + (1.0 - fade) * up + fade * down)
    return dataclasses.replace(loop, load_factor=tuple(float(v) for v in load))


def _powered(power: Power, change: float) -> Power:
    """A power that differs by a part of itself; idle and held ones stay, none goes above full."""
    if power.kind not in ("full", "part") or change == 0.0:
        return power
    part = 1.0 if power.kind == "full" else power.part
    return Power("part", min(max(part * (1.0 + change), 0.0), 1.0))


def _blown(wind: Wind | None, north_mps: float, east_mps: float) -> Wind:
    """A wind with so much more from the north and from the east."""
    speed, from_rad = (0.0, 0.0) if wind is None else (wind.speed_mps, wind.from_rad)
    north, east = speed * math.cos(from_rad) + north_mps, speed * math.sin(from_rad) + east_mps
    return Wind(math.atan2(east, north) % (2.0 * math.pi), math.hypot(north, east))


def reaction_s(mean_s: float, spread: float, normal: Array) -> Array:
    """Reactions of a Gamma shape, s, from standard normal draws (NOTICING.md 3.6, 3.15), at spread 0 the mean.

    Cut off below 0.6 s and above 5 s (or at the mean, if that lies beyond).
    """
    if spread <= 0.0:
        return np.full(normal.shape, mean_s)
    shape = stats.gamma(1.0 / spread**2, scale=mean_s * spread**2)
    low, high = shape.cdf([min(REACTION_LEAST_S, mean_s), max(REACTION_MOST_S, mean_s)])
    drawn: Array = shape.ppf(low + (high - low) * stats.norm.cdf(normal))
    return drawn
