"""The frozen type of an airframe: what its YAML says, in SI units and radians."""

from __future__ import annotations

from dataclasses import dataclass

from scenes.model import quantity


@dataclass(frozen=True, slots=True, kw_only=True)
class Airframe:
    """Mass, geometry, coefficients, limits, thrust and control path of one aircraft.

    Angles of attack are measured from the zero-lift line unless ``alpha_zero_rad`` says otherwise.
    Stabilator: positive trailing edge down (nose down), so a pull is negative.
    """

    name: str
    title: str = quantity("text", "what it is")
    shape: str = quantity("word", "which shape is drawn", choices=("jet", "turboprop", "piston"))
    invented: str = quantity("text", "where the coefficients come from")

    mass_kg: float = quantity("mass", "mass", 200.0, 60e3)
    wing_area_m2: float = quantity("area", "wing reference area", 2.0, 200.0)
    wing_span_m: float = quantity("length", "wing span", 3.0, 60.0)
    chord_m: float = quantity("length", "mean aerodynamic chord", 0.3, 10.0)
    inertia_pitch_kgm2: float = quantity("inertia", "moment of inertia in pitch", 50.0, 1e7)

    lift_slope: float = quantity("number", "lift coefficient per radian", 1.0, 8.0)
    alpha_zero_rad: float = quantity("angle", "angle of attack of zero lift", -0.2, 0.2, default=0.0)
    cl_buffet: float = quantity("number", "lift coefficient where buffet begins (lift linear up to it)", 0.2, 3.0)
    cl_max: float = quantity("number", "greatest lift coefficient", 0.3, 3.5)
    cl_min: float = quantity("number", "least (inverted) lift coefficient", -3.5, -0.1)
    cd_zero: float = quantity("number", "drag coefficient at no lift", 0.002, 0.2)
    cd_induced: float = quantity("number", "induced drag factor k in CD0 + k CL^2", 0.005, 0.5)

    cm_zero: float = quantity("number", "pitching moment coefficient at zero alpha and surface", -0.5, 0.5)
    cm_alpha: float = quantity("number", "pitching moment per radian of alpha", -5.0, -0.01)
    cm_q: float = quantity("number", "pitch damping per q c/(2V)", -60.0, -0.5)
    cm_delta: float = quantity("number", "pitching moment per radian of stabilator", -5.0, -0.05)

    thrust_static_n: float = quantity("force", "static thrust at sea level, all engines", 100.0, 1e6)
    thrust_density_exponent: float = quantity("number", "thrust against density ratio, exponent", 0.0, 1.5)
    thrust_mach_1: float = quantity("number", "thrust change per Mach", -3.0, 3.0, default=0.0)
    thrust_mach_2: float = quantity("number", "thrust change per Mach squared", -3.0, 3.0, default=0.0)
    thrust_speed_mps: float = quantity("speed", "airspeed above which thrust falls as 1/V (propeller); 0 = jet",
                                       0.0, 500.0, default=0.0)
    thrust_idle: float = quantity("number", "idle thrust as a part of full", -0.3, 0.4, default=0.05)
    thrust_stopped: float = quantity("number", "thrust with all engines stopped as a part of full (windmill drag)",
                                     -0.3, 0.0, default=0.0)
    spool_s: float = quantity("time", "time constant of the engine, up and down", 0.02, 10.0)
    engines: int = quantity("count", "number of engines", 1, 4, default=1)

    n_max: float = quantity("load_factor", "greatest load factor", 2.0, 12.0)
    n_min: float = quantity("load_factor", "least load factor", -8.0, 0.0)
    speed_max_mps: float = quantity("speed", "greatest speed (calibrated) the model is valid to", 30.0, 400.0)
    mach_max: float = quantity("number", "greatest Mach number the model is valid to", 0.1, 0.95)

    roll_rate_max_radps: float = quantity("angular_rate", "greatest roll rate", 0.2, 8.0)
    roll_s: float = quantity("time", "time constant of the roll response", 0.05, 3.0, key="roll_lag")

    stab_min_rad: float = quantity("angle", "stabilator travel, nose up (negative)", -0.8, -0.02)
    stab_max_rad: float = quantity("angle", "stabilator travel, nose down", 0.02, 0.8)
    stab_rate_radps: float = quantity("angular_rate", "greatest stabilator rate", 0.05, 5.0)
    stab_lag_s: float = quantity("time", "time constant of the actuator", 0.01, 1.0)
    stab_no_load_rad: float = quantity("angle", "angle the surface trails to with no actuator", -0.5, 0.5, default=0.0)
    stick_travel_m: float = quantity("length", "stick grip travel from neutral to the aft stop", 0.02, 0.5)
    feel_spring_npm: float = quantity("stiffness", "feel spring, force per metre of grip travel", 10.0, 20e3)
    feel_bob_n: float = quantity("force", "bob weight, stick force per g beyond one", 0.0, 200.0)

    eye_forward_m: float = quantity("length", "pilot's eye, forward of the centre of gravity", -10.0, 20.0)
    eye_up_m: float = quantity("length", "pilot's eye, above the centre of gravity", -1.0, 5.0)
    length_m: float = quantity("length", "overall length", 3.0, 60.0)
