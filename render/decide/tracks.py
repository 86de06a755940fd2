"""A team's scatter measured from recordings of its own passes, in the columns of ``tracks.csv``."""

from __future__ import annotations

import csv
import dataclasses
from collections.abc import Sequence
from dataclasses import dataclass
from pathlib import Path

import numpy as np

from render.decide.passes import LATE_TABLE_RAD
from render.errors import LatepullError
from render.frames import Array, quat_conj, quat_rotate
from scenes.model import Scatter, Scene

LEAST = 5  # tracks below which a standard deviation says next to nothing
GRID = 60
UP_RAD: Array = np.linspace(np.radians(25.0), np.radians(140.0), GRID)
DOWN_RAD: Array = np.linspace(np.radians(205.0), np.radians(335.0), GRID)
MEASURED = ("entry_speed_mps", "entry_height_m", "load_factor", "base_m", "station_m")
LEAD = ("lead_height_m", "lead_calibrated_speed_mps", "lead_load_factor", "lead_loop_angle_rad", "lead_north_m",
        "lead_east_m", "lead_quat_w", "lead_quat_x", "lead_quat_y", "lead_quat_z")


@dataclass(frozen=True, slots=True)
class Pass:
    """What one recording says."""

    name: str
    entry_speed_mps: float
    entry_height_m: float
    base_m: float
    load_up: Array  # (GRID,) ln of load factor over the angles of the way up
    load_down: Array  # (GRID,) and of the way down
    places_m: Array  # (S, 3) mean place of each wing in the lead's body axes


def measured_scatter(folder: Path, scene: Scene) -> tuple[Scatter, int]:
    """The scatter of the recordings in a folder (``*.csv``, or ``*/tracks.csv``), and how many there are.

    What a track does not tell (power, wind, attention, reaction) stays as the scene says, or 0. The recordings
    are of passes in which nothing failed; their ``twin_`` columns are not looked at. Raises LatepullError.
    """
    files = sorted({*folder.glob("*.csv"), *folder.glob("*/tracks.csv")}) if folder.is_dir() else []
    if len(files) < LEAST:
        raise LatepullError(f"{folder}: {len(files)} tracks found, wanted at least {LEAST} (*.csv, or */tracks.csv)")
    slots = [slot.name for slot in scene.formation]
    passes, bad = [], []
    for file in files:
        try:
            passes.append(read_pass(file, slots))
        except LatepullError as exc:
            bad.append(str(exc))
    if bad:
        raise LatepullError("\n".join(bad))
    known = scene.scatter or Scatter()
    return dataclasses.replace(known, **_spreads(passes)), len(passes)


def _spreads(passes: Sequence[Pass]) -> dict[str, float]:
    """Standard deviations over the passes (n - 1 in the denominator)."""
    def sd(values: Sequence[float] | Array) -> float:
        return float(np.std(values, ddof=1))

    up = np.array([p.load_up for p in passes])
    down = np.array([p.load_down for p in passes])
    tilt = np.clip((LATE_TABLE_RAD - DOWN_RAD) / (0.5 * np.pi), -1.0, 1.0)
    tilt = tilt - tilt.mean()
    early = (down - down.mean(axis=0)) @ tilt / (tilt @ tilt)
    places = np.array([p.places_m for p in passes])  # (N, S, 3)
    station = float(np.sqrt(np.mean(np.var(places, axis=0, ddof=1)))) if places.size else 0.0
    return {
        "entry_speed_mps": sd([p.entry_speed_mps for p in passes]),
        "entry_height_m": sd([p.entry_height_m for p in passes]), "base_m": sd([p.base_m for p in passes]),
        "load_factor": float(np.sqrt(0.5 * (sd(np.mean(up - up.mean(axis=0), axis=1)) ** 2 + sd(early) ** 2))),
        "station_m": station,
    }


def read_pass(file: Path, slots: Sequence[str]) -> Pass:
    """One recording. Raises LatepullError: columns that are missing, values that are no numbers, no whole loop."""
    wanted = [*LEAD, *(f"{slot}_{axis}_m" for slot in slots for axis in ("north", "east", "height"))]
    table = _columns(file, wanted)
    angle = table["lead_loop_angle_rad"]
    inside = np.flatnonzero(angle > 0.0)
    over = np.flatnonzero(angle >= np.pi)
    if inside.size == 0 or over.size == 0 or angle.max() < DOWN_RAD[-1]:
        raise LatepullError(f"{file}: no whole loop in it: lead_loop_angle_rad goes to {np.nanmax(angle):.2f}, wanted "
                            f"0 to more than {DOWN_RAD[-1]:.2f}")
    entry, top = max(int(inside[0]) - 1, 0), int(over[0])
    rises = np.maximum.accumulate(angle[entry:])
    loads = np.log(np.maximum(table["lead_load_factor"][entry:], 0.05))
    lead = np.column_stack([table["lead_north_m"], table["lead_east_m"], -table["lead_height_m"]])
    quat = np.column_stack([table[f"lead_quat_{c}"] for c in "wxyz"])
    part = slice(entry, None)
    places = []
    for slot in slots:
        own = np.column_stack([table[f"{slot}_north_m"], table[f"{slot}_east_m"], -table[f"{slot}_height_m"]])
        places.append(np.mean(quat_rotate(quat_conj(quat[part]), own[part] - lead[part]), axis=0))
    return Pass(
        str(file), float(table["lead_calibrated_speed_mps"][entry]), float(table["lead_height_m"][entry]),
        float(np.min(table["lead_height_m"][top:])), np.interp(UP_RAD, rises, loads),
        np.interp(DOWN_RAD, rises, loads), np.array(places).reshape(len(slots), 3),
    )


def _columns(file: Path, wanted: Sequence[str]) -> dict[str, Array]:
    """The wanted columns of a CSV file."""
    try:
        with file.open(newline="", encoding="utf-8") as stream:
            reader = csv.reader(stream)
            head = next(reader, [])
            rows = list(reader)
    except (OSError, UnicodeDecodeError) as exc:
        raise LatepullError(f"{file}: can't be read: {exc}") from None
    missing = [name for name in wanted if name not in head]
    if missing:
        raise LatepullError(f"{file}:1: no column {', '.join(missing)}; wanted those of tracks.csv as latepull fly "
                            "writes it")
    if len(rows) < 20:
        raise LatepullError(f"{file}: {len(rows)} rows, wanted a whole pass")
    at = [head.index(name) for name in wanted]
    values = np.empty((len(rows), len(at)))
    for i, row in enumerate(rows):
        try:
            values[i] = [float(row[j]) for j in at]
        except (ValueError, IndexError):
            raise LatepullError(f"{file}:{i + 2}: not a number in one of the columns that are wanted, or too few of "
                                "them") from None
    if not np.all(np.isfinite(values)):
        line = int(np.argmax(~np.all(np.isfinite(values), axis=1))) + 2
        raise LatepullError(f"{file}:{line}: a value that is not finite")
    return {name: values[:, j] for j, name in enumerate(wanted)}
