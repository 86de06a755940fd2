"""Instrument panel, stick, throttle and the pilot's own knees and arms, as seen from the seat."""

from __future__ import annotations

import numpy as np

from render.frames import Array
from render.picture.loft import Colour, Surf, merge, moved, surface
from render.picture.shapes_cockpit import Canopy
from render.picture.shapes_sections import box, ellipsoid, spindle

PANEL: Colour = (92, 96, 98)
DIAL: Colour = (24, 25, 27)
MARK: Colour = (214, 214, 206)
GLOVE: Colour = (74, 76, 68)


def panel(lid: Canopy, deck_x_m: float) -> list[Surf]:
    """The panel under the front hood with six dials and two screens; dials carry marks and no hands.

    deck_x_m: the hood's aft edge in the design's metres.
    """
    x, top = deck_x_m + 0.03, float(lid.sill_z(np.array(deck_x_m))) - 0.01
    half = 0.86 * float(lid.width(np.array(deck_x_m)))
    # Its upper edge follows the hood's curve, just under it.
    across = np.linspace(-1.0, 1.0, 9)
    edge = np.stack([np.full(9, x), half * across, top + 0.034 - 0.05 * (1 - across**2)], -1)
    corners = np.concatenate([edge, [[x, half, top + 0.52], [x, -half, top + 0.52], [x, 0.0, top + 0.25]]])
    turn = np.arange(11)
    pieces = [surface(corners, np.stack([np.full(11, 11), (turn + 1) % 11, turn], -1), PANEL)]
    for row, z in enumerate((top + 0.075, top + 0.205)):
        for y in (-0.115, 0.0, 0.115):
            pieces += _dial(x - 0.004, y, z, 0.052, marks=12 if row else 8)
    for sign in (-1.0, 1.0):
        low, high = sorted((sign * 0.185, sign * (half - 0.02)))
        pieces.append(_plate(x - 0.004, (low, top + 0.05), (high, top + 0.22), DIAL))
    for k in range(7):
        left = -0.15 + 0.045 * k
        pieces.append(_plate(x - 0.004, (left, top + 0.285), (left + 0.02, top + 0.30), (190, 150, 70)))
    return pieces


def trim(lid: Canopy, deck_x_m: float, eye_z_m: float) -> list[Surf]:
    """Along each wall: canopy seal, latches, screws, a pocket, a jettison handle, console switches."""
    front, back = deck_x_m - 0.04, lid.crown[-1, 0] + 0.5
    pieces = []
    for side in (-1.0, 1.0):
        for x in np.arange(front, back, -0.085):
            pieces.append(_stud(lid, x, side, 0.052, 0.0065, (132, 134, 132)))
        for x in np.arange(front - 0.13, back, -0.42):
            pieces.append(_block(lid, x, side, (0.020, 0.006, 0.010), 0.036, (92, 94, 92)))
        for k, x in enumerate(np.arange(front - 0.15, front - 0.80, -0.055)):
            y = side * 0.70 * float(lid.width(np.array(x)))
            shade: Colour = (170, 64, 48) if k == 3 else (206, 204, 196) if k % 4 == 0 else (46, 48, 50)
            pieces.append(box((x - 0.012, y - 0.012, eye_z_m + 0.495), (x + 0.012, y + 0.012, eye_z_m + 0.535), shade))
        x = front - 0.46
        pieces.append(_block(lid, x, side, (0.17, 0.012, 0.11), 0.17, (70, 74, 70)))
    handle = front - 0.20
    for k in range(6):
        colour: Colour = (232, 190, 40) if k % 2 == 0 else (26, 26, 28)
        pieces.append(_block(lid, handle - 0.022 * k, -1.0, (0.011, 0.016, 0.013), 0.10, colour))
    return pieces


def _block(
    lid: Canopy, x: float, side: float, half_m: tuple[float, float, float], below_m: float, colour: Colour
) -> Surf:
    """A box against the wall, its middle so far below the rail."""
    reach = float(np.clip((below_m - 0.05) / 0.45, 0.0, 1.0))
    width = float(lid.width(np.array(x)))
    y = side * (width - 0.046 - reach * 0.10 * width)
    z = float(lid.sill_z(np.array(x))) + below_m
    a, b, c = half_m
    return box((x - a, y - b, z - c), (x + a, y + b, z + c), colour)


