"""The figures as text an instructor reads aloud, as CSV in SI, and as ``verdict.json``."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Iterable
from contextlib import ExitStack
from pathlib import Path

import numpy as np

from render.files import whole_file
from render.frames import Array
from render.output.events import FLIGHT_WORDS, fault_kind, slot_index, slot_title
from render.output.texts import sample
from render.output.words import CAUTION, Units, cue_words, fault_words, lateness_words, seconds
from render.types import Flight, Notice, Study

GATES = {"entry": "entry", **FLIGHT_WORDS}


def study_table(study: Study) -> str:
    """Gates, fault, and per slot what was noticed, what was left and what a break-out then buys; with the caution."""
    units = Units(study.scene.film.units)
    floor = units.length(study.scene.floor_m)
    lines = [study.scene.title, f"Floor: {floor} above the ground, as the scene asks.", ""]
    twin = "as briefed" if study.scene.briefed is not None else "without the fault"
    lines += [f"The flight {twin}, the lead's gates:", *_gates(study.healthy, units), ""]
    if study.scene.briefed is not None:
        lines += ["The flight as flown, the lead's gates:", *_gates(study.faulted, units), ""]
    lines += [*_fault(study, units), ""]
    for slot in study.faulted.names[1:]:
        lines += [*_slot(study, slot, units), ""]
    lines += [
        "Early, likely and late are three observers: a range, not a forecast of one pilot.",
        CAUTION,
    ]
    return "\n".join(lines) + "\n"


def _gates(flight: Flight, units: Units) -> list[str]:
    rows = [("", "height above ground", "calibrated speed", "load factor")]
    for key, words in GATES.items():
        if key not in flight.events:
            continue
        at_s = flight.events[key]
        height, speed, load = (
            sample(flight.time_s, values[:, 0], at_s)
            for values in (flight.height_agl_m, flight.cas_mps, flight.load_factor)
        )
        rows.append((words, units.length(height), units.speed(speed), f"{round(load, 1) + 0.0:.1f} g"))
    return columns(rows, "lrrr")


def _fault(study: Study, units: Units) -> list[str]:
    flight = study.faulted
    if flight.fault_s is None:
        return ["No fault in this scene."]
    at_s = flight.fault_s
    height = sample(flight.time_s, flight.height_agl_m[:, 0], at_s)
    speed = sample(flight.time_s, flight.cas_mps[:, 0], at_s)
    angle = float(np.degrees(sample(flight.time_s, flight.loop_angle_rad[:, 0], at_s)))
    where = f", loop angle {angle:.0f} deg" if 0.0 < angle < 360.0 else ""
    lines = [
        f"Fault: {fault_words(fault_kind(study))}, {seconds(at_s)} from the start, at {units.length(height)} "
        f"above ground, {units.speed(speed)}{where}."
    ]
    contact = flight.contact_s[0]
    if contact is not None:
        lines.append(f"The lead meets the ground {seconds(contact - at_s)} after the fault.")
    else:
        after = flight.height_agl_m[flight.time_s >= at_s, 0]
        lines.append(f"The lead's lowest height after the fault is {units.length(float(after.min()))} above ground.")
    return lines


def last_pull_words(study: Study, slot: str, over: str) -> str:
    """When the last pull against ``floor`` or ``ground`` is, after the fault (or from the start without one)."""
    k = slot_index(study, slot)
    margin = study.margin
    last = (margin.last_pull_floor_s if over == "floor" else margin.last_pull_ground_s)[k]
    if last is None:
        return "does not run out"
    fault_s = study.faulted.fault_s
    if fault_s is None:
        return f"{seconds(last)} from the start"
    if last < fault_s:
        return f"{seconds(fault_s - last)} before the fault"
    return f"{seconds(last - fault_s)} after the fault"


def _slot(study: Study, slot: str, units: Units) -> list[str]:
    k = slot_index(study, slot)
    lines = [
        f"{slot_title(slot)}: last pull to clear the floor: {last_pull_words(study, slot, 'floor')}; "
        f"to clear the ground: {last_pull_words(study, slot, 'ground')}."
    ]
    contact = study.faulted.contact_s[k]
    if contact is not None and study.faulted.fault_s is not None:
        lines.append(f"If nobody acts, it meets the ground {seconds(contact - study.faulted.fault_s)} after the fault.")
    head = ("observer", "notices", "by", "reaction", "against the last pull", "lowest point if he breaks out then")
    rows: list[tuple[str, ...]] = [head]
    rows += [_observer(study, slot, notice, units) for notice in study.notices.get(slot, ())]
    return lines + (columns(rows, "llllll") if len(rows) > 1 else [])


def _observer(study: Study, slot: str, notice: Notice, units: Units) -> tuple[str, ...]:
    if notice.time_s is None:
        when, by = "never noticed", "-"
    else:
        fault_s = study.faulted.fault_s
        base, of = (fault_s, "after the fault") if fault_s is not None else (0.0, "from the start")
        when, by = f"{seconds(notice.time_s - base)} {of}", cue_words(notice.cue)
    return (
        notice.observer,
        when,
        by,
        seconds(notice.reaction_s),
        lateness_words(notice.lateness_s),
        break_out_words(study, slot, notice, units),
    )


def break_out_words(study: Study, slot: str, notice: Notice, units: Units) -> str:
    """How low the break-out of one observer ends: above or below the floor, or how much height it lacks."""
    if notice.clearance_m is None or notice.clearance_ground_m is None or notice.time_s is None:
        return "-"
    contact = study.faulted.contact_s[slot_index(study, slot)]
    if contact is not None and notice.time_s + notice.reaction_s >= contact:
        return "meets the ground before he acts"
    if notice.clearance_ground_m < 0.0:
        return f"meets the ground, {units.length(-notice.clearance_ground_m)} short"
    return units.clearance(notice.clearance_m, "floor")


def columns(rows: Iterable[tuple[str, ...]], align: str) -> list[str]:
    """Rows of text as aligned columns, two blanks apart, indented by two; ``align`` is l or r for each."""
    rows = list(rows)
    widths = [max(len(row[i]) for row in rows) for i in range(len(align))]
    return [
        "  "
        + "  ".join(
            cell.rjust(width) if side == "r" else cell.ljust(width)
            for cell, width, side in zip(row, widths, align, strict=True)
        ).rstrip()
        for row in rows
    ]


_TRACKS: tuple[tuple[str, str], ...] = (
    ("speed_mps", "true_speed_mps"),
    ("cas_mps", "calibrated_speed_mps"),
    ("gamma_rad", "path_angle_rad"),
    ("alpha_rad", "alpha_rad"),
    ("load_factor", "load_factor"),
    ("load_factor_demand", "load_factor_demand"),
    ("stick", "stick"),
    ("stick_force_n", "stick_force_n"),
    ("stabilator_rad", "stabilator_rad"),
    ("thrust_n", "thrust_n"),
    ("throttle", "throttle"),
    ("loop_angle_rad", "loop_angle_rad"),
)


def tracks_csv(study: Study) -> str:
    """Every aircraft's faulted flight and its twin's place, one row an instant, SI, the unit in each header.

    Columns are ``<aircraft>_<what>_<unit>``; the healthy twin's are ``twin_<aircraft>_…``. NaN is an empty cell.
    """
    flight, twin = study.faulted, study.healthy
    head: list[str] = ["time_s"]
    data: list[Array] = [flight.time_s]
    for k, name in enumerate(flight.names):
        head += [f"{name}_{axis}_m" for axis in ("north", "east")]
        data += [flight.pos_e_m[:, k, 0], flight.pos_e_m[:, k, 1]]
        head += [f"{name}_height_m", f"{name}_height_above_ground_m"]
        data += [flight.height_m[:, k], flight.height_agl_m[:, k]]
        head += [f"{name}_quat_{part}" for part in "wxyz"]
        data += [flight.quat_eb[:, k, i] for i in range(4)]
        for field, column in _TRACKS:
            head.append(f"{name}_{column}")
            data.append(getattr(flight, field)[:, k])
        head += [f"twin_{name}_{axis}_m" for axis in ("north", "east", "height")]
        for values in (twin.pos_e_m[:, k, 0], twin.pos_e_m[:, k, 1], twin.height_m[:, k]):
            data.append(np.interp(flight.time_s, twin.time_s, values))
    return _csv(head, data)


def margin_csv(study: Study) -> str:
    """Seconds and metres left of every aircraft in the faulted flight, one row an instant; NaN is an empty cell."""
    margin = study.margin
    head: list[str] = ["time_s"]
    data: list[Array] = [margin.time_s]
    for k, name in enumerate(study.faulted.names):
        for over in ("floor", "ground"):
            head += [f"{name}_left_before_last_pull_{over}_s", f"{name}_clearance_{over}_m"]
            data += [getattr(margin, f"seconds_{over}_s")[:, k], getattr(margin, f"clearance_{over}_m")[:, k]]
    return _csv(head, data)


def _csv(head: list[str], data: list[Array]) -> str:
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\n")
    writer.writerow(head)
    # 9 digits: a tenth of a millimetre in 10 km, without printing the noise of the last bits
    writer.writerows(["" if v != v else f"{v:.9g}" for v in row] for row in np.column_stack(data).tolist())
    return out.getvalue()


def verdict_json(study: Study) -> str:
    """The verdict as JSON text with a newline at its end; plain numbers, no NaN (ValueError if there is one)."""
    return json.dumps(study.verdict, ensure_ascii=False, indent=2, allow_nan=False, default=_plain) + "\n"


def _plain(value: object) -> object:
    if isinstance(value, np.generic):
        return value.item()
    if hasattr(value, "items"):  # read-only mappings
        return dict(value.items())
    raise TypeError(f"a verdict can't hold a {type(value).__name__}")


def write_tables(study: Study, folder: str | Path, *, force: bool = False) -> tuple[Path, ...]:
    """Write ``verdict.json``, ``tracks.csv``, ``margin.csv`` and ``table.txt``; returns their paths.

    Raises OutputExists before anything is written if one is there and not ``force``; MachineError on a full disk.
    """
    texts = {
        "verdict.json": verdict_json(study),
        "tracks.csv": tracks_csv(study),
        "margin.csv": margin_csv(study),
        "table.txt": study_table(study),
    }
    paths = tuple(Path(folder) / name for name in texts)
    with ExitStack() as stack:
        # all are written before the first takes its place: a full disk leaves none or the old ones
        parts = [stack.enter_context(whole_file(path, force=force)) for path in paths]
        for part, text in zip(parts, texts.values(), strict=True):
            part.write_text(text, encoding="utf-8", newline="")
    return paths
