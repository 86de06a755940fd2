"""The piston aerobatic two-seater: low square wing, fixed tail-wheel gear with spats, round tail. Invented."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from render.frames import Array
from render.picture.loft import Colour, Surf, merge, rings
from render.picture.paint import Side, cut, divided, faces, line, paint, patch, station
from render.picture.shapes_assemble import Pieces, assemble, hinge_mark, tip_light
from render.picture.shapes_cockpit import Canopy, CockpitDesign, canopy
from render.picture.shapes_parts import Shape, fit
from render.picture.shapes_sections import Body, Panel, body, outline, spindle
from scenes.airframe import Airframe

IVORY: Colour = (238, 234, 224)
VIOLET: Colour = (72, 52, 128)
PEACH: Colour = (246, 168, 96)
LINE: Colour = (190, 186, 178)
DARK: Colour = (26, 26, 28)
METAL: Colour = (150, 148, 144)
FRAME: Colour = (62, 58, 74)
SUIT: Colour = (70, 74, 92)
SEAT: Colour = (60, 48, 44)

LENGTH_M, SPAN_M = 6.6, 8.0
EYE_M = (-0.4, 0.7)
REAR_EYE_M = (-1.22, 0.0, -0.74)
DECK_X_M = 0.12
THRUST_Z_M = -0.04

FUSELAGE: Body = body(
    [  # x, half width, top, bottom, waist, exponent
        (1.78, 0.30, -0.28, 0.21, -0.04, 2.2),
        (1.68, 0.40, -0.38, 0.32, -0.04, 2.4),
        (1.3, 0.475, -0.46, 0.43, -0.04, 2.6),
        (0.8, 0.49, -0.52, 0.50, -0.04, 2.5),
        (0.4, 0.485, -0.59, 0.52, -0.05, 2.4),
        (-0.4, 0.475, -0.765, 0.52, -0.05, 2.4),
        (-1.2, 0.43, -0.785, 0.46, -0.06, 2.3),
        (-1.9, 0.355, -0.74, 0.35, -0.09, 2.2),
        (-2.7, 0.25, -0.60, 0.20, -0.14, 2.1),
        (-3.5, 0.145, -0.47, 0.04, -0.20, 2.0),
        (-4.1, 0.07, -0.38, -0.06, -0.22, 2.0),
        (-4.4, 0.025, -0.31, -0.14, -0.22, 2.0),
    ]
)
WING = Panel(np.array([(0.0, 0.66, 0.40, 1.52, 0.15), (3.93, 0.52, 0.40, 1.04, 0.13), (4.0, 0.44, 0.40, 0.94, 0.11)]))
AILERON = (1.5, 3.78, 0.72)
TAIL = Panel(np.array([(0.0, -3.38, -0.20, 0.98, 0.09), (1.42, -3.62, -0.20, 0.62, 0.08)]))
PIVOT_M = (-3.74, 0.0, -0.20)
FIN = Panel(np.array([(0.2, -2.98, 0.0, 1.42, 0.10), (0.85, -3.42, 0.0, 1.02, 0.09), (1.42, -3.74, 0.0, 0.66, 0.08)]),
            upright=True)  # fmt: skip


def cockpit_canopy() -> Canopy:
    """A long sliding bubble over two seats in line, with a windscreen arch and one bow behind."""
    plan = outline([(0.62, 0.0), (0.55, 0.11), (0.4, 0.22), (0.1, 0.32), (-0.4, 0.378), (-0.9, 0.365), (-1.4, 0.30),
                    (-1.85, 0.20), (-2.1, 0.10), (-2.2, 0.0)])  # fmt: skip
    crown = [(0.62, 0.0), (0.42, -0.80), (0.15, -0.975), (-0.2, -1.065), (-0.6, -1.09), (-1.1, -1.05), (-1.6, -0.95),
             (-1.95, -0.845), (-2.2, 0.0)]  # fmt: skip
    return canopy(FUSELAGE, plan, crown, [(0.20, -0.30, 0.06), (-1.42, 0.0, 0.06)])


def piston_cockpit(airframe: Airframe) -> CockpitDesign:
    """What the front seat has around it; the rear seat flies empty."""
    place = fit(airframe, LENGTH_M, SPAN_M, EYE_M)
    return CockpitDesign(place, cockpit_canopy(), DECK_X_M, (), FRAME, SUIT, SEAT, REAR_EYE_M)


def _flash(p: Array) -> Array:
    """Distance (m) below a line that climbs from the cowl's chin to the tail."""
    result: Array = p[:, 2] - (0.16 + 0.11 * p[:, 0] + 0.05 * np.clip(p[:, 0] - 0.9, 0.0, 2.0))
    return result


