"""An invented aircraft flown in JSBSim, an independent simulator (LGPL, used by the tests alone).

JSBSim was one of the tools compared in NASA's six-degree-of-freedom check cases (Jackson et al., NTRS
20150006038; Murri et al., NASA/TM-2015-218675). Both programs get the same coefficients, so this checks
equations, signs, units, atmosphere and integration, not how real the coefficients are.
JSBSim's own files of aircraft are never touched: it gets a folder of ours with one aircraft and one planet.
"""

from __future__ import annotations

import math
import os
from collections.abc import Callable
from dataclasses import dataclass
from pathlib import Path
from typing import Any

import numpy as np

from render.frames import Array

FT = 0.3048
FT2 = FT * FT
LBF_N = 4.4482216152605
SLUG_FT2 = 1.3558179483314  # kg m2 of one slug ft2; JSBSim's own conversion of kg m2 is 0.009 % off
EARTH_RADIUS_M = 6_356_766.0
G0 = 9.80665


@dataclass(frozen=True, slots=True)
class Shape:
    """What JSBSim is told of an aircraft; lift and drag against angle of attack as a table."""

    mass_kg: float
    wing_area_m2: float
    chord_m: float
    inertia_pitch_kgm2: float
    alpha_rad: Array  # (A,)
    lift: Array  # (A,)
    drag: Array  # (A,)
    cm: tuple[float, float, float, float]  # Cm0, Cm alpha, Cm q, Cm delta


@dataclass(frozen=True, slots=True)
class Flown:
    """What JSBSim flew: plane of the path, (T,)."""

    time_s: Array
    along_m: Array
    height_m: Array
    speed_mps: Array
    gamma_rad: Array  # unwrapped
    alpha_rad: Array
    pitch_radps: Array


def linear_shape(*, mass_kg: float, wing_area_m2: float, chord_m: float, inertia_pitch_kgm2: float, slope: float,
                 cl_max: float, cd_zero: float, cd_induced: float, cm: tuple[float, float, float, float]) -> Shape:
    """Lift a straight line cut off at cl_max both ways, drag CD0 + k CL^2."""
    corners = [cl_max / slope, -cl_max / slope]
    alpha = np.unique(np.round(np.concatenate([np.linspace(-0.6, 0.6, 2401), corners]), 10))
    lift = np.clip(slope * alpha, -cl_max, cl_max)
    return Shape(mass_kg, wing_area_m2, chord_m, inertia_pitch_kgm2, alpha, lift, cd_zero + cd_induced * lift**2, cm)


def _table(alpha: Array, value: Array) -> str:
    rows = "\n".join(f"{a:.12g} {v:.12g}" for a, v in zip(alpha, value, strict=True))
    return (f'<table><independentVar lookup="row">aero/alpha-rad</independentVar><tableData>\n{rows}\n'
            "</tableData></table>")


def _function(name: str, parts: str) -> str:
    # the day may be warmer than standard at standard pressure: its air is thinner by T/(T + offset)
    return (f'<function name="aero/{name}"><product><property>aero/qbar-psf</property><quotient>'
            "<property>atmosphere/T-R</property><sum><property>atmosphere/T-R</property>"
            "<property>rig/warmer-r</property></sum></quotient>"
            f"<property>metrics/Sw-sqft</property>{parts}</product></function>")


def aircraft_xml(shape: Shape) -> str:
    """The aircraft as JSBSim reads it."""
    cm0, cma, cmq, cmd = shape.cm
    iyy = shape.inertia_pitch_kgm2 / SLUG_FT2
    moment = (
        "<property>metrics/cbarw-ft</property><sum>"
        f"<value>{cm0!r}</value>"
        f"<product><value>{cma!r}</value><property>aero/alpha-rad</property></product>"
        f"<product><value>{cmq!r}</value><property>velocities/q-aero-rad_sec</property>"
        "<property>aero/ci2vel</property></product>"
        f"<product><value>{cmd!r}</value><property>rig/stab-rad</property></product></sum>"
    )
    origin = "<x>0</x><y>0</y><z>0</z>"
    return f"""<?xml version="1.0"?>
<fdm_config name="rig" version="2.0" release="ALPHA">
<metrics>
 <wingarea unit="FT2">{shape.wing_area_m2 / FT2!r}</wingarea><wingspan unit="FT">30</wingspan>
 <chord unit="FT">{shape.chord_m / FT!r}</chord>
 <location name="AERORP" unit="IN">{origin}</location><location name="EYEPOINT" unit="IN">{origin}</location>
 <location name="VRP" unit="IN">{origin}</location>
</metrics>
<mass_balance>
 <ixx unit="SLUG*FT2">{iyy!r}</ixx><iyy unit="SLUG*FT2">{iyy!r}</iyy><izz unit="SLUG*FT2">{iyy!r}</izz>
 <emptywt unit="LBS">{shape.mass_kg * G0 / LBF_N!r}</emptywt>
 <location name="CG" unit="IN">{origin}</location>
</mass_balance>
<ground_reactions/>
<external_reactions>
 <property value="0.0">rig/warmer-r</property><property value="0.0">rig/stab-rad</property>
 <force name="thrust" frame="BODY"><location unit="IN">{origin}</location>
  <direction><x>1</x><y>0</y><z>0</z></direction></force>
</external_reactions>
<aerodynamics>
 <axis name="LIFT">{_function("lift", _table(shape.alpha_rad, shape.lift))}</axis>
 <axis name="DRAG">{_function("drag", _table(shape.alpha_rad, shape.drag))}</axis>
 <axis name="PITCH">{_function("pitch", moment)}</axis>
</aerodynamics>
</fdm_config>
"""