def _stud(lid: Canopy, x: float, side: float, below_m: float, radius: float, colour: Colour) -> Surf:
    """A flat six-sided screw head on the ledge under the rail."""
    width = float(lid.width(np.array(x)))
    centre = np.array([x, side * (width - 0.048), float(lid.sill_z(np.array(x))) + below_m - 0.003])
    turn = np.arange(6) * np.pi / 3
    tilt = np.array([0.0, side * -0.55, -0.84])
    one = np.array([1.0, 0.0, 0.0])
    two = np.cross(tilt, one)
    rim = centre + radius * (np.cos(turn)[:, None] * one + np.sin(turn)[:, None] * two)
    fan = np.stack([np.full(6, 6), np.arange(6), np.roll(np.arange(6), -1)], -1)
    return surface(np.concatenate([rim, centre[None]]), fan, colour)


def _plate(x: float, low: tuple[float, float], high: tuple[float, float], colour: Colour) -> Surf:
    """A rectangle in the plane of constant x, faces aft."""
    (y0, z0), (y1, z1) = low, high
    points = np.array([[x, y0, z0], [x, y1, z0], [x, y1, z1], [x, y0, z1]])
    return surface(points, np.array([[0, 1, 2], [0, 2, 3]])[:, ::-1], colour)


def _dial(x: float, y: float, z: float, radius: float, marks: int) -> list[Surf]:
    """A round instrument: bezel, face, marks round its edge."""
    pieces = []
    for part, shift, colour in ((1.0, 0.0, (84, 86, 86)), (0.88, -0.002, DIAL)):
        turn = np.linspace(0.0, 2 * np.pi, 20, endpoint=False)
        rim = np.stack([np.full(20, x + shift), y + part * radius * np.cos(turn), z + part * radius * np.sin(turn)], -1)
        k = np.arange(20)
        fan = np.stack([np.full(20, 20), np.roll(k, -1), k], -1)
        pieces.append(surface(np.concatenate([rim, [[x + shift, y, z]]]), fan, colour))
    for angle in np.arange(marks) * 2 * np.pi / marks:
        out, across = np.array([np.cos(angle), np.sin(angle)]), np.array([-np.sin(angle), np.cos(angle)]) * 0.0016
        corners = [out * radius * 0.66 - across, out * radius * 0.82 - across, out * radius * 0.82 + across,
                   out * radius * 0.66 + across]  # fmt: skip
        points = np.array([[x - 0.004, y + c[0], z + c[1]] for c in corners])
        pieces.append(surface(points, np.array([[0, 2, 1], [0, 3, 2]]), MARK))
    return pieces


def body_of_pilot(eye_m: Array, suit: Colour) -> Surf:
    """Thighs, knees and arms below the eye, at true size."""
    thigh = [(0.52, 0.15, 0.62, 0.03), (0.48, 0.15, 0.62, 0.07), (0.35, 0.145, 0.64, 0.085), (0.05, 0.12, 0.72, 0.095),
             (-0.05, 0.11, 0.74, 0.05)]  # fmt: skip
    right = [(0.36, 0.03, 0.50, 0.03), (0.30, 0.06, 0.50, 0.042), (0.12, 0.20, 0.52, 0.05), (-0.08, 0.24, 0.42, 0.055)]
    left = [(0.36, -0.27, 0.5, 0.03), (0.28, -0.27, 0.51, 0.04), (0.1, -0.27, 0.5, 0.05), (-0.08, -0.24, 0.42, 0.055)]
    pieces = [spindle(arm, suit, 12) for arm in (right, left)]
    for side in (-1.0, 1.0):
        pieces.append(spindle([(x, side * y, z, r) for x, y, z, r in thigh], suit, 14))
        pieces.append(ellipsoid((0.47, side * 0.15, 0.62), (0.08, 0.075, 0.075), suit, 6, 14))
    pieces += [ellipsoid((0.385, y, 0.475), (0.055, 0.042, 0.05), GLOVE, 8, 14) for y in (0.012, -0.27)]
    return moved(merge(pieces), shift=eye_m)


def stick_and_throttle(eye_m: Array) -> Surf:
    """The stick between the knees and the throttle on the left."""
    stick = merge([
        box((0.375, -0.014, 0.46), (0.405, 0.016, 0.85), (30, 31, 33), lean=0.1),
        ellipsoid((0.40, 0.0, 0.41), (0.026, 0.024, 0.05), (26, 27, 29), 6, 10),
    ])  # fmt: skip
    throttle = ellipsoid((0.42, -0.27, 0.46), (0.05, 0.022, 0.03), (26, 27, 29), 5, 10)
    return moved(merge([stick, throttle]), shift=eye_m)
