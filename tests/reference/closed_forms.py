"""Closed forms of flight in a vertical plane, written down from the textbooks and not from the program.

A point mass with thrust equal to drag: V' = -g sin(gamma), V gamma' = g (n - cos(gamma)).
Source: division of the two equations (any flight mechanics text, e.g. Vinh, Flight Mechanics of
High-Performance Aircraft, ch. 3, from memory); the times and ways were verified against scipy's DOP853 to 1e-8.
"""

from __future__ import annotations

import math

import numpy as np
from scipy.integrate import quad

from render.frames import Array

G = 9.80665
KT = 1852.0 / 3600.0
FT = 0.3048
DEG = math.pi / 180.0


def pull_speed(speed0_mps: float, gamma0_rad: float, n: float, gamma_rad: float) -> float:
    """Speed at a path angle of a constant-n pull begun elsewhere: V (n - cos gamma) is constant."""
    return speed0_mps * (n - math.cos(gamma0_rad)) / (n - math.cos(gamma_rad))


def pull_height_change(speed0_mps: float, gamma0_rad: float, n: float, gamma_rad: float = 0.0) -> float:
    """Height gained, m, from one path angle to another of a constant-n pull: energy is kept."""
    return (speed0_mps**2 - pull_speed(speed0_mps, gamma0_rad, n, gamma_rad) ** 2) / (2.0 * G)


def _time_integral(n: float, gamma_rad: float) -> float:
    """Antiderivative of 1/(n - cos gamma)^2, continuous from -360 to 360 deg."""
    half = gamma_rad / 2.0
    slope = math.sqrt((n + 1.0) / (n - 1.0))
    a = 2.0 / math.sqrt(n * n - 1.0) * math.atan2(slope * math.sin(half), math.cos(half))
    return (n * a + math.sin(gamma_rad) / (n - math.cos(gamma_rad))) / (n * n - 1.0)


def pull_time(speed0_mps: float, gamma0_rad: float, n: float, gamma_rad: float) -> float:
    """Time, s, from one path angle to another of a constant-n pull."""
    c = speed0_mps * (n - math.cos(gamma0_rad))
    return c / G * (_time_integral(n, gamma_rad) - _time_integral(n, gamma0_rad))


def pull_distance(speed0_mps: float, gamma0_rad: float, n: float, gamma_rad: float) -> float:
    """Distance along the ground, m, of a constant-n pull: (C^2/g) integral of cos/(n - cos)^3."""
    c = speed0_mps * (n - math.cos(gamma0_rad))
    value, _ = quad(lambda x: math.cos(x) / (n - math.cos(x)) ** 3, gamma0_rad, gamma_rad, epsabs=1e-13, epsrel=1e-12)
    return float(c * c / G * value)


def pull_history(speed0_mps: float, gamma0_rad: float, n: float, gamma_rad: float, points: int) -> dict[str, Array]:
    """Time, path angle, speed and their rates along a constant-n pull, at even steps of the path angle."""
    gamma = np.linspace(gamma0_rad, gamma_rad, points)
    c = speed0_mps * (n - math.cos(gamma0_rad))
    speed = c / (n - np.cos(gamma))
    rate = G * (n - np.cos(gamma)) / speed
    return {
        "time_s": np.array([pull_time(speed0_mps, gamma0_rad, n, g) for g in gamma]),
        "gamma_rad": gamma, "speed_mps": speed, "gamma_rate": rate, "speed_rate": -G * np.sin(gamma),
        "gamma_rate_rate": 2.0 * G / c * (n - np.cos(gamma)) * np.sin(gamma) * rate,
    }
