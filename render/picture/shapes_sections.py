"""Sections the invented aircraft are lofted from: superellipse rings, airfoils, spindles, boxes.

Body axes, metres. Airfoil: the four-digit thickness form, NACA Report 460 (1933), Eq. for y_t, closed trailing edge.
"""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np

from render.frames import Array
from render.picture.loft import Colour, Surf, closed, rings
from render.picture.pchip import Curve


@dataclass(frozen=True, slots=True, eq=False)
class Body:
    """A fuselage by stations: x falling from nose to tail; half width, top, bottom, height of greatest width; fullness.

    The rows of ``stations`` are (x, half width, top z, bottom z, waist z, exponent of the superellipse).
    """

    stations: Array
    _curve: Curve = field(init=False, repr=False)

    def __post_init__(self) -> None:
        rising = self.stations[::-1]
        object.__setattr__(self, "_curve", Curve(rising[:, 0], rising[:, 1:]))

    def at(self, x_m: Array) -> Array:
        """Interpolated rows (..., 5): half width, top, bottom, waist, exponent; shape-preserving cubic in x."""
        return self._curve(x_m)

    def top_z(self, x_m: Array, y_m: Array) -> Array:
        """Height (z, down) of the upper skin at x, y."""
        w, top, _, waist, n = np.moveaxis(self.at(np.asarray(x_m, float)), -1, 0)
        ratio = np.clip(np.abs(y_m) / np.maximum(w, 1e-6), 0.0, 1.0)
        result: Array = waist + (top - waist) * (1.0 - ratio**n) ** (1.0 / n)
        return result

    def loft(self, x_m: Array, around: int, colour: Colour) -> Surf:
        """The skin, with rings at x_m."""
        row = self.at(np.asarray(x_m, float))[:, None, :]
        turn = np.linspace(0.0, 2 * np.pi, around, endpoint=False)[None, :]
        w, top, bottom, waist, n = np.moveaxis(row, -1, 0)
        y = w * np.sign(np.cos(turn)) * np.abs(np.cos(turn)) ** (2 / n)
        up = np.abs(np.sin(turn)) ** (2 / n)
        z = waist + np.where(np.sin(turn) > 0, bottom - waist, top - waist) * up
        x = np.broadcast_to(np.asarray(x_m, float)[:, None], y.shape)
        return rings(np.stack([x, y, z], -1), colour)


def body(rows: Sequence[Sequence[float]]) -> Body:
    """A Body from rows (x, half width, top, bottom, waist, exponent)."""
    return Body(np.array(rows, float))


def airfoil(thickness: float, points: int, hinge: float = 1.0, cut_off: bool = False, camber: float = 0.0) -> Array:
    """Contour (2 n - 1, 2) of chord fraction and height fraction, from the tail over the top to the tail.

    hinge: a chord fraction that is a point of the contour; cut_off: the section ends there with a wall.
    """
    x = hinge * (1.0 - np.cos(np.pi * np.linspace(0.0, 1.0, points))) / 2.0
    if hinge < 1.0 and not cut_off:
        x = np.concatenate([x, np.linspace(hinge, 1.0, 4)[1:]])
    half = 5 * thickness * (0.2969 * np.sqrt(x) - 0.1260 * x - 0.3516 * x**2 + 0.2843 * x**3 - 0.1036 * x**4)
    bow = 4 * camber * x * (1 - x)
    upper, lower = np.stack([x, bow + half], -1), np.stack([x, bow - half], -1)
    return np.concatenate([upper[::-1], lower[1:]])


@dataclass(frozen=True, slots=True, eq=False)
class Panel:
    """A lifting surface by two or more sections: (span station y, leading edge x, z of the chord, chord, thickness)."""

    sections: Array
    camber: float = 0.0
    upright: bool = False  # a fin: the span runs along -z and the thickness along y
    twist_rad: float = 0.0  # at the last section, nose down positive

    def at(self, span_m: Array) -> Array:
        """Leading edge x, z, chord, thickness at span stations, (..., 4); linear."""
        s = self.sections
        return np.stack([np.interp(span_m, s[:, 0], s[:, i]) for i in range(1, 5)], -1)

    def point(self, span_m: float, part: float) -> Array:
        """A point of the chord plane (3,) at a part of the chord."""
        x, z, chord, _ = self.at(np.asarray(span_m, float))
        along = float(x - part * chord)
        return np.array([along, z, -span_m]) if self.upright else np.array([along, span_m, z])

    def loft(
        self,
        span_m: Sequence[float],
        colour: Colour,
        *,
        start: float = 0.0,
        hinge: float = 1.0,
        cut_off: bool = False,
        points: int = 13,
        round_tip_m: float = 0.0,
    ) -> Surf:
        """The surface between span stations: nose to tail or to a hinge (cut_off), or a flap from ``start``."""
        span = np.asarray(span_m, float)
        if round_tip_m > 0.0:
            steps = np.array([0.4, 0.7, 0.9, 1.0])
            last = self.sections[-1, 0]
            span = np.concatenate([span[span < last - 1.05 * round_tip_m], last - round_tip_m * (1 - steps)])
        x_le, z_c, chord, thick = np.moveaxis(self.at(span), -1, 0)
        loops = []
        for i in range(len(span)):
            contour = _cut_contour(float(thick[i]), points, start, hinge, cut_off, self.camber)
            if round_tip_m > 0.0:
                past = np.clip((span[i] - (self.sections[-1, 0] - round_tip_m)) / round_tip_m, 0.0, 1.0)
                shrink = np.sqrt(1.0 - 0.985 * past**2)
                contour = np.stack([contour[:, 0], contour[:, 1] * shrink], -1)
                contour[:, 0] = 1.0 - (1.0 - contour[:, 0]) * (1.0 - 0.16 * past**2.5)
            angle = self.twist_rad * (span[i] - self.sections[0, 0]) / np.ptp(self.sections[:, 0])
            x = x_le[i] - chord[i] * contour[:, 0]
            z = z_c[i] - chord[i] * (contour[:, 1] - (contour[:, 0] - 0.25) * -np.sin(angle))
            if self.upright:
                loops.append(np.stack([x, chord[i] * contour[:, 1] + z_c[i], np.full_like(x, -span[i])], -1))
            else:
                loops.append(np.stack([x, np.full_like(x, span[i]), z], -1))
        return rings(np.array(loops), colour)


