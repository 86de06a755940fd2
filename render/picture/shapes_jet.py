"""The light jet trainer: two engines in side nacelles, straight trailing edge, wing tip pods, one fin. Invented."""

from __future__ import annotations

from dataclasses import replace

import numpy as np

from render.frames import Array
from render.picture.loft import Colour, Surf, merge, rings
from render.picture.paint import Side, cut, divided, line, paint, patch, station
from render.picture.shapes_assemble import Pieces, assemble, hinge_mark, tip_light
from render.picture.shapes_cockpit import Canopy, CockpitDesign, canopy
from render.picture.shapes_parts import Shape, fit
from render.picture.shapes_sections import Body, Panel, body, outline, spindle
from scenes.airframe import Airframe

WHITE: Colour = (232, 229, 218)
TEAL: Colour = (16, 58, 66)
GOLD: Colour = (226, 160, 30)
LINE: Colour = (186, 184, 174)
DARK: Colour = (22, 23, 25)
METAL: Colour = (112, 106, 98)
FRAME: Colour = (58, 65, 70)
SUIT: Colour = (66, 78, 62)
SEAT: Colour = (54, 50, 44)

LENGTH_M, SPAN_M = 12.0, 9.4
EYE_M = (2.6, 0.9)
REAR_EYE_M = (1.22, 0.0, -1.13)
DECK_X_M = 3.10
#: Rear instrument hood: (aft edge x, top z, length).
COAMINGS = ((1.72, -1.0, 0.35),)

FUSELAGE: Body = body(
    [  # x, half width, top, bottom, waist, exponent
        (6.35, 0.012, -0.072, -0.048, -0.06, 2.0),
        (6.22, 0.085, -0.15, 0.025, -0.06, 2.0),
        (5.9, 0.18, -0.27, 0.13, -0.06, 2.05),
        (5.3, 0.305, -0.43, 0.26, -0.06, 2.1),
        (4.6, 0.41, -0.60, 0.37, -0.06, 2.2),
        (3.8, 0.485, -0.79, 0.47, -0.05, 2.35),
        (3.2, 0.52, -0.93, 0.52, -0.05, 2.4),
        (2.6, 0.54, -1.045, 0.55, -0.05, 2.4),
        (1.9, 0.56, -1.09, 0.57, -0.05, 2.4),
        (1.2, 0.57, -1.13, 0.58, -0.05, 2.4),
        (0.4, 0.57, -1.17, 0.57, -0.05, 2.35),
        (-0.4, 0.55, -1.16, 0.54, -0.05, 2.3),
        (-1.5, 0.51, -1.03, 0.49, -0.05, 2.2),
        (-2.8, 0.45, -0.86, 0.40, -0.05, 2.2),
        (-3.8, 0.36, -0.71, 0.28, -0.08, 2.1),
        (-4.6, 0.25, -0.56, 0.13, -0.14, 2.0),
        (-5.2, 0.14, -0.43, -0.06, -0.24, 2.0),
        (-5.58, 0.07, -0.34, -0.19, -0.265, 2.0),
        (-5.65, 0.03, -0.295, -0.235, -0.265, 2.0),
    ]
)
WING = Panel(np.array([(0.0, 1.62, 0.16, 2.66, 0.12), (4.56, 0.10, -0.02, 1.02, 0.095)]), camber=0.012, twist_rad=0.03)
AILERON = (2.75, 4.35, 0.74)
TAIL = Panel(np.array([(0.35, -4.02, -0.05, 1.42, 0.085), (2.2, -4.98, 0.08, 0.62, 0.07)]))
TAIL_HINGE_X_M = -4.72
FIN = Panel(np.array([(0.45, -2.35, 0.0, 2.75, 0.09), (2.5, -4.32, 0.0, 0.98, 0.08)]), upright=True)


def cockpit_canopy() -> Canopy:
    """The long two-seat canopy: windscreen arch, frame between the seats."""
    plan = outline([(3.86, 0.0), (3.78, 0.12), (3.6, 0.24), (3.2, 0.365), (2.6, 0.43), (1.9, 0.45), (1.1, 0.45),
                    (0.4, 0.385), (-0.15, 0.24), (-0.4, 0.12), (-0.5, 0.0)])  # fmt: skip
    crown = [(3.86, 0.0), (3.55, -0.975), (3.2, -1.13), (2.8, -1.245), (2.4, -1.305), (1.9, -1.37), (1.3, -1.455),
             (0.8, -1.47), (0.3, -1.41), (-0.2, -1.27), (-0.5, 0.0)]  # fmt: skip
    return canopy(FUSELAGE, plan, crown, [(3.34, -0.32, 0.07), (1.92, -0.12, 0.075)])


def jet_cockpit(airframe: Airframe) -> CockpitDesign:
    """What the front seat has around it."""
    place = fit(airframe, LENGTH_M, SPAN_M, EYE_M)
    return CockpitDesign(place, cockpit_canopy(), DECK_X_M, COAMINGS, FRAME, SUIT, SEAT, REAR_EYE_M)


