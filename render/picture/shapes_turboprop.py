"""The turboprop trainer: long nose, chin intake, cranked low wing, stabilator on top of the fin. Invented."""

from __future__ import annotations

import numpy as np

from render.frames import Array
from render.picture.loft import Colour, Surf, merge
from render.picture.paint import Side, divided, line, paint, patch, station
from render.picture.shapes_assemble import Pieces, assemble, hinge_mark, tip_light
from render.picture.shapes_cockpit import Canopy, CockpitDesign, canopy
from render.picture.shapes_parts import Shape, fit
from render.picture.shapes_sections import Body, Panel, body, outline, spindle
from scenes.airframe import Airframe

SAND: Colour = (226, 214, 182)
SLATE: Colour = (64, 78, 108)
CORAL: Colour = (226, 92, 62)
LINE: Colour = (188, 178, 150)
DARK: Colour = (24, 25, 28)
METAL: Colour = (120, 112, 104)
FRAME: Colour = (54, 60, 70)
SUIT: Colour = (92, 86, 62)
SEAT: Colour = (50, 50, 52)

LENGTH_M, SPAN_M = 9.9, 10.3
EYE_M = (1.0, 0.9)
REAR_EYE_M = (-0.42, 0.0, -1.07)
DECK_X_M = 1.50
COAMINGS = ((0.10, -0.96, 0.32),)
THRUST_Z_M = -0.10

FUSELAGE: Body = body(
    [  # x, half width, top, bottom, waist, exponent
        (3.84, 0.30, -0.41, 0.20, -0.10, 2.0),
        (3.6, 0.36, -0.47, 0.29, -0.10, 2.1),
        (3.0, 0.43, -0.57, 0.40, -0.08, 2.3),
        (2.3, 0.485, -0.68, 0.48, -0.06, 2.4),
        (1.7, 0.515, -0.85, 0.53, -0.05, 2.4),
        (1.0, 0.53, -1.04, 0.56, -0.05, 2.4),
        (0.3, 0.54, -1.09, 0.58, -0.05, 2.4),
        (-0.5, 0.535, -1.11, 0.57, -0.05, 2.4),
        (-1.3, 0.50, -1.08, 0.49, -0.06, 2.3),
        (-2.0, 0.43, -0.99, 0.34, -0.10, 2.2),
        (-3.0, 0.30, -0.83, 0.08, -0.20, 2.1),
        (-4.0, 0.18, -0.70, -0.13, -0.32, 2.0),
        (-4.8, 0.11, -0.61, -0.29, -0.42, 2.0),
        (-5.35, 0.06, -0.545, -0.39, -0.46, 2.0),
        (-5.55, 0.02, -0.50, -0.44, -0.47, 2.0),
    ]
)
WING = Panel(
    np.array(
        [(0.0, 0.68, 0.40, 2.06, 0.15), (1.5, 0.52, 0.42, 1.80, 0.145), (5.05, 0.12, 0.24, 1.10, 0.12),
         (5.15, 0.04, 0.235, 0.98, 0.10)]
    ),
    camber=0.015,
    twist_rad=0.035,
)  # fmt: skip
AILERON = (3.0, 4.85, 0.74)
TAIL = Panel(np.array([(0.0, -4.33, -2.38, 1.12, 0.085), (1.95, -4.62, -2.42, 0.68, 0.075)]))
PIVOT_M = (-4.72, 0.0, -2.38)
FIN = Panel(np.array([(0.4, -3.15, 0.0, 2.2, 0.09), (2.34, -4.32, 0.0, 1.08, 0.085)]), upright=True)


def cockpit_canopy() -> Canopy:
    """A bubble over two stepped seats; windscreen arch, frame between the seats."""
    plan = outline([(2.22, 0.0), (2.14, 0.12), (1.96, 0.24), (1.55, 0.365), (1.0, 0.425), (0.3, 0.445), (-0.5, 0.44),
                    (-1.2, 0.37), (-1.65, 0.24), (-1.88, 0.12), (-1.98, 0.0)])  # fmt: skip
    crown = [(2.22, 0.0), (1.95, -0.92), (1.6, -1.13), (1.25, -1.265), (0.9, -1.335), (0.4, -1.385), (-0.2, -1.42),
             (-0.8, -1.395), (-1.3, -1.30), (-1.7, -1.16), (-1.98, 0.0)]  # fmt: skip
    return canopy(FUSELAGE, plan, crown, [(1.74, -0.34, 0.07), (0.32, -0.10, 0.075)])