def _hull() -> Surf:
    x = np.concatenate([[1.78, 1.72], np.linspace(1.64, -4.1, 32), [-4.28, -4.4]])
    skin = FUSELAGE.loft(x, 36, IVORY)
    _, skin = divided(skin, cockpit_canopy().hole())
    skin = paint(skin, lambda p: -_flash(p), VIOLET)
    skin = line(skin, lambda p: _flash(p) + 0.06, 0.07, PEACH)
    skin = paint(skin, lambda p: 0.92 + 0.5 * p[:, 2] - p[:, 0], VIOLET)
    skin = line(skin, lambda p: p[:, 0] - 0.90 - 0.5 * p[:, 2], 0.06, PEACH)
    skin = line(skin, station(1.15), 0.014, (94, 74, 150), only=VIOLET)
    for at in (-2.3, -3.2):
        skin = line(skin, station(at), 0.014, LINE, only=IVORY)
    skin = patch(skin, [station(1.55), lambda p: 0.45 - p[:, 0], lambda p: np.abs(p[:, 1]) - 0.20,
                        lambda p: p[:, 2] + 0.3], (44, 42, 52))  # fmt: skip
    # Two cooling inlets in the cowl's face.
    for side in (-1.0, 1.0):
        skin = patch(skin, [_oval(0.24 * side, -0.06, 0.085, 0.06), lambda p: 1.6 - p[:, 0]], DARK)
    return skin


def _oval(y_m: float, z_m: float, half_y_m: float, half_z_m: float) -> Side:
    """Inside an oval in the plane square to the fuselage."""
    return lambda p: (np.hypot((p[:, 1] - y_m) / half_y_m, (p[:, 2] - z_m) / half_z_m) - 1.0) * half_z_m


def _nose() -> Surf:
    z = THRUST_Z_M
    rows = [(2.16, 0, z, 0.01), (2.14, 0, z, 0.06), (2.08, 0, z, 0.125), (1.95, 0, z, 0.185), (1.82, 0, z, 0.215),
            (1.77, 0, z, 0.215)]
    return spindle(rows, PEACH, 20)


def _wing() -> tuple[Surf, Surf]:
    """(right wing, right aileron): sun rays on top, bars underneath, so that up and down differ at a glance."""
    inner, outer, hinge = AILERON
    skin = merge([
        WING.loft([0.25, inner - 0.006], IVORY, hinge=hinge - 0.012),
        WING.loft([inner - 0.006, outer + 0.006], IVORY, hinge=hinge - 0.012, cut_off=True),
        WING.loft([outer + 0.006, 3.9, 3.93, 3.97, 4.0], IVORY, hinge=hinge - 0.012),
    ])  # fmt: skip
    aileron = WING.loft(np.linspace(inner, outer, 5).tolist(), IVORY, start=hinge, points=9)
    painted = [paint(_bars(_rays(s)), lambda p: 3.72 - p[:, 1], PEACH) for s in (skin, aileron)]
    skin = hinge_mark(painted[0], WING, AILERON, (142, 134, 152))
    return merge([skin, tip_light((0.30, 3.955, 0.40))]), painted[1]


def _rays(surf: Surf) -> Surf:
    """Violet rays from the wing root on the upper side."""
    upper = surf.normals[surf.tris].mean(axis=1)[:, 2] < 0.0
    top, rest = faces(surf, upper), faces(surf, ~upper)
    bearing = np.radians([80.0, 85.0, 90.0, 95.0, 101.0, 108.0])
    hub = np.array([0.15, -1.1])
    for angle in bearing:
        normal = np.array([-np.sin(angle), np.cos(angle), 0.0])
        top = cut(top, station(float(normal[:2] @ hub), normal.tolist()))
    centre = top.centroids()
    seen = np.arctan2(centre[:, 1] - hub[1], centre[:, 0] - hub[0])
    hit = np.searchsorted(bearing, seen) % 2 == 1
    return merge([replace(top, colour=np.where(hit[:, None], np.array(VIOLET, np.uint8), top.colour)), rest])


def _bars(surf: Surf) -> Surf:
    """Three violet bars along the chord on the underside."""
    lower = surf.normals[surf.tris].mean(axis=1)[:, 2] > 0.0
    under, rest = faces(surf, lower), faces(surf, ~lower)
    for middle in (1.5, 2.3, 3.1):
        under = line(under, station(middle, (0.0, 1.0, 0.0)), 0.4, VIOLET)
    return merge([under, rest])


