"""The shipped airframes for tests of what is drawn, read without the scene reader's checks."""

from __future__ import annotations

from dataclasses import MISSING, fields
from pathlib import Path

import yaml

import scenes
from scenes.airframe import Airframe

FILES = {"jet": "jet_trainer", "turboprop": "turboprop_trainer", "piston": "aerobatic_two_seater"}


def airframe(shape: str, **changed: float) -> Airframe:
    """A shipped airframe whose lengths are in metres in its file; figures that are not drawn are set to one."""
    folder = Path(scenes.__file__).parent / "airframes"
    read = yaml.safe_load((folder / f"{FILES[shape]}.yaml").read_text())
    values: dict[str, object] = {}
    for f in fields(Airframe):
        key = f.name.removesuffix("_m")
        if f.name in ("eye_forward_m", "eye_up_m", "length_m", "wing_span_m", "chord_m"):
            values[f.name] = float(read[key].split()[0])
        elif f.name in ("name", "title", "shape", "invented"):
            values[f.name] = read.get(f.name, FILES[shape])
        elif f.default is MISSING:
            values[f.name] = 1.0
    values.update(changed)
    return Airframe(**values)  # type: ignore[arg-type]
