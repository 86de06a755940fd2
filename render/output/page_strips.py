"""Strips over time with the healthy twin behind, and the paths from the side and from above."""

from __future__ import annotations

import math
from collections.abc import Callable
from dataclasses import dataclass

import numpy as np
from numpy.typing import ArrayLike

from render.frames import Array
from render.output import page_svg as ps
from render.output.events import slot_index, slot_title
from render.output.page_svg import Scale, Svg
from render.output.side_view import entry_direction
from render.output.words import KNOT_MPS, Units
from render.types import Flight, Study

WIDTH, LEFT, RIGHT, TOP, PLOT, SIZE = 360.0, 46.0, 8.0, 22.0, 84.0, 12.0


@dataclass(frozen=True, slots=True)
class Strip:
    """One history: its name with unit, aircraft, and where its values are in a flight."""

    key: str
    title: str
    k: int
    values: Callable[[Flight], Array]


def strip_plans(study: Study, slot: str) -> tuple[Strip, ...]:
    """The strips of a page: the lead's stick and g, the seat's g, height and speed, and what a pull now would clear."""
    units, k = Units(study.scene.film.units), slot_index(study, slot)
    speed = KNOT_MPS if units.name == "feet" else 1.0 / 3.6
    own = slot_title(slot)
    plans = [Strip("stick", "Lead's stick (1: full aft)", 0, lambda f: f.stick[:, 0]),
             Strip("lead_g", "Lead's load factor (g)", 0, lambda f: f.load_factor[:, 0])]
    if k:
        plans.append(Strip("own_g", f"{own}: load factor (g)", k, lambda f: f.load_factor[:, k]))
    plans += [
        Strip("height", f"{own}: height above ground ({units.length_unit})", k,
              lambda f: units.length_value(1.0) * f.height_agl_m[:, k]),
        Strip("speed", f"{own}: calibrated speed ({units.speed_unit})", k, lambda f: f.cas_mps[:, k] / speed),
    ]  # fmt: skip
    if np.isfinite(study.margin.clearance_floor_m[:, k]).any() and not study.margin.no_pull_left[k]:
        plans.append(Strip("clearance", f"A pull now ends above the floor ({units.length_unit})", k,
                           lambda f: units.length_value(1.0) * (
                               study.margin if f is study.faulted else study.margin_healthy).clearance_floor_m[:, k]))
    return tuple(plans)


def strip_chart(study: Study, slot: str, strip: Strip, start_s: float, end_s: float, name: str) -> str:
    """One strip as SVG, faulted in colour over the healthy twin in dashes; data as the margin chart's."""
    twin, k = study.healthy is not study.faulted, slot_index(study, slot)
    svg = Svg(WIDTH, TOP + PLOT + 24, strip.title, _described(study, strip, start_s, end_s), name, "strip")
    x = Scale(start_s, end_s, LEFT, WIDTH - RIGHT)
    svg.data = {"t0": f"{start_s:.4f}", "t1": f"{end_s:.4f}", "x0": ps.number(x.p0), "x1": ps.number(x.p1)}
    flights = [study.healthy, study.faulted] if twin else [study.faulted]
    curves = [_within(flight, strip.values(flight), strip.k, start_s, end_s) for flight in flights]
    values = np.concatenate([c[1] for c in curves])
    values = values[np.isfinite(values)]
    low, high = (float(values.min()), float(values.max())) if values.size else (0.0, 1.0)
    pad = max((high - low) * 0.06, 1e-3 * max(abs(high), 1.0))
    y = Scale(low - pad, high + pad, TOP + PLOT, TOP)
    svg.text(2, 13, strip.title, "t strong", ps.INK, SIZE)
    for tick in ps.ticks(y.v0, y.v1, 5):
        svg.line(x.p0, y.at(tick), x.p1, y.at(tick), ps.RULE, "rule", stroke_width=1)
        svg.text(x.p0 - 5, y.at(tick) + 4, f"{tick:,g}" if abs(tick) < 1e6 else f"{tick:,.0f}", "t", ps.QUIET, SIZE - 1,
                 "end")
    if y.v0 < 0.0 < y.v1:
        svg.line(x.p0, y.at(0.0), x.p1, y.at(0.0), ps.QUIET, "zero", stroke_width=1)
    _marks(svg, study, k, x)
    if twin:
        svg.curve(x(curves[0][0]), y(curves[0][1]), ps.TWIN, "twin", 1.8, stroke_dasharray="5 3")
    svg.curve(x(curves[-1][0]), y(curves[-1][1]), ps.BLUE, "own", 2.4)
    base = study.faulted.fault_s or 0.0
    for tick in ps.ticks(start_s - base, end_s - base, 6):
        svg.text(x.at(tick + base), TOP + PLOT + 15, f"{tick:g}", "t", ps.QUIET, SIZE - 1, "middle")
    svg.line(x.p0, TOP, x.p0, TOP + PLOT, ps.INK, "cursor", stroke_width=1.5,
             display="none")
    return svg.render()


