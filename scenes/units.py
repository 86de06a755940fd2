"""Dimensions, their units with exact factors, and text such as ``385 kt`` to SI and back.

Sources: BIPM, The International System of Units, 8th ed. (2006), Table 8: nautical mile 1852 m, knot one nautical
mile an hour = (1852/3600) m/s; NIST SP 811 (2008), Appendix B.8 (from memory): foot 0.3048 m, pound 0.453 592 37 kg,
g0 9.806 65 m/s2, all exact; the others follow from these.
"""

from __future__ import annotations

import math
import re
from collections.abc import Mapping
from dataclasses import dataclass

from scenes.complaint import any_of, nearest

FOOT_M = 0.3048
INCH_M = 0.0254
MILE_M = 1852.0
POUND_KG = 0.45359237
G0_MPS2 = 9.80665
POUND_FORCE_N = POUND_KG * G0_MPS2
SLUG_FT2_KGM2 = POUND_FORCE_N * FOOT_M  # slug = lbf s2/ft, times ft2
DEG_RAD = math.pi / 180.0


@dataclass(frozen=True, slots=True)
class Unit:
    """value_SI = (value + offset) * factor."""

    factor: float
    offset: float = 0.0


@dataclass(frozen=True, slots=True)
class Dimension:
    """A kind of quantity: its name in words, its units (the SI one first), whether a bare number will do."""

    words: str
    units: Mapping[str, Unit]
    example: str
    bare: bool = False

    @property
    def si(self) -> str:
        """The unit that values are kept in."""
        return next(iter(self.units))


DIMENSIONS: Mapping[str, Dimension] = {
    "length": Dimension("a length", {"m": Unit(1.0), "ft": Unit(FOOT_M), "km": Unit(1000.0), "NM": Unit(MILE_M),
                                     "cm": Unit(0.01)}, "300 ft"),
    "speed": Dimension("a speed", {"m/s": Unit(1.0), "kt": Unit(MILE_M / 3600.0), "km/h": Unit(1.0 / 3.6),
                                   "ft/s": Unit(FOOT_M)}, "385 kt"),
    "angle": Dimension("an angle", {"rad": Unit(1.0), "deg": Unit(DEG_RAD)}, "80 deg"),
    "angular_rate": Dimension("an angular rate", {"rad/s": Unit(1.0), "deg/s": Unit(DEG_RAD)}, "60 deg/s"),
    "time": Dimension("a time", {"s": Unit(1.0), "ms": Unit(0.001), "min": Unit(60.0)}, "3 s"),
    "temperature": Dimension("a temperature", {"K": Unit(1.0), "degC": Unit(1.0, 273.15),
                                               "degF": Unit(5.0 / 9.0, 459.67)}, "24 degC"),
    "mass": Dimension("a mass", {"kg": Unit(1.0), "lb": Unit(POUND_KG), "t": Unit(1000.0)}, "5300 kg"),
    "area": Dimension("an area", {"m2": Unit(1.0), "ft2": Unit(FOOT_M**2)}, "16 m2"),
    "inertia": Dimension("a moment of inertia", {"kg m2": Unit(1.0), "slug ft2": Unit(SLUG_FT2_KGM2)}, "38000 kg m2"),
    "force": Dimension("a force", {"N": Unit(1.0), "kN": Unit(1000.0), "lbf": Unit(POUND_FORCE_N)}, "25 kN"),
    "stiffness": Dimension("a stiffness", {"N/m": Unit(1.0), "N/mm": Unit(1000.0),
                                           "lbf/in": Unit(POUND_FORCE_N / INCH_M)}, "400 N/m"),
    "load_factor": Dimension("a load factor", {"g": Unit(1.0)}, "4.5 g", bare=True),
    "g_rate": Dimension("a load factor onset", {"g/s": Unit(1.0)}, "3 g/s"),
    "fraction": Dimension("a part of the whole", {"": Unit(1.0), "%": Unit(0.01)}, "40 %", bare=True),
    "number": Dimension("a number", {"": Unit(1.0)}, "4.5", bare=True),
    "count": Dimension("a whole number", {"": Unit(1.0)}, "30", bare=True),
}

# What people also write, for the hint; not accepted, so that one spelling reads the same everywhere.
ALSO = {"kts": "kt", "knot": "kt", "knots": "kt", "feet": "ft", "foot": "ft", "'": "ft", "meter": "m", "metre": "m",
        "meters": "m", "metres": "m", "nm": "NM", "nmi": "NM", "°": "deg", "degree": "deg", "degrees": "deg",
        "°c": "degC", "c": "degC", "celsius": "degC", "°f": "degF", "f": "degF", "kelvin": "K", "sec": "s",
        "seconds": "s", "second": "s", "mps": "m/s", "kph": "km/h", "kmh": "km/h", "°/s": "deg/s", "percent": "%",
        "lbs": "lb", "kgs": "kg", "m^2": "m2", "m²": "m2", "kg m^2": "kg m2", "kg*m2": "kg m2", "kgm2": "kg m2"}

