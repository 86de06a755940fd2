"""Planar flights made from closed forms, for the tests of sight: true geometry without the flight room."""

from __future__ import annotations

from collections.abc import Callable, Sequence

import numpy as np

from render.frames import Array, quat_from_euler, quat_rotate
from render.types import Flight
from scenes.airframe import Airframe

G = 9.80665

AIRFRAME = Airframe(
    name="toy", title="toy", shape="jet", invented="all of it", mass_kg=4000.0, wing_area_m2=18.0, wing_span_m=9.0,
    chord_m=2.0, inertia_pitch_kgm2=20e3, lift_slope=5.0, cl_buffet=1.0, cl_max=1.4, cl_min=-0.8, cd_zero=0.02,
    cd_induced=0.08, cm_zero=0.0, cm_alpha=-0.5, cm_q=-10.0, cm_delta=-1.0, thrust_static_n=25e3,
    thrust_density_exponent=0.8, spool_s=2.0, n_max=8.0, n_min=-3.0, speed_max_mps=250.0, mach_max=0.8,
    roll_rate_max_radps=3.0, roll_s=0.2, stab_min_rad=-0.4, stab_max_rad=0.2, stab_rate_radps=1.0, stab_lag_s=0.05,
    stick_travel_m=0.15, feel_spring_npm=1000.0, feel_bob_n=15.0, eye_forward_m=1.5, eye_up_m=0.8, length_m=11.0,
)  # fmt: skip


def flat(north_m: Array, east_m: Array) -> Array:
    """Level ground at the field datum."""
    return np.zeros(np.broadcast_shapes(np.shape(north_m), np.shape(east_m)))


def planar(
    load: Callable[[float], float],
    *,
    speed_mps: float = 130.0,
    gamma0_rad: float = -np.pi / 2,
    height0_m: float = 597.0,
    end_s: float = 9.0,
    step_s: float = 0.01,
    slots: Sequence[tuple[float, float, float]] = ((0.0, 14.0, 0.0), (0.0, -14.0, 0.0)),
    heading_rad: float = 0.3,
    fault_s: float | None = None,
    wings_alone: bool = False,
    load_wings: Callable[[float], float] | None = None,
    force: Callable[[float], float] | None = None,
    demand: Callable[[float], float] | None = None,
) -> Flight:
    """A pull-out in one vertical plane at constant speed; the wings keep their slot (aft, right, down) rigidly.

    ``load_wings``: the wings fly this load factor instead of the lead's, in the slot only at the start.
    """
    t = np.arange(round(end_s / step_s) + 1) * step_s

    def path(n_of: Callable[[float], float]) -> tuple[Array, Array, Array, Array]:
        def rate(s: float, g: float) -> float:
            return G * (n_of(s) - float(np.cos(g))) / speed_mps

        gamma = np.empty(t.size)
        gamma[0] = gamma0_rad
        for i in range(t.size - 1):  # RK4
            s, g = t[i], gamma[i]
            k1 = rate(s, g)
            k2 = rate(s + step_s / 2, g + step_s / 2 * k1)
            k3 = rate(s + step_s / 2, g + step_s / 2 * k2)
            k4 = rate(s + step_s, g + step_s * k3)
            gamma[i + 1] = g + step_s / 6 * (k1 + 2 * k2 + 2 * k3 + k4)
        n = np.array([n_of(s) for s in t])
        q = G * (n - np.cos(gamma)) / speed_mps
        along = np.concatenate([[0.0], np.cumsum(0.5 * (np.cos(gamma[1:]) + np.cos(gamma[:-1])) * step_s * speed_mps)])
        up = np.concatenate([[0.0], np.cumsum(0.5 * (np.sin(gamma[1:]) + np.sin(gamma[:-1])) * step_s * speed_mps)])
        return gamma, n, q, np.stack([along, up + height0_m], axis=-1)

    k_count = 1 + len(slots)
    paths = [path(load)] + [path(load_wings or load)] * len(slots)
    quat = np.stack([np.array([quat_from_euler(heading_rad, g, 0.0) for g in p[0]]) for p in paths], axis=1)
    ahead = np.array([np.cos(heading_rad), np.sin(heading_rad), 0.0])
    pos = np.stack([p[3][:, :1] * ahead + p[3][:, 1:] * np.array([0, 0, -1.0]) for p in paths], axis=1)
    for k, (aft, right, down) in enumerate(slots, start=1):
        offset = np.array([-aft, right, down])
        turn = quat[:1, k] if load_wings else quat[:, k]
        pos[:, k] += quat_rotate(turn, offset)
    vel = quat_rotate(quat, np.array([speed_mps, 0.0, 0.0]))
    gamma = np.stack([p[0] for p in paths], axis=-1)
    n = np.stack([p[1] for p in paths], axis=-1)
    q = np.stack([p[2] for p in paths], axis=-1)
    height = -pos[..., 2]
    contact: list[float | None] = []
    for k in range(k_count):
        low = np.nonzero(height[:, k] <= 0.0)[0]
        contact.append(float(t[low[0]]) if low.size else None)
        if low.size:  # arrays hold after contact
            for held in (pos, vel, quat, gamma, n, q, height):
                held[low[0] :, k] = held[low[0], k]
    shape = (t.size, k_count)
    zero = np.zeros(shape)
    forces = zero.copy()
    forces[:, 0] = [force(s) if force else 0.0 for s in t]
    demands = n.copy()
    if demand:
        demands[:, 0] = [demand(s) for s in t]
    return Flight(
        time_s=t, pos_e_m=pos, vel_e_mps=vel, quat_eb=quat,
        rate_b_radps=np.stack([zero, q, zero], axis=-1), speed_mps=np.full(shape, speed_mps),
        cas_mps=np.full(shape, speed_mps), alpha_rad=zero.copy(), load_factor=n, load_factor_demand=demands,
        stick=zero.copy(), stick_force_n=forces, stabilator_rad=zero.copy(), thrust_n=zero.copy(),
        throttle=zero.copy(), engine=zero.copy(), gamma_rad=gamma, loop_angle_rad=zero.copy(), height_m=height,
        height_agl_m=height.copy(), step=np.zeros(t.size), airframes=(AIRFRAME,) * k_count,
        names=("lead", *[f"slot{k}" for k in range(1, k_count)]), fault_s=fault_s, contact_s=tuple(contact),
        events={}, loop_scale=1.0,
    )  # fmt: skip


def sagging(healthy_n: float, faulted_n: float, over_s: float, at_s: float = 0.0) -> Callable[[float], float]:
    """Load factor that sags linearly from one value to another over a time, from an instant on."""
    return lambda s: healthy_n + (faulted_n - healthy_n) * min(max((s - at_s) / over_s, 0.0), 1.0)
