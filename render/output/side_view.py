"""The small side elevation: the path with the fault and the path without it, over the ground."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray
from PIL import Image, ImageDraw

from render.frames import Array
from render.output.events import slot_index
from render.output.ink import BACK, GREEN, QUIET, SKY, VERMILION, WHITE, font, mark, put_mark
from render.output.texts import sample
from render.types import Flight, Study

SMOOTH = 3  # drawn so many times as large, then reduced


class SideView:
    """Both paths of one slot's aircraft in the vertical plane of the lead's entry heading, to one scale."""

    def __init__(
        self, study: Study, slot: str, start_s: float, end_s: float, size: tuple[int, int], unit_px: float
    ) -> None:
        k = slot_index(study, slot)
        self._size, self._u, self._end_s = size, unit_px, end_s
        self._flight, self._k = study.faulted, k
        along_e = entry_direction(study.healthy)
        self._along = study.faulted.pos_e_m[:, k, :2] @ along_e
        twin_along = study.healthy.pos_e_m[:, k, :2] @ along_e
        shown = (study.faulted.time_s >= start_s) & (study.faulted.time_s <= end_s + 1e-9)
        twin = (study.healthy.time_s >= start_s) & (study.healthy.time_s <= end_s + 2.0)
        paths = [
            (twin_along[twin], study.healthy.height_m[twin, k]),
            (self._along[shown], study.faulted.height_m[shown, k]),
        ]
        ground_x, ground_y = _ground(self._along, study.faulted, k)
        x_all = np.concatenate([p[0] for p in paths])
        y_all = np.concatenate([p[1] for p in paths] + [ground_y])
        self._fit(x_all, y_all)
        self._rest = self._resting(study, paths, (ground_x, ground_y), shown)

    def _fit(self, x: Array, y: Array) -> None:
        u = self._u
        pad_x, top, bottom = 16 * u, 34 * u, 16 * u
        width, height = self._size[0] - 2 * pad_x, self._size[1] - top - bottom
        span_x, span_y = max(float(np.ptp(x)), 50.0), max(float(np.ptp(y)), 50.0)
        self._scale = min(width / span_x, height / span_y)
        self._x0 = pad_x + (width - span_x * self._scale) / 2 - float(x.min()) * self._scale
        self._y0 = self._size[1] - bottom + float(y.min()) * self._scale

    def _px(self, x: Array | float, y: Array | float) -> Array:
        return np.stack([self._x0 + np.asarray(x) * self._scale, self._y0 - np.asarray(y) * self._scale], axis=-1)

    def _resting(
        self, study: Study, paths: list[tuple[Array, Array]], ground: tuple[Array, Array], shown: NDArray[np.bool_]
    ) -> Image.Image:
        u, big = self._u, (self._size[0] * SMOOTH, self._size[1] * SMOOTH)
        image = Image.new("RGB", big, BACK)
        draw = ImageDraw.Draw(image)
        gx, gy = ground
        gx = np.concatenate(([-1e5], gx, [1e5]))
        gy = np.concatenate((gy[:1], gy, gy[-1:]))
        soil = self._px(gx, gy) * SMOOTH
        soil[:, 0] = np.clip(soil[:, 0], -10, big[0] + 10)
        draw.polygon([*map(tuple, soil), (big[0] + 10, big[1]), (-10, big[1])], fill=(52, 66, 46))
        draw.line([tuple(p) for p in soil], fill=GREEN, width=max(1, round(2 * u * SMOOTH)))
        (hx, hy), (fx, fy) = paths
        _dashed(draw, self._px(hx, hy) * SMOOTH, QUIET, 2.2 * u * SMOOTH, 7 * u * SMOOTH)
        line = self._px(fx, fy) * SMOOTH
        fault_s = study.faulted.fault_s
        times = study.faulted.time_s[shown]
        split = len(times) if fault_s is None else int(np.searchsorted(times, fault_s))
        for part, colour in ((line[: split + 1], SKY), (line[split:], VERMILION)):
            if len(part) > 1:
                draw.line([tuple(p) for p in part], fill=colour, width=round(4 * u * SMOOTH), joint="curve")
        image = image.resize(self._size, Image.Resampling.LANCZOS)
        draw = ImageDraw.Draw(image)
        if fault_s is not None and 0 < split < len(times):
            put_mark(image, mark("fault", round(15 * u), VERMILION), *(line[split] / SMOOTH))
        face = font(15 * u)
        y = 16 * u
        if fault_s is None:
            draw.text((12 * u, y), "path", fill=WHITE, font=face, anchor="lm")
            return image
        draw.line((12 * u, y, 36 * u, y), fill=VERMILION, width=max(2, round(4 * u)))
        draw.text((44 * u, y), "fault", fill=WHITE, font=face, anchor="lm")
        for x in (116, 126, 136):
            draw.line((x * u, y, (x + 6) * u, y), fill=QUIET, width=max(1, round(2 * u)))
        draw.text((150 * u, y), "without", fill=WHITE, font=face, anchor="lm")
        return image

    def draw(self, time_s: float) -> Image.Image:
        """The elevation at one instant: the aircraft as a dart along its path."""
        flight, k = self._flight, self._k
        image = self._rest.copy()
        at = min(time_s, self._end_s)
        x, y = sample(flight.time_s, self._along, at), sample(flight.time_s, flight.height_m[:, k], at)
        step = 0.2
        then = min(max(at, float(flight.time_s[0]) + step), self._end_s)
        dx, dy = (
            sample(flight.time_s, values, then) - sample(flight.time_s, values, then - step)
            for values in (self._along, flight.height_m[:, k])
        )
        turn = round(float(np.degrees(np.arctan2(dy, dx))) / 5.0) * 5 % 360  # in steps of 5 deg: few cached marks
        put_mark(image, mark("aircraft", round(24 * self._u), WHITE, True, turn), *self._px(x, y))
        return image


def entry_direction(flight: Flight) -> Array:
    """Horizontal unit vector (north, east) of the lead's first flight direction."""
    velocity = flight.vel_e_mps[0, 0, :2]
    speed = float(np.hypot(velocity[0], velocity[1]))
    return velocity / speed if speed > 0 else np.array([1.0, 0.0])


def _ground(along: Array, flight: Flight, k: int) -> tuple[Array, Array]:
    """Ground height under the flown path as a function of the distance along it, (N,) each, ascending."""
    ground = flight.height_m[:, k] - flight.height_agl_m[:, k]
    order = np.argsort(along, kind="stable")
    step = max(1, len(order) // 200)
    return along[order][::step], ground[order][::step]


def _dashed(draw: ImageDraw.ImageDraw, points: Array, colour: tuple[int, int, int], width: float, dash: float) -> None:
    """A polyline in dashes of equal length along it."""
    length = np.concatenate(([0.0], np.cumsum(np.hypot(*np.diff(points, axis=0).T))))
    for start in np.arange(0.0, length[-1], 2 * dash):
        at = np.linspace(start, min(start + dash, length[-1]), 6)
        xy = np.stack([np.interp(at, length, points[:, i]) for i in range(2)], axis=-1)
        draw.line([tuple(p) for p in xy], fill=colour, width=max(1, round(width)))