# The unit a value is written in where nobody has chosen one.
USUAL = {"length": ("ft", "m", "km"), "speed": ("kt",), "angle": ("deg",), "angular_rate": ("deg/s",), "time": ("s",),
         "temperature": ("degC",), "fraction": ("%",), "force": ("kN",)}

_NUMBER = re.compile(r"[+-]?(?:[0-9]+(?:\.[0-9]*)?|\.[0-9]+)(?:[eE][+-]?[0-9]+)?")
_NOT_FINITE = re.compile(r"[+-]?\.?(?:nan|inf|infinity)\b", re.IGNORECASE)


class UnitError(ValueError):
    """A text that is no value of its dimension: what is wanted, and the nearest text that would do."""

    def __init__(self, wanted: str, nearest_text: str | None = None) -> None:
        super().__init__(wanted)
        self.wanted = wanted
        self.nearest = nearest_text


def units_text(dim: str) -> str:
    """What a value of a dimension must look like, in words."""
    d = DIMENSIONS[dim]
    names = [u for u in d.units if u]
    if not names:
        return d.words
    if d.bare:
        return f"{d.words} such as {d.example}"
    return f"{d.words} with its unit ({any_of(names)}), such as {d.example}"


def split_value(text: str) -> tuple[float, str] | None:
    """Number and unit of a text such as ``385 kt``, or None if it doesn't begin with a number."""
    stripped = text.strip()
    match = _NUMBER.match(stripped)
    if match is None:
        return None
    return float(match.group()), " ".join(stripped[match.end():].split())


def parse_value(dim: str, text: str) -> tuple[float, str]:
    """A text to its value in SI and the unit it was written in. Raises UnitError."""
    d = DIMENSIONS[dim]
    if _NOT_FINITE.match(text.strip()):
        raise UnitError(f"{units_text(dim)}, finite")
    parts = split_value(text)
    if parts is None:
        raise UnitError(units_text(dim))
    value, unit = parts
    number = text.strip()[: _NUMBER.match(text.strip()).end()]  # type: ignore[union-attr]
    if unit not in d.units and not (unit == "" and d.bare):
        known = ALSO.get(unit.lower())
        guess = known if known in d.units else nearest(unit, [u for u in d.units if u]) if unit else None
        raise UnitError(units_text(dim), f"{number} {guess}" if guess else None)
    u = d.units.get(unit, Unit(1.0))
    si = (value + u.offset) * u.factor
    if not math.isfinite(si):
        raise UnitError(f"{units_text(dim)}, finite")
    if dim == "count" and (si != round(si) or not re.fullmatch(r"[+-]?[0-9]+", number)):
        raise UnitError(units_text(dim))
    return si, unit


def in_unit(dim: str, value_si: float, unit: str) -> float:
    """A value in SI to a unit of its dimension."""
    u = DIMENSIONS[dim].units.get(unit, Unit(1.0))
    return value_si / u.factor - u.offset


def _rounded(value: float, up: bool) -> str:
    """Four significant digits, rounded up or down."""
    if value == 0.0:
        return "0"
    scale = 10.0 ** (3 - math.floor(math.log10(abs(value))))
    scaled = value * scale
    near = round(scaled)
    if abs(scaled - near) > 1e-6:
        near = math.ceil(scaled) if up else math.floor(scaled)
    return f"{near / scale:.10g}"


def range_text(dim: str, lo: float, hi: float, unit: str) -> str:
    """A range in a unit, the limits rounded inward: ``38.88 kt to 680.3 kt``."""
    tail = f" {unit}" if unit else ""
    low = "" if math.isinf(lo) else f"{_rounded(in_unit(dim, lo, unit), True)}{tail}"
    high = "" if math.isinf(hi) else f"{_rounded(in_unit(dim, hi, unit), False)}{tail}"
    if low and high:
        return f"{low} to {high}"
    return f"at least {low}" if low else f"at most {high}" if high else "any"


def format_value(dim: str, value_si: float, unit: str | None = None) -> str:
    """A value in SI as text in a unit (default: SI); in SI it reads back exactly."""
    unit = DIMENSIONS[dim].si if unit is None else unit
    value = in_unit(dim, value_si, unit)
    number = repr(int(value)) if value == int(value) and abs(value) < 1e15 else repr(value)
    return f"{number} {unit}".rstrip()


def shortest_text(dim: str, value_si: float) -> str:
    """A value in SI as text that reads back exactly: the shortest in a usual unit if it is a round number there."""
    for units in (USUAL.get(dim, ()), tuple(DIMENSIONS[dim].units)):
        texts = [text for unit in units if (text := _round_text(dim, value_si, unit)) is not None]
        if texts:
            return min(texts, key=len)
    return format_value(dim, value_si)


def _round_text(dim: str, value_si: float, unit: str) -> str | None:
    """A value of up to seven digits in a unit, if such a one reads back exactly."""
    value = in_unit(dim, value_si, unit)
    for digits in range(1, 8):
        number = f"{float(f'{value:.{digits}g}'):.12g}"
        text = f"{number} {unit}".rstrip()
        if "e" not in number and parse_value(dim, text)[0] == value_si:
            return text
    return None