def _belly(p: Array) -> Array:
    """Distance (m) below the upper edge of the teal underside: high at the tail, low at the nose."""
    x = p[:, 0]
    edge = 0.16 - 0.012 * (x - 1.0) - 0.05 * np.clip(-x - 1.5, 0.0, 4.0) ** 1.5 + 0.035 * np.clip(x - 3.0, 0, 4) ** 1.2
    result: Array = p[:, 2] - edge
    return result


def _reed(p: Array) -> Array:
    """Distance (m) from the middle of the gold band that follows the underside's edge."""
    result: Array = _belly(p) + 0.075
    return result


def _hull() -> Surf:
    x = np.concatenate([[6.35, 6.3, 6.22, 6.08], np.linspace(5.9, -5.2, 38), [-5.45, -5.58, -5.65]])
    skin = FUSELAGE.loft(x, 36, WHITE)
    _, skin = divided(skin, cockpit_canopy().hole())
    skin = paint(skin, lambda p: -_belly(p), TEAL)
    skin = line(skin, _reed, 0.07, GOLD)
    # Anti-glare panel ahead of the windscreen, and the gold nose.
    glare = (
        lambda p: np.abs(p[:, 1]) - 0.10 - 0.05 * (5.9 - p[:, 0]),
        lambda p: 3.4 - p[:, 0],
        lambda p: p[:, 2] + 0.15,
    )
    skin = patch(skin, glare, (46, 50, 50))
    skin = paint(skin, lambda p: 5.9 - p[:, 0] + 0.25 * p[:, 2], GOLD)
    for at in (4.9, 0.15, -2.1):
        skin = line(skin, station(at), 0.02, LINE, only=WHITE)
    return skin


def _nacelle() -> Surf:
    """The right nacelle from its intake lip to its nozzle, with ducts."""
    rows = [  # x, y, z, half width, half height
        (1.05, 0.70, -0.15, 0.15, 0.21), (1.6, 0.745, -0.17, 0.15, 0.235), (1.87, 0.755, -0.18, 0.155, 0.25),
        (1.90, 0.755, -0.18, 0.168, 0.265), (1.85, 0.755, -0.18, 0.182, 0.28), (1.5, 0.75, -0.17, 0.21, 0.315),
        (0.6, 0.725, -0.13, 0.26, 0.37), (-0.8, 0.67, -0.10, 0.31, 0.40), (-1.8, 0.60, -0.09, 0.32, 0.40),
        (-2.8, 0.52, -0.08, 0.315, 0.385), (-3.6, 0.46, -0.08, 0.295, 0.355), (-4.3, 0.42, -0.09, 0.265, 0.30),
        (-4.85, 0.40, -0.11, 0.235, 0.245), (-4.87, 0.40, -0.11, 0.205, 0.215), (-4.5, 0.40, -0.11, 0.19, 0.20),
    ]  # fmt: skip
    table = np.array(rows)
    turn = np.linspace(0.0, 2 * np.pi, 24, endpoint=False)
    full = np.where(table[:, :1] > -4.0, 2.6, 2.1)
    y = table[:, 1:2] + table[:, 3:4] * np.sign(np.cos(turn)) * np.abs(np.cos(turn)) ** (2 / full)
    z = table[:, 2:3] + table[:, 4:5] * np.sign(np.sin(turn)) * np.abs(np.sin(turn)) ** (2 / full)
    # The intake is raked: its upper lip leads.
    lead = np.clip((table[:, :1] - 0.8) / 1.0, 0, 1) * -0.35 * (z - table[:, 2:3])
    x = np.broadcast_to(table[:, :1], y.shape) + lead
    bands = [DARK, DARK, DARK, METAL, *[WHITE] * 7, METAL, METAL, DARK]
    skin = rings(np.stack([x, y, z], -1), bands)
    skin = paint(skin, lambda p: -_belly(p), TEAL, only=WHITE)
    skin = line(skin, _reed, 0.07, GOLD, only=WHITE)
    for at in (-0.9, -3.9):
        skin = line(skin, station(at), 0.02, LINE, only=WHITE)
    return skin


def _wing() -> tuple[Surf, Surf]:
    """(right wing with tip pod, right aileron)."""
    inner, outer, hinge = AILERON
    spans = [
        WING.loft([0.3, 1.6, inner - 0.008], WHITE, hinge=hinge - 0.012),
        WING.loft([inner - 0.008, outer + 0.008], WHITE, hinge=hinge - 0.012, cut_off=True),
        WING.loft([outer + 0.008, 4.56], WHITE, hinge=hinge - 0.012),
    ]
    skin = merge(spans)
    skin = paint(skin, lambda p: 3.55 + 0.35 * (p[:, 0] + 0.6) - p[:, 1], GOLD)
    skin = paint(skin, lambda p: 3.9 + 0.35 * (p[:, 0] + 0.6) - p[:, 1], TEAL)
    skin = _chevron(skin)
    leading = _leading_edge(0.11)
    skin = paint(skin, leading, METAL)
    aileron = WING.loft(np.linspace(inner, outer, 4).tolist(), WHITE, start=hinge, points=9)
    aileron = paint(aileron, lambda p: 3.55 + 0.35 * (p[:, 0] + 0.6) - p[:, 1], GOLD)
    aileron = paint(aileron, lambda p: 3.9 + 0.35 * (p[:, 0] + 0.6) - p[:, 1], TEAL)
    pod = spindle([(0.78, 4.58, -0.02, 0.006), (0.74, 4.58, -0.02, 0.03), (0.6, 4.58, -0.02, 0.062),
                   (0.35, 4.58, -0.02, 0.098), (0.0, 4.58, -0.02, 0.118), (-0.5, 4.58, -0.02, 0.12),
                   (-0.95, 4.58, -0.02, 0.095), (-1.3, 4.58, -0.02, 0.045), (-1.42, 4.58, -0.02, 0.008)],
                  TEAL, 14)  # fmt: skip
    pod = paint(pod, lambda p: 0.3 - p[:, 0], GOLD)
    skin = hinge_mark(skin, WING, AILERON, LINE)
    return merge([skin, pod, tip_light((0.15, 4.655, -0.02))]), aileron