def _gear() -> Surf:
    """The right main leg with its spat and wheel."""
    leg = spindle([(0.92, 0.30, 0.40, 0.05, 0.03), (0.90, 0.40, 0.50, 0.06, 0.03), (0.86, 0.70, 0.86, 0.05, 0.026),
                   (0.84, 0.92, 1.10, 0.045, 0.024)], IVORY, 8)  # fmt: skip
    spat = spindle([(1.22, 0.95, 1.14, 0.012), (1.15, 0.95, 1.14, 0.06, 0.075), (0.98, 0.95, 1.13, 0.095, 0.135),
                    (0.78, 0.95, 1.12, 0.095, 0.135), (0.5, 0.95, 1.09, 0.055, 0.07), (0.32, 0.95, 1.06, 0.012)],
                   IVORY, 14)  # fmt: skip
    spat = paint(spat, lambda p: p[:, 2] - 1.14 + 0.25 * (p[:, 0] - 0.8), VIOLET)
    tread = np.linspace(0.0, 2 * np.pi, 15)[:-1]
    rows = [(0.86 + 0.17 * np.cos(a), 0.95, 1.17 + 0.17 * np.sin(a)) for a in tread]
    rim = np.array([[(x, y + w, z) for x, _, z in rows] for y, w in ((0.95, -0.055), (0.95, 0.055))])
    return merge([leg, spat, rings(rim, DARK)])


def _tail() -> tuple[Surf, Surf, Surf]:
    """(fin, tail wheel and spring, right stabilator half)."""
    fin = FIN.loft([0.2, 0.5, 0.85, 1.15, 1.42], IVORY, round_tip_m=0.10)
    fin = paint(fin, lambda p: p[:, 2] + 0.62 - 0.45 * (p[:, 0] + 3.6), VIOLET)
    fin = line(fin, lambda p: p[:, 2] + 0.57 - 0.45 * (p[:, 0] + 3.6), 0.07, PEACH)
    rudder = station(-3.88 + 0.06, (1.0, 0.0, -0.12))
    fin = line(fin, rudder, 0.016, LINE, only=IVORY)
    fin = line(fin, rudder, 0.016, (94, 74, 150), only=VIOLET)
    spring = spindle([(-3.7, 0, 0.02, 0.03, 0.02), (-4.0, 0, 0.16, 0.025, 0.015), (-4.16, 0, 0.26, 0.02, 0.015)],
                     METAL, 8)  # fmt: skip
    wheel = spindle([(-4.09, 0, 0.28, 0.03, 0.02), (-4.12, 0, 0.28, 0.03, 0.06), (-4.18, 0, 0.28, 0.03, 0.075),
                     (-4.24, 0, 0.28, 0.03, 0.06), (-4.27, 0, 0.28, 0.03, 0.02)], DARK, 10)  # fmt: skip
    half = TAIL.loft([0.18, 0.5, 1.0, 1.42], PEACH, round_tip_m=0.06)
    half = line(half, station(0.30, (0.0, 1.0, 0.0)), 0.09, DARK)
    half = paint(half, lambda p: 1.12 - p[:, 1], VIOLET)
    horn = spindle([(-3.3, 1.40, -0.20, 0.006), (-3.37, 1.40, -0.20, 0.024), (-3.6, 1.40, -0.20, 0.036),
                    (-4.0, 1.40, -0.20, 0.03), (-4.3, 1.40, -0.20, 0.008)], IVORY, 10)  # fmt: skip
    horn = line(horn, station(-3.66), 0.10, DARK)
    return fin, merge([spring, wheel]), merge([half, horn])


def _fairing() -> Surf:
    """The right stabilator's root fairing with the neutral mark."""
    shelf = spindle([(-3.15, 0.10, -0.20, 0.02), (-3.3, 0.115, -0.20, 0.06, 0.06), (-3.7, 0.115, -0.20, 0.055, 0.085),
                     (-4.2, 0.09, -0.20, 0.045, 0.06), (-4.38, 0.06, -0.20, 0.01)], IVORY, 12)  # fmt: skip
    return line(shelf, station(-0.20, (0.0, 0.0, 1.0)), 0.028, DARK)


def build_piston(airframe: Airframe) -> Shape:
    """The piston two-seater's parts at the airframe's size."""
    wing, aileron = _wing()
    fin, tail_wheel, half = _tail()
    pieces = Pieces(
        middle=[_hull(), _nose(), fin, tail_wheel],
        right=[wing, _gear(), _fairing()],
        stabilator_right=half,
        pivot_m=PIVOT_M,
        aileron_right=aileron,
        wing=WING,
        aileron=AILERON,
        helmets=((IVORY, VIOLET),),
        smoke_m=(0.7, 0.0, 0.54),
        propeller=(1.88, THRUST_Z_M, 0.95),
    )
    return assemble("piston", piston_cockpit(airframe), pieces)
