"""Units: exact factors against outside values, both ways, and what is refused."""

from __future__ import annotations

import math

import pytest
from hypothesis import given
from hypothesis import strategies as st
from scipy import constants

from scenes.units import DIMENSIONS, UnitError, format_value, in_unit, parse_value, range_text, shortest_text

# NIST SP 811 (2008), Appendix B.8, as printed there to seven figures (values from memory).
NIST = [
    ("length", "ft", 3.048e-1), ("length", "NM", 1.852e3), ("speed", "kt", 5.144444e-1), ("speed", "ft/s", 3.048e-1),
    ("speed", "km/h", 2.777778e-1), ("area", "ft2", 9.290304e-2), ("mass", "lb", 4.535924e-1),
    ("force", "lbf", 4.448222), ("stiffness", "lbf/in", 1.751268e2), ("angle", "deg", 1.745329e-2),
    ("time", "min", 6.0e1),
]


@pytest.mark.parametrize(("dim", "unit", "factor"), NIST)
def test_factors_agree_with_the_printed_table(dim: str, unit: str, factor: float) -> None:
    """Within half a unit of the seventh figure printed."""
    half = 0.5 * 10.0 ** (math.floor(math.log10(factor)) - 6)
    assert parse_value(dim, f"1 {unit}")[0] == pytest.approx(factor, rel=0.0, abs=half)


@pytest.mark.parametrize(
    ("text", "dim", "outside"),
    [
        ("1 kt", "speed", constants.knot), ("1 NM", "length", constants.nautical_mile),
        ("1 ft", "length", constants.foot), ("1 lb", "mass", constants.pound), ("1 deg", "angle", constants.degree),
        ("1 lbf", "force", constants.pound_force), ("1 km/h", "speed", constants.kmh),
        ("1 min", "time", constants.minute),
        ("1 slug ft2", "inertia", constants.slug * constants.foot**2),
        ("1 lbf/in", "stiffness", constants.pound_force / constants.inch),
        ("59 degF", "temperature", constants.convert_temperature(59.0, "Fahrenheit", "Kelvin")),
        ("-40 degC", "temperature", constants.convert_temperature(-40.0, "Celsius", "Kelvin")),
    ],
)
def test_factors_agree_with_scipy(text: str, dim: str, outside: float) -> None:
    """SciPy's constants (CODATA and legal definitions), to rounding."""
    assert parse_value(dim, text)[0] == pytest.approx(outside, rel=4e-16 * 4)


def test_a_knot_is_exact() -> None:
    """BIPM SI brochure, 8th ed., Table 8: (1852/3600) m/s; so 3600 kt for an hour is 3600 times 1852 m."""
    assert parse_value("speed", "1 kt")[0] == 1852.0 / 3600.0
    assert parse_value("temperature", "0 degC")[0] == 273.15
    assert parse_value("temperature", "32 degF")[0] == pytest.approx(273.15, abs=1e-12)


FINITE = st.floats(min_value=-1e12, max_value=1e12, allow_nan=False)


@given(st.sampled_from(sorted(DIMENSIONS)), st.data(), FINITE)
def test_round_trip_through_every_unit(dim: str, data: st.DataObject, value: float) -> None:
    """Text in any unit reads back to the same value within a few roundings; in the SI unit exactly."""
    if dim == "count":
        value = float(round(value))
    unit = data.draw(st.sampled_from(list(DIMENSIONS[dim].units)))
    back, read = parse_value(dim, format_value(dim, value, unit))
    assert read == unit
    offset = abs(DIMENSIONS[dim].units[unit].offset)
    assert back == pytest.approx(value, rel=1e-14, abs=1e-13 * max(offset, 1e-300))
    assert parse_value(dim, format_value(dim, value))[0] == value
    assert in_unit(dim, value, DIMENSIONS[dim].si) == value


@given(st.sampled_from(["length", "speed", "angle", "temperature", "fraction", "time"]), FINITE)
def test_shortest_text_reads_back_exactly(dim: str, value: float) -> None:
    """Whatever the value, not one bit is lost."""
    assert parse_value(dim, shortest_text(dim, value))[0] == value


@pytest.mark.parametrize(
    ("dim", "text", "shown"),
    [("length", "300 ft", "300 ft"), ("speed", "388 kt", "388 kt"), ("angle", "245 deg", "245 deg"),
     ("length", "14 m", "14 m"), ("fraction", "40 %", "40 %"), ("temperature", "24 degC", "24 degC"),
     ("angle", "1 rad", "1 rad"), ("length", "25 km", "25 km")],
)
def test_shortest_text_is_what_a_person_would_write(dim: str, text: str, shown: str) -> None:
    """Round numbers in usual units."""
    assert shortest_text(dim, parse_value(dim, text)[0]) == shown


@pytest.mark.parametrize(
    ("dim", "text", "wanted", "nearest"),
    [
        ("speed", "385", "a speed with its unit (m/s, kt, km/h or ft/s), such as 385 kt", None),
        ("speed", "385 ft", "a speed with its unit (m/s, kt, km/h or ft/s), such as 385 kt", "385 ft/s"),
        ("speed", "385 kts", "a speed with its unit (m/s, kt, km/h or ft/s), such as 385 kt", "385 kt"),
        ("length", "300 feet", "a length with its unit (m, ft, km, NM or cm), such as 300 ft", "300 ft"),
        ("temperature", "24 °C", "a temperature with its unit (K, degC or degF), such as 24 degC", "24 degC"),
        ("angle", "80", "an angle with its unit (rad or deg), such as 80 deg", None),
        ("load_factor", "4 m", "a load factor such as 4.5 g", None),
        ("speed", "nan kt", "a speed with its unit (m/s, kt, km/h or ft/s), such as 385 kt, finite", None),
        ("speed", "-.inf", "a speed with its unit (m/s, kt, km/h or ft/s), such as 385 kt, finite", None),
        ("speed", "1e999 kt", "a speed with its unit (m/s, kt, km/h or ft/s), such as 385 kt, finite", None),
        ("length", "1,000 ft", "a length with its unit (m, ft, km, NM or cm), such as 300 ft", None),
        ("count", "30.0", "a whole number", None),
        ("number", "4.5 m", "a number", None),
        ("time", "", "a time with its unit (s, ms or min), such as 3 s", None),
    ],
)
def test_refusals_say_what_fits(dim: str, text: str, wanted: str, nearest: str | None) -> None:
    """The exact words."""
    with pytest.raises(UnitError) as caught:
        parse_value(dim, text)
    assert (caught.value.wanted, caught.value.nearest) == (wanted, nearest)


@given(st.sampled_from(sorted(DIMENSIONS)), st.text(max_size=30))
def test_any_text_is_a_value_or_a_refusal(dim: str, text: str) -> None:
    """Never another exception, never a value that isn't finite."""
    try:
        value, _ = parse_value(dim, text)
    except UnitError:
        return
    assert math.isfinite(value)


def test_ranges_round_inward() -> None:
    """A limit that is shown is itself allowed."""
    assert range_text("speed", 20.0, 350.0, "kt") == "38.88 kt to 680.3 kt"
    assert parse_value("speed", "38.88 kt")[0] >= 20.0
    assert parse_value("speed", "680.3 kt")[0] <= 350.0
    assert range_text("angle", 0.0, 2.0 * math.pi, "deg") == "0 deg to 360 deg"
    assert range_text("time", 0.5, math.inf, "s") == "at least 0.5 s"