def _within(flight: Flight, values: Array, k: int, start_s: float, end_s: float) -> tuple[Array, Array]:
    """Times and values inside the film's range, up to this aircraft's contact."""
    stop = flight.contact_s[k]
    end = end_s if stop is None else min(end_s, stop)
    inside = (flight.time_s >= start_s) & (flight.time_s <= end + 1e-9)
    step = max(1, int(inside.sum()) // 240)
    return flight.time_s[inside][::step], np.asarray(values, dtype=float)[inside][::step]


def _marks(svg: Svg, study: Study, k: int, x: Scale) -> None:
    for at_s, dash in ((study.faulted.fault_s, "5 3"), (study.margin.last_pull_floor_s[k], None)):
        if at_s is not None and x.v0 <= at_s <= x.v1:
            svg.line(x.at(at_s), TOP, x.at(at_s), TOP + PLOT, ps.LATE, "event heavy", stroke_width=1.4,
                     stroke_dasharray=dash)


def _described(study: Study, strip: Strip, start_s: float, end_s: float) -> str:
    _, values = _within(study.faulted, strip.values(study.faulted), strip.k, start_s, end_s)
    known = values[np.isfinite(values)]
    if not known.size:
        return "No values in this range."
    return f"From {known[0]:,.3g} to {known[-1]:,.3g}, between {known.min():,.3g} and {known.max():,.3g}."


@dataclass(frozen=True, slots=True)
class PathView:
    """A drawing of the paths and where the seat's aircraft stands in it at each instant asked for."""

    svg: str
    x: Array
    y: Array


def side_path(study: Study, slot: str, start_s: float, end_s: float, times_s: Array, name: str) -> PathView:
    """Both paths of the seat over the ground under it, seen across the entry heading, to one scale."""
    k = slot_index(study, slot)
    along = entry_direction(study.healthy)
    return _path_view(study, k, (start_s, end_s), times_s, name, "From the side", along,
                      lambda flight: flight.height_m[:, k], ground=True)


def plan_path(study: Study, slot: str, start_s: float, end_s: float, times_s: Array, name: str) -> PathView:
    """The paths of all aircraft from above, entry heading to the right, to one scale."""
    k = slot_index(study, slot)
    along = entry_direction(study.healthy)
    across = np.array([-along[1], along[0]])
    return _path_view(study, k, (start_s, end_s), times_s, name, "From above", along,
                      lambda flight: -(flight.pos_e_m[:, k, :2] @ across), ground=False)


def _path_view(
    study: Study, k: int, span: tuple[float, float], times_s: Array, name: str, title: str, along: Array,
    up: Callable[[Flight], Array], ground: bool,
) -> PathView:
    units = Units(study.scene.film.units)
    flights = [study.healthy, study.faulted] if study.healthy is not study.faulted else [study.faulted]
    paths = []
    for flight in flights:
        until = span[1] + (2.0 if flight is study.healthy else 0.0)
        inside = (flight.time_s >= span[0]) & (flight.time_s <= until + 1e-9)
        step = max(1, int(inside.sum()) // 300)
        paths.append(((flight.pos_e_m[inside, k, :2] @ along)[::step], np.asarray(up(flight))[inside][::step]))
    flown = study.faulted
    soil_y = flown.height_m[:, k] - flown.height_agl_m[:, k]
    all_x = np.concatenate([p[0] for p in paths])
    all_y = np.concatenate([p[1] for p in paths] + ([soil_y] if ground else []))
    span_x, span_y = max(float(np.ptp(all_x)), 50.0), max(float(np.ptp(all_y)), 50.0)
    scale = min((WIDTH - 24) / span_x, 230.0 / span_y)
    height = max(span_y * scale, 36.0) + TOP + 40
    left = (WIDTH - span_x * scale) / 2 - float(all_x.min()) * scale
    base = TOP + 8 + float(all_y.max()) * scale + (max(36.0 - span_y * scale, 0.0)) / 2

    def px(x: ArrayLike) -> Array:
        return left + np.asarray(x, dtype=float) * scale

    def py(y: ArrayLike) -> Array:
        return base - np.asarray(y, dtype=float) * scale

    fault = flown.fault_s
    words = "Dashed: without the fault." if fault is not None else ""
    svg = Svg(WIDTH, height, f"{title}: path of {slot_title(flown.names[k]).lower()}",
              f"Path over {units.length(span_x)} along the entry heading, "
              f"{units.length(span_y)} {'high' if ground else 'wide'}. {words}", name, "path")
    svg.text(2, 13, title, "t strong", ps.INK, SIZE)
    if ground:
        line = [f"{ps.number(float(px(x)))} {ps.number(float(py(y)))}" for x, y in _soil(flown, k, along, soil_y)]
        first, last = ps.number(float(py(soil_y[0]))), ps.number(float(py(soil_y[-1])))
        svg.add("path", d=f"M0 {ps.number(height)}L0 {first}L{'L'.join(line)}L{ps.number(WIDTH)} {last}"
                          f"L{ps.number(WIDTH)} {ps.number(height)}Z", fill="#dfe5d5", cls="soil")
    if len(paths) == 2:
        svg.curve(px(paths[0][0]), py(paths[0][1]), ps.TWIN, "twin", 1.8, stroke_dasharray="5 3")
    svg.curve(px(paths[-1][0]), py(paths[-1][1]), ps.BLUE, "own", 2.6)
    if fault is not None and span[0] <= fault <= span[1]:
        at_x, at_y = _at(flown, k, along, up, np.array([fault]))
        svg.add("path", d="M0 -6L6 0L0 6L-6 0Z", fill=ps.LATE, cls="fault-mark",
                transform=f"translate({ps.number(float(px(at_x)[0]))} {ps.number(float(py(at_y)[0]))})")
        svg.text(float(px(at_x)[0]) + 9, float(py(at_y)[0]) - 7, "fault", "t halo", ps.LATE, SIZE - 1)
    _scale_bar(svg, units, scale, height)
    where = _at(flown, k, along, up, times_s)
    x, y = px(where[0]), py(where[1])
    svg.add("circle", r=6, cx=float(x[0]), cy=float(y[0]), fill=ps.INK, cls="here", stroke=ps.BACK, stroke_width=2,
            display="none")
    return PathView(svg.render(), x, y)


def _at(flight: Flight, k: int, along: Array, up: Callable[[Flight], Array], times_s: Array) -> tuple[Array, Array]:
    x = np.interp(times_s, flight.time_s, flight.pos_e_m[:, k, :2] @ along)
    return x, np.interp(times_s, flight.time_s, up(flight))


def _soil(flight: Flight, k: int, along: Array, soil_y: Array) -> list[tuple[float, float]]:
    x = flight.pos_e_m[:, k, :2] @ along
    order = np.argsort(x, kind="stable")
    order = order[:: max(1, len(order) // 80)]
    return list(zip(x[order].tolist(), soil_y[order].tolist(), strict=True))


def _scale_bar(svg: Svg, units: Units, scale: float, height: float) -> None:
    per_unit = 0.3048 if units.name == "feet" else 1.0
    want = 80.0 / scale / per_unit
    power = 10.0 ** math.floor(math.log10(want))
    length = max(power * k for k in (1, 2, 5) if power * k <= want)
    width = length * per_unit * scale
    svg.line(WIDTH - 8 - width, height - 8, WIDTH - 8, height - 8, ps.INK, "bar", stroke_width=2)
    svg.text(WIDTH - 12 - width, height - 4, f"{length:,.0f} {units.length_unit}", "t", ps.QUIET, SIZE - 1, "end")