def turboprop_cockpit(airframe: Airframe) -> CockpitDesign:
    """What the front seat has around it."""
    place = fit(airframe, LENGTH_M, SPAN_M, EYE_M)
    return CockpitDesign(place, cockpit_canopy(), DECK_X_M, COAMINGS, FRAME, SUIT, SEAT, REAR_EYE_M)


def _spine(p: Array) -> Array:
    """Distance (m) above the lower edge of the slate back, which falls towards the tail and sweeps down at the nose."""
    x = p[:, 0]
    edge = -0.30 - 0.05 * np.clip(-x - 1.0, 0.0, 5.0) + 0.16 * np.clip(x - 2.2, 0.0, 2.0)
    result: Array = edge - p[:, 2]
    return result


def _hull() -> Surf:
    x = np.concatenate([[3.84, 3.74], np.linspace(3.6, -5.0, 34), [-5.2, -5.35, -5.48, -5.55]])
    skin = FUSELAGE.loft(x, 36, SAND)
    _, skin = divided(skin, cockpit_canopy().hole())
    skin = paint(skin, lambda p: -_spine(p), SLATE)
    skin = line(skin, lambda p: _spine(p) + 0.075, 0.085, CORAL)
    skin = line(skin, lambda p: _spine(p) + 0.165, 0.03, SLATE, only=SAND)
    for at in (2.45, 3.1, -1.6, -3.0):
        skin = line(skin, station(at), 0.02, LINE, only=SAND)
    skin = patch(skin, [station(3.4), lambda p: 1.6 - p[:, 0], lambda p: np.abs(p[:, 1]) - 0.22,
                        lambda p: p[:, 2] + 0.2], (40, 44, 50))  # fmt: skip
    return skin


def _nose() -> Surf:
    """Spinner and chin intake."""
    spinner = spindle([(4.35, 0, THRUST_Z_M, 0.012), (4.3, 0, THRUST_Z_M, 0.075), (4.18, 0, THRUST_Z_M, 0.155),
                       (4.02, 0, THRUST_Z_M, 0.225), (3.88, 0, THRUST_Z_M, 0.265), (3.83, 0, THRUST_Z_M, 0.265)],
                      CORAL, 20)  # fmt: skip
    rows = [(3.45, 0.26, 0.14, 0.045), (3.66, 0.26, 0.15, 0.055), (3.68, 0.26, 0.168, 0.072),
            (3.62, 0.262, 0.185, 0.09), (3.2, 0.30, 0.22, 0.13), (2.4, 0.34, 0.24, 0.15),
            (1.5, 0.38, 0.18, 0.14)]  # fmt: skip
    chin = spindle([(x, 0.0, z, w, h) for x, z, w, h in rows], SAND, 18)
    return merge([spinner, chin, _mouth()])


def _mouth() -> Surf:
    """The intake's dark inside."""
    return spindle([(3.688, 0, 0.26, 0.15, 0.055), (3.6, 0, 0.26, 0.14, 0.05)], DARK, 18)


def _exhaust() -> Surf:
    """The right exhaust stub."""
    rows = [(2.95, 0.38, -0.20, 0.05, 0.05), (2.85, 0.47, -0.20, 0.075, 0.085), (2.65, 0.53, -0.19, 0.085, 0.095),
            (2.42, 0.575, -0.18, 0.082, 0.092), (2.40, 0.578, -0.18, 0.066, 0.076), (2.5, 0.56, -0.18, 0.06, 0.07)]
    return spindle(rows, METAL, 14)


def _tip_edge(inset_m: float) -> Side:
    """Side outboard of a raked line."""
    return lambda p: (5.15 - inset_m) + 0.18 * (p[:, 0] + 0.4) - p[:, 1]