def _leading_edge(width_m: float) -> Side:
    def side(p: Array) -> Array:
        x_le, _, _, _ = np.moveaxis(WING.at(p[:, 1]), -1, 0)
        return x_le - p[:, 0] - width_m

    return side


def _chevron(surf: Surf) -> Surf:
    """A teal chevron on the underside, for the pilot who looks up from below."""
    for edge in (-0.13, 0.13):
        surf = cut(surf, station(0.55 + edge, (1.0, 0.45, 0.0)))
    hit = np.abs(surf.centroids() @ np.array([1.0, 0.45, 0.0]) - 0.55) < 0.13
    hit &= surf.normals[surf.tris].mean(axis=1)[:, 2] > 0.2
    hit &= surf.centroids()[:, 1] < 3.4
    return replace(surf, colour=np.where(hit[:, None], np.array(TEAL, np.uint8), surf.colour))


def _tail() -> tuple[Surf, Surf]:
    """(fin, right stabilator half)."""
    fin = FIN.loft(np.linspace(0.45, 2.5, 6).tolist(), WHITE, round_tip_m=0.12)
    rudder = station(-4.55 + 0.22 * 0.6, (1.0, 0.0, -0.22))
    fin = paint(fin, lambda p: p[:, 2] + 1.35 + 0.30 * (p[:, 0] + 4.0), TEAL)
    fin = line(fin, lambda p: p[:, 2] + 1.20 + 0.30 * (p[:, 0] + 4.0), 0.10, GOLD)
    fin = line(fin, lambda p: p[:, 2] + 1.02 + 0.30 * (p[:, 0] + 4.0), 0.04, GOLD)
    fin = line(fin, rudder, 0.022, LINE, only=WHITE)
    fin = line(fin, rudder, 0.022, (34, 80, 88), only=TEAL)
    half = TAIL.loft([0.60, 0.75, 1.2, 1.7, 2.2], GOLD, round_tip_m=0.07)
    half = paint(half, lambda p: p[:, 1] - 0.80, DARK)
    half = paint(half, lambda p: p[:, 1] - 0.70, GOLD)
    half = paint(half, lambda p: 1.85 - p[:, 1], TEAL)
    # The tip's balance horn lies along the fuselage at neutral: seen from abeam its tilt is the deflection.
    horn = spindle([(-4.5, 2.165, 0.08, 0.006), (-4.6, 2.165, 0.08, 0.03), (-4.85, 2.165, 0.08, 0.045),
                    (-5.3, 2.165, 0.08, 0.04), (-5.62, 2.165, 0.08, 0.008)], WHITE, 10)  # fmt: skip
    horn = line(horn, lambda p: p[:, 0] + 4.95, 0.14, DARK)
    return fin, merge([half, horn])


def _root_fairing() -> Surf:
    """The shelf the right stabilator half turns beside, with a dark index line at its neutral."""
    shelf = spindle([(-3.55, 0.42, -0.06, 0.02), (-3.8, 0.46, -0.06, 0.10, 0.09), (-4.2, 0.49, -0.06, 0.11, 0.12),
                     (-5.0, 0.49, -0.06, 0.10, 0.12), (-5.4, 0.46, -0.06, 0.07, 0.08), (-5.6, 0.42, -0.06, 0.02)],
                    WHITE, 14)  # fmt: skip
    return line(shelf, station(-0.06, (0.0, 0.0, 1.0)), 0.036, DARK)


def build_jet(airframe: Airframe) -> Shape:
    """The jet trainer's parts at the airframe's size."""
    wing, aileron = _wing()
    fin, half = _tail()
    pieces = Pieces(
        middle=[_hull(), fin],
        right=[_nacelle(), wing, _root_fairing()],
        stabilator_right=half,
        pivot_m=(TAIL_HINGE_X_M, 0.0, -0.03),
        aileron_right=aileron,
        wing=WING,
        aileron=AILERON,
        helmets=((WHITE, GOLD), (TEAL, WHITE)),
        smoke_m=(-5.15, 0.0, 0.05),
    )
    return assemble("jet", jet_cockpit(airframe), pieces)
