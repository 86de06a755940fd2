"""Canopy, cockpit opening, tub and crew of any of the shapes, in the design's own metres."""

from __future__ import annotations

from collections.abc import Callable, Sequence
from dataclasses import dataclass, field

import numpy as np

from render.frames import Array
from render.picture.loft import Colour, Surf, grid_tris, merge, surface
from render.picture.paint import Side, divided, station
from render.picture.pchip import Curve
from render.picture.shapes_parts import Fit
from render.picture.shapes_sections import Body, ellipsoid

INSIDE: Colour = (88, 92, 93)
BLACK: Colour = (34, 35, 37)


@dataclass(frozen=True, slots=True, eq=False)
class Canopy:
    """A canopy on a fuselage: plan outline (half width over x), crown height over x, where its frames run.

    frames: rows (x at the sill, forward lean per metre up, width m).
    """

    body: Body
    width: Callable[[Array], Array]
    crown: Array  # rows (x, z), x falling
    frames: tuple[tuple[float, float, float], ...]
    rail_m: float = 0.055
    fullness: float = 2.3
    _top: Curve = field(init=False, repr=False)

    def __post_init__(self) -> None:
        rising = self.crown[::-1]
        object.__setattr__(self, "_top", Curve(rising[:, 0], rising[:, 1]))

    def sill_z(self, x_m: Array) -> Array:
        """Height (z) of the rail at x."""
        return self.body.top_z(x_m, np.maximum(self.width(x_m), 0.0))

    def crown_z(self, x_m: Array) -> Array:
        """Height (z) of the canopy's top at x."""
        return self._top(x_m)

    def skin_z(self, x_m: Array, y_m: Array) -> Array:
        """Height (z) of the glass at x, y; the rail's height beyond it."""
        width, sill = np.maximum(self.width(x_m), 1e-6), self.sill_z(x_m)
        ratio = np.clip(np.abs(y_m) / width, 0.0, 1.0)
        result: Array = sill - (sill - self.crown_z(x_m)) * (1 - ratio**self.fullness) ** (1 / self.fullness)
        return result

    def hole(self, beyond_m: float = 0.008) -> Side:
        """Side of the cockpit opening in the fuselage's upper skin."""
        waist = float(self.body.stations[:, 4].max())
        ends = self.crown[0, 0], self.crown[-1, 0]

        def side(p: Array) -> Array:
            inside = np.abs(p[:, 1]) - beyond_m - self.width(p[:, 0])
            past = np.maximum(p[:, 0] - ends[0], ends[1] - p[:, 0])
            return np.maximum.reduce([inside, past, p[:, 2] - waist + 0.12])

        return side

    def shell(self, colour: Colour, along: int = 34, across: int = 19) -> tuple[Surf, Surf]:
        """(frames and rail, glass), one smooth surface divided, facing outward."""
        front, back = self.crown[0, 0], self.crown[-1, 0]
        u = np.linspace(0.0, 1.0, along)
        x = front + (back - front) * (u - 0.08 * np.sin(2 * np.pi * u))
        w, sill, crown = np.maximum(self.width(x), 0.0)[:, None], self.sill_z(x)[:, None], self.crown_z(x)[:, None]
        turn = np.linspace(0.0, np.pi, across)[None, :]
        y = w * np.sign(np.cos(turn)) * np.abs(np.cos(turn)) ** (2 / self.fullness)
        z = sill - (sill - crown) * np.sin(turn) ** (2 / self.fullness)
        # A bead along the rail hides the edge of the opening.
        foot, lip = w + 0.026, w + 0.017
        foot_z, lip_z = self.body.top_z(x[:, None], foot) - 0.004, self.body.top_z(x[:, None], lip) - 0.018
        y = np.concatenate([foot, lip, y, -lip, -foot], axis=1)
        z = np.concatenate([foot_z, lip_z, z, lip_z, foot_z], axis=1)
        points = np.stack([np.broadcast_to(x[:, None], y.shape), y, z], -1)
        skin = surface(points.reshape(-1, 3), grid_tris(len(y), y.shape[1], False), colour)
        if (skin.normals[:, 2]).mean() > 0:
            skin = surface(points.reshape(-1, 3), grid_tris(len(y), y.shape[1], False)[:, ::-1], colour)
        rail, glass = divided(skin, lambda p: self.sill_z(p[:, 0]) - p[:, 2] - self.rail_m)
        pieces = [rail]
        for at, lean, width in self.frames:
            level = float(self.sill_z(np.array(at)))

            plane = at + lean * level
            # Both borders are cut one by one: a narrow band between two vertices would be missed.
            before, rest = divided(glass, station(plane + width / 2, (1.0, 0.0, lean)))
            band, after = divided(before, station(-plane + width / 2, (-1.0, 0.0, -lean)))
            pieces.append(band)
            glass = merge([rest, after])
        return merge(pieces), glass

    def tub(self, depth_m: float = 0.62, part: float = 0.95) -> Surf:
        """The cockpit's walls, floor and end walls, seen from above; faces inward."""
        front, back = self.crown[0, 0] - 0.12, self.crown[-1, 0] + 0.12
        x = np.linspace(front, back, 18)
        w = np.maximum(part * self.width(x), 0.02)
        rail = self.sill_z(x) + 0.004
        floor = np.full_like(x, self.sill_z(np.array((front + back) / 2)) + depth_m)
        half = [(w, rail), (0.9 * w, rail + 0.07), (0.86 * w, floor)]
        rows = half + [(-y, z) for y, z in half[::-1]]
        points = np.stack([np.stack([x, y, z], -1) for y, z in rows], axis=1)
        skin = surface(points.reshape(-1, 3), grid_tris(len(points), points.shape[1], False), INSIDE)
        if skin.normals[:, 2].mean() > 0:
            skin = surface(points.reshape(-1, 3), grid_tris(len(points), points.shape[1], False)[:, ::-1], INSIDE)
        return skin

    def deck(self, x_m: float, bulge_m: float = 0.05, across: int = 13) -> Surf:
        """The front hood: a matt deck between the rails from its aft edge to the windscreen, with a rolled lip."""
        x = np.linspace(x_m, self.crown[0, 0] - 0.02, 14)
        w, sill = np.maximum(self.width(x), 0.01)[:, None], self.sill_z(x)[:, None]
        s = np.linspace(-1.0, 1.0, across)[None, :]
        z = sill + 0.004 - bulge_m * (1.0 - s**2) * np.minimum(w / 0.3, 1.0)
        points = np.stack([np.broadcast_to(x[:, None], z.shape), s * w, z], -1)
        lip = points[:1] + np.array([[[0.012, 0.0, 0.03]], [[-0.008, 0.0, 0.012]]])
        tris = grid_tris(len(points) + 2, across, False)
        skin = surface(np.concatenate([lip, points]).reshape(-1, 3), tris, BLACK)
        if skin.normals[:, 2].mean() > 0:
            skin = surface(np.concatenate([lip, points]).reshape(-1, 3), tris[:, ::-1], BLACK)
        return skin

    def coaming(self, x_m: float, top_z_m: float, length_m: float) -> Surf:
        """The hood over an instrument panel, its aft edge at x."""
        half = 0.84 * float(self.width(np.array(x_m)))
        deep = 0.42
        hood = ellipsoid((x_m, 0.0, top_z_m + deep), (length_m, half, deep), BLACK, 8, 18)
        ahead, _ = divided(hood, lambda p: x_m - p[:, 0])
        turn = np.linspace(0.0, 2 * np.pi, 18, endpoint=False)
        wall = np.stack([np.full(18, x_m), half * np.cos(turn), top_z_m + deep + deep * np.sin(turn)], -1)
        tris = np.stack([np.full(18, 18), np.roll(np.arange(18), -1), np.arange(18)], -1)
        panel = surface(np.concatenate([wall, [[x_m, 0.0, top_z_m + deep]]]), tris, (40, 42, 44))
        return merge([ahead, panel])


@dataclass(frozen=True, slots=True, eq=False)
class CockpitDesign:
    """A front seat's surroundings in the design's metres, and how they become the airframe's."""

    place: Fit
    lid: Canopy
    deck_x_m: float  # aft edge of the front hood
    coamings: tuple[tuple[float, float, float], ...]  # hoods behind it: (aft edge x, top z, length)
    frame: Colour
    suit: Colour
    seat: Colour
    rear_eye_m: tuple[float, float, float] | None = None  # in the design's metres


def canopy(
    body: Body,
    outline: Callable[[Array], Array],
    crown: Sequence[Sequence[float]],
    frames: Sequence[tuple[float, float, float]],
    fullness: float = 2.3,
) -> Canopy:
    """A canopy whose ends lie on the fuselage: the crown's first and last heights are taken from the skin."""
    table = np.array(crown, float)
    for end in (0, -1):
        table[end, 1] = float(body.top_z(table[end, 0], np.array(0.0)))
    return Canopy(body, outline, table, tuple(frames), fullness=fullness)