def _wing() -> tuple[Surf, Surf]:
    """(right wing, right aileron)."""
    inner, outer, hinge = AILERON
    skin = merge([
        WING.loft([0.3, 1.5, inner - 0.008], SAND, hinge=hinge - 0.012),
        WING.loft([inner - 0.008, outer + 0.008], SAND, hinge=hinge - 0.012, cut_off=True),
        WING.loft([outer + 0.008, 5.0, 5.05, 5.11, 5.15], SAND, hinge=hinge - 0.012),
    ])  # fmt: skip
    aileron = WING.loft(np.linspace(inner, outer, 4).tolist(), SAND, start=hinge, points=9)
    painted = []
    for surf in (skin, aileron):
        surf = paint(surf, _tip_edge(1.35), SLATE)
        surf = paint(surf, _tip_edge(1.05), CORAL)
        surf = paint(surf, _tip_edge(0.45), SLATE)
        painted.append(surf)
    skin = line(painted[0], lambda p: p[:, 0] + 0.92 + 0.02 * p[:, 1], 0.02, LINE, only=SAND)
    skin = hinge_mark(skin, WING, AILERON, LINE)
    return merge([skin, tip_light((-0.02, 5.095, 0.235))]), painted[1]


def _tail() -> tuple[Surf, Surf, Surf]:
    """(fin, bullet fairing on top with the neutral mark, right stabilator half)."""
    fin = FIN.loft([0.4, 0.9, 1.4, 1.9, 2.34], SAND)
    fin = paint(fin, lambda p: p[:, 2] + 1.15 + 0.35 * (p[:, 0] + 4.2), SLATE)
    fin = line(fin, lambda p: p[:, 2] + 1.02 + 0.35 * (p[:, 0] + 4.2), 0.12, CORAL)
    fin = paint(fin, lambda p: p[:, 2] + 2.02, SAND)
    rudder = station(-4.68 + 0.12, (1.0, 0.0, -0.2))
    fin = line(fin, rudder, 0.02, LINE, only=SAND)
    fin = line(fin, rudder, 0.02, (84, 98, 128), only=SLATE)
    bullet = spindle([(-3.98, 0, -2.38, 0.012), (-4.06, 0, -2.38, 0.05), (-4.3, 0, -2.38, 0.09), (-4.9, 0, -2.38, 0.10),
                      (-5.35, 0, -2.38, 0.07), (-5.54, 0, -2.38, 0.015)], SAND, 14)  # fmt: skip
    bullet = line(bullet, station(-2.38, (0.0, 0.0, 1.0)), 0.034, DARK)
    half = TAIL.loft([0.10, 0.5, 1.2, 1.95], CORAL, round_tip_m=0.06)
    half = line(half, station(0.19, (0.0, 1.0, 0.0)), 0.10, DARK)
    half = paint(half, lambda p: 1.6 - p[:, 1], SAND)
    horn = spindle([(-4.34, 1.93, -2.42, 0.006), (-4.42, 1.93, -2.42, 0.03), (-4.65, 1.93, -2.42, 0.042),
                    (-5.1, 1.93, -2.42, 0.036), (-5.42, 1.93, -2.42, 0.008)], SAND, 10)  # fmt: skip
    horn = line(horn, station(-4.72), 0.12, DARK)
    return fin, bullet, merge([half, horn])


def build_turboprop(airframe: Airframe) -> Shape:
    """The turboprop trainer's parts at the airframe's size."""
    wing, aileron = _wing()
    fin, bullet, half = _tail()
    pieces = Pieces(
        middle=[_hull(), _nose(), fin, bullet],
        right=[_exhaust(), wing],
        stabilator_right=half,
        pivot_m=PIVOT_M,
        aileron_right=aileron,
        wing=WING,
        aileron=AILERON,
        helmets=((SAND, CORAL), (SLATE, SAND)),
        smoke_m=(1.6, 0.0, 0.58),
        propeller=(3.96, THRUST_Z_M, 1.18),
    )
    return assemble("turboprop", turboprop_cockpit(airframe), pieces)
