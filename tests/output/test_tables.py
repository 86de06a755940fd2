"""The table, the CSV files and verdict.json."""

from __future__ import annotations

import csv
import errno
import io
import json
from dataclasses import replace
from pathlib import Path

import numpy as np
import pytest

from render.errors import MachineError, OutputExists
from render.output.tables import margin_csv, study_table, tracks_csv, verdict_json, write_tables
from render.types import Study

TABLE = """\
Right wing, line abreast, stabilator frozen after the top
Floor: 100 ft above the ground, as the scene asks.

The flight without the fault, the lead's gates:
                 height above ground  calibrated speed  load factor
  entry                       295 ft            262 kt        3.9 g
  vertical up               1,926 ft            224 kt        2.9 g
  top                       3,576 ft            185 kt        1.9 g
  vertical down             1,946 ft            224 kt        2.9 g
  bottom                      295 ft            262 kt        3.9 g

Fault: stabilator frozen, 20.8 s from the start, at 2,638 ft above ground, 207 kt, loop angle 245 deg.
The lead meets the ground 6.9 s after the fault.

Slot right: last pull to clear the floor: 2.0 s after the fault; to clear the ground: 2.5 s after the fault.
If nobody acts, it meets the ground 6.9 s after the fault.
  observer  notices                by              reaction  against the last pull  lowest point if he breaks out then
  early     1.5 s after the fault  horizon's tilt  0.8 s     too late by 0.3 s      59 ft below the floor
  likely    2.6 s after the fault  ground closing  1.5 s     too late by 2.1 s      meets the ground, 313 ft short
  late      never noticed          -               3.0 s     -                      -
"""


def test_table_of_a_faulted_scene(study: Study) -> None:
    text = study_table(study)
    assert text.startswith(TABLE), text
    assert "training illustration, not a clearance" in text.splitlines()[-1]
    assert "safe" not in text.lower()


def test_table_without_a_fault(healthy_study: Study) -> None:
    text = study_table(healthy_study)
    assert "No fault in this scene." in text
    assert "Slot left: last pull to clear the floor: does not run out; to clear the ground: does not run out." in text


def test_tracks_hold_the_flight_in_si(study: Study) -> None:
    rows = list(csv.DictReader(io.StringIO(tracks_csv(study))))
    flight = study.faulted
    assert len(rows) == len(flight.time_s)
    row = rows[200]
    assert float(row["time_s"]) == pytest.approx(flight.time_s[200], rel=1e-8)
    assert float(row["right_height_m"]) == pytest.approx(flight.height_m[200, 1], rel=1e-8)
    assert float(row["lead_loop_angle_rad"]) == pytest.approx(flight.loop_angle_rad[200, 0], rel=1e-8)
    assert row["left_loop_angle_rad"] == ""
    assert float(row["twin_left_east_m"]) == pytest.approx(study.healthy.pos_e_m[200, 2, 1], rel=1e-8)


def test_margins_read_back(study: Study) -> None:
    rows = list(csv.DictReader(io.StringIO(margin_csv(study))))
    got = np.array([float(row["right_left_before_last_pull_floor_s"]) for row in rows])
    np.testing.assert_allclose(got, study.margin.seconds_floor_s[:, 1], atol=1e-6)
    assert set(rows[0]) >= {"lead_clearance_ground_m", "left_clearance_floor_m"}


def test_verdict_is_plain_json(study: Study) -> None:
    odd = replace(study, verdict={**study.verdict, "n": np.float64(1.5), "none": None})
    assert json.loads(verdict_json(odd)) == {**study.verdict, "n": 1.5, "none": None}
    with pytest.raises(ValueError, match="JSON"):
        verdict_json(replace(study, verdict={"n": float("nan")}))


def test_tables_are_kept_unless_forced(study: Study, tmp_path: Path) -> None:
    paths = write_tables(study, tmp_path)
    assert sorted(p.name for p in tmp_path.iterdir()) == ["margin.csv", "table.txt", "tracks.csv", "verdict.json"]
    paths[1].unlink()
    with pytest.raises(OutputExists, match=r"verdict\.json is already there and is kept; give --force"):
        write_tables(study, tmp_path)
    assert not paths[1].exists(), "nothing may be written when one is refused"
    write_tables(study, tmp_path, force=True)
    assert paths[1].exists()


def test_a_disk_that_fills_leaves_no_table(study: Study, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    whole = Path.write_text

    def full(self: Path, text: str, **options: str) -> int:
        if "margin" in self.name:
            raise OSError(errno.ENOSPC, "No space left on device")
        return whole(self, text, **options)

    monkeypatch.setattr(Path, "write_text", full)
    with pytest.raises(MachineError, match="is full"):
        write_tables(study, tmp_path)
    assert list(tmp_path.iterdir()) == []