def _cut_contour(thickness: float, points: int, start: float, hinge: float, cut_off: bool, camber: float) -> Array:
    """An airfoil loop without the doubled tail point; for a flap, with a rounded nose at ``start``."""
    if start <= 0.0:
        loop = airfoil(thickness, points, hinge, cut_off, camber)
        return loop if cut_off else loop[:-1]
    x = np.linspace(start, 1.0, 5)
    whole = airfoil(thickness, 60, camber=camber)
    upper = np.interp(x, whole[:60, 0][::-1], whole[:60, 1][::-1])
    lower = np.interp(x, whole[59:, 0], whole[59:, 1])
    middle, half = (upper[0] + lower[0]) / 2, (upper[0] - lower[0]) / 2
    nose = np.linspace(np.pi / 2, 3 * np.pi / 2, 5)[1:-1]
    bow = np.stack([start + 0.8 * half * np.cos(nose), middle + half * np.sin(nose)], -1)
    return np.concatenate([np.stack([x, upper], -1)[::-1], bow, np.stack([x, lower], -1)[:-1]])


def spindle(
    axis_m: Sequence[Sequence[float]], colour: Colour, around: int = 12, direction: Sequence[float] = (1.0, 0.0, 0.0)
) -> Surf:
    """A body of circles: rows (x, y, z, radius) or (x, y, z, half width, half height), planes of constant x."""
    table = np.array([(*row, row[-1]) if len(row) == 4 else row for row in axis_m], float)
    turn = np.linspace(0.0, 2 * np.pi, around, endpoint=False)
    y = table[:, 1:2] + table[:, 3:4] * np.cos(turn)
    z = table[:, 2:3] + table[:, 4:5] * np.sin(turn)
    x = np.broadcast_to(table[:, :1], y.shape)
    return rings(np.stack([x, y, z], -1), colour)


def ellipsoid(
    centre_m: Sequence[float], half_m: Sequence[float], colour: Colour, rows: int = 10, cols: int = 16
) -> Surf:
    """An ellipsoid with its poles above and below."""
    lat = np.linspace(-np.pi / 2, np.pi / 2, rows + 2)[1:-1, None]
    lon = np.linspace(0.0, 2 * np.pi, cols, endpoint=False)[None, :]
    unit = np.stack(np.broadcast_arrays(np.cos(lat) * np.cos(lon), np.cos(lat) * np.sin(lon), np.sin(lat)), -1)
    poles = np.array([[0.0, 0.0, -1.0], [0.0, 0.0, 1.0]])
    flat = np.concatenate([unit.reshape(-1, 3), poles]) * np.asarray(half_m) + np.asarray(centre_m)
    k = np.arange(cols)
    n = (k + 1) % cols
    last = (rows - 1) * cols
    r, c = np.meshgrid(np.arange(rows - 1), k, indexing="ij")
    a, b, d, e = r * cols + c, r * cols + n[c], (r + 1) * cols + c, (r + 1) * cols + n[c]
    tris = [np.stack([a, b, e], -1).reshape(-1, 3), np.stack([a, e, d], -1).reshape(-1, 3)]
    tris.append(np.stack([np.full(cols, rows * cols), n, k], -1))
    tris.append(np.stack([np.full(cols, rows * cols + 1), last + k, last + n], -1))
    return closed(flat, np.concatenate(tris), colour)


def box(low_m: Sequence[float], high_m: Sequence[float], colour: Colour, lean: float = 0.0) -> Surf:
    """A box; ``lean`` shifts its top aft by that part of its height."""
    corners = np.array([[x, y, z] for x in (0, 1) for y in (0, 1) for z in (0, 1)], float)
    points = np.asarray(low_m) + corners * (np.asarray(high_m, float) - np.asarray(low_m))
    points[:, 0] -= lean * (high_m[2] - points[:, 2])
    quads = [(0, 1, 3, 2), (4, 6, 7, 5), (0, 4, 5, 1), (2, 3, 7, 6), (0, 2, 6, 4), (1, 5, 7, 3)]
    tris = [t for a, b, c, d in quads for t in ((a, b, c), (a, c, d))]
    return closed(points, np.array(tris), colour)


def outline(rows: Sequence[Sequence[float]]) -> Callable[[Array], Array]:
    """Half width over x of a plan form: rows (x, half width), x falling; negative beyond its ends."""
    table = np.array(rows, float)[::-1]
    curve = Curve(table[:, 0], table[:, 1])

    def width(x_m: Array) -> Array:
        beyond = np.maximum(table[0, 0] - x_m, x_m - table[-1, 0])
        inside = curve(np.clip(x_m, table[0, 0], table[-1, 0]))
        return np.where(beyond > 0, -beyond, inside)

    return width