def planet_xml() -> str:
    """A sphere without rotation whose gravity at the surface is g0 exactly."""
    return f"""<?xml version="1.0"?>
<planet name="sphere">
 <equatorial_radius unit="M">{EARTH_RADIUS_M!r}</equatorial_radius>
 <polar_radius unit="M">{EARTH_RADIUS_M!r}</polar_radius>
 <rotation_rate unit="RAD/SEC">0.0</rotation_rate>
 <GM unit="M3/SEC2">{G0 * EARTH_RADIUS_M**2!r}</GM>
 <J2>0.0</J2>
</planet>
"""


def start(folder: Path, shape: Shape) -> Any:
    """JSBSim with our planet and our aircraft loaded, nothing flown yet. Skips the test if it isn't installed."""
    import pytest

    os.environ["JSBSIM_DEBUG"] = "0"
    jsbsim = pytest.importorskip("jsbsim", reason="jsbsim isn't installed (extra 'test')")
    (folder / "aircraft" / "rig").mkdir(parents=True, exist_ok=True)
    (folder / "aircraft" / "rig" / "rig.xml").write_text(aircraft_xml(shape), encoding="utf-8")
    (folder / "sphere.xml").write_text(planet_xml(), encoding="utf-8")
    fdm = jsbsim.FGFDMExec(str(folder))
    fdm.set_debug_level(0)
    assert fdm.load_planet(str(folder / "sphere.xml"), False)  # before the model
    assert fdm.load_model("rig")
    return fdm


def fly(folder: Path, shape: Shape, *, speed_mps: float, gamma_rad: float, height_m: float, alpha_rad: float,
        end_s: float, stab_of: Callable[[float], float], thrust_of: Callable[[float, float, float], float],
        warmer_k: float = 0.0, rate_hz: int = 600, every: int = 30) -> Flown:
    """Fly northward in one plane; every ``every``-th step is kept.

    height_m: above sea level, geometric; stab_of(time) rad; thrust_of(time, density kg/m3, airspeed m/s) N,
    along the body's x axis. Both are held over a step at their value in its middle (the density at its start).
    """
    fdm = start(folder, shape)
    theta = gamma_rad + alpha_rad
    first = {
        "ic/lat-gc-deg": 0.0, "ic/long-gc-deg": 0.0, "ic/h-sl-ft": height_m / FT, "ic/terrain-elevation-ft": -90e3,
        "ic/phi-rad": 0.0, "ic/theta-rad": theta, "ic/psi-true-rad": 0.0,
        "ic/u-fps": speed_mps * math.cos(alpha_rad) / FT, "ic/v-fps": 0.0,
        "ic/w-fps": speed_mps * math.sin(alpha_rad) / FT,
        "ic/p-rad_sec": 0.0, "ic/q-rad_sec": 0.0, "ic/r-rad_sec": 0.0,
    }
    for name, value in first.items():
        fdm[name] = value
    fdm["rig/warmer-r"] = warmer_k * 1.8
    fdm["rig/stab-rad"] = stab_of(0.0)
    fdm.set_dt(1.0 / rate_hz)
    assert fdm.run_ic()
    rows: list[tuple[float, ...]] = []

    def note(t: float) -> None:
        rows.append((
            t, fdm["position/lat-gc-rad"] * EARTH_RADIUS_M, fdm["position/h-sl-meters"], fdm["velocities/vt-fps"] * FT,
            fdm["velocities/v-north-fps"], -fdm["velocities/v-down-fps"], fdm["aero/alpha-rad"],
            fdm["velocities/q-rad_sec"],
        ))

    note(0.0)
    slug_ft3 = LBF_N / FT * (1.0 / FT) / FT2  # kg/m3 of one slug/ft3
    for i in range(round(end_s * rate_hz)):
        mid = (i + 0.5) / rate_hz
        warmth = fdm["atmosphere/T-R"] / (fdm["atmosphere/T-R"] + warmer_k * 1.8)
        density = fdm["atmosphere/rho-slugs_ft3"] * slug_ft3 * warmth
        fdm["rig/stab-rad"] = stab_of(mid)
        fdm["external_reactions/thrust/magnitude"] = thrust_of(mid, density, fdm["velocities/vt-fps"] * FT) / LBF_N
        assert fdm.run()
        if (i + 1) % every == 0:
            note((i + 1) / rate_hz)
    t, along, height, speed, north, up, alpha, pitch = np.array(rows).T
    return Flown(t, along, height, speed, np.unwrap(np.arctan2(up, north)), alpha, pitch)
