"""A study saved and loaded (``study.npz`` + ``study.json``), so that a film can be cut again without flying.

The JSON mirrors the frozen types; every array in it is a name that points into the ``.npz``. Both carry
each other's hash, so that a half-copied or mixed folder is refused instead of filmed.
"""

from __future__ import annotations

import hashlib
import json
import math
from collections.abc import Mapping
from contextlib import ExitStack
from dataclasses import fields, is_dataclass
from pathlib import Path
from typing import Any
from zipfile import BadZipFile

import numpy as np

from render import types as render_types
from render.errors import LatepullError
from render.files import output_error, whole_file
from render.frames import Array
from render.types import Study
from scenes import airframe as airframe_types
from scenes import model as scene_types

FORMAT = 1
ARRAYS, TEXT = "study.npz", "study.json"

_TYPES = {
    name: kind
    for module in (render_types, scene_types, airframe_types)
    for name, kind in vars(module).items()
    if isinstance(kind, type) and is_dataclass(kind)
}


class StudyError(LatepullError):
    """A saved study that can't be used: missing, damaged, of another version, or of another scene text."""


class StudyMissing(StudyError):
    """The folder holds no saved study."""


class StudyVersion(StudyError):
    """The study was saved by a version whose files are laid out in another way."""


class StudyChanged(StudyError):
    """The scene's text is no longer the one the study was flown from."""


class StudyDamaged(StudyError):
    """Files that are incomplete, mixed or unreadable."""


def text_hash(scene_text: str) -> str:
    """SHA-256 of a scene's text, hexadecimal."""
    return hashlib.sha256(scene_text.encode("utf-8")).hexdigest()


def save_study(study: Study, folder: str | Path, *, force: bool = True) -> Path:
    """Write a study into a folder, both files or none; returns the folder.

    Raises OutputExists (not ``force``), MachineError (full disk, no permission).
    """
    folder = Path(folder)
    arrays: dict[str, Array] = {}
    body = _to_plain(study, "study", arrays)
    if study.faulted is study.healthy:
        body["faulted"] = {"same": "healthy"}
    with ExitStack() as stack:
        array_part = stack.enter_context(whole_file(folder / ARRAYS, force=force))
        text_part = stack.enter_context(whole_file(folder / TEXT, force=force))
        with array_part.open("wb") as file:
            np.savez(file, allow_pickle=False, **arrays)
        data = {
            "format": FORMAT,
            "scene_text_sha256": text_hash(study.scene_text),
            "arrays_sha256": _file_hash(array_part),
            "study": body,
        }
        text_part.write_text(json.dumps(data, ensure_ascii=False, allow_nan=False), encoding="utf-8")
    return folder


def load_study(folder: str | Path, *, scene_text: str | None = None) -> Study:
    """Read a study back from its folder.

    scene_text: the scene as it is now; if given and not what the study was flown from, StudyChanged is raised.
    Raises StudyMissing, StudyVersion, StudyChanged, StudyDamaged.
    """
    folder = Path(folder)
    for name in (TEXT, ARRAYS):
        if not (folder / name).is_file():
            raise StudyMissing(f"no saved study in {folder}: {name} is missing; run `latepull fly` on the scene first")
    try:
        data = json.loads((folder / TEXT).read_text(encoding="utf-8"))
        found = data["format"]
    except OSError as exc:
        raise output_error(exc, folder) from exc
    except (ValueError, KeyError, TypeError) as exc:
        raise StudyDamaged(f"{folder / TEXT} is not a saved study: {exc}; fly the scene again") from exc
    if found != FORMAT:
        raise StudyVersion(
            f"{folder / TEXT} was saved in format {found!r}, this version reads {FORMAT}; fly the scene again"
        )
    if _file_hash(folder / ARRAYS) != data.get("arrays_sha256"):
        raise StudyDamaged(f"{folder / ARRAYS} does not belong to {folder / TEXT}; fly the scene again")
    try:
        with np.load(folder / ARRAYS, allow_pickle=False) as arrays:
            held = {key: arrays[key] for key in arrays.files}
        for values in held.values():
            values.setflags(write=False)  # also those inside mappings, which no type freezes
        study = _study(data["study"], held)
    except (OSError, ValueError, KeyError, TypeError, AttributeError, BadZipFile) as exc:
        raise StudyDamaged(f"the study in {folder} can't be read back: {exc}; fly the scene again") from exc
    flown = text_hash(study.scene_text)
    if flown != data.get("scene_text_sha256"):
        raise StudyDamaged(f"the scene text inside {folder / TEXT} was altered after the flight; fly the scene again")
    if scene_text is not None and text_hash(scene_text) != flown:
        raise StudyChanged(f"the scene was edited since the study in {folder} was flown; fly it again")
    return study


def _file_hash(path: Path) -> str:
    with path.open("rb") as file:
        return hashlib.file_digest(file, "sha256").hexdigest()


def _study(body: dict[str, Any], arrays: Mapping[str, Array]) -> Study:
    same = body["faulted"].get("same") == "healthy"
    if same:
        body = {**body, "faulted": None}
    study = _from_plain(body, arrays)
    if not isinstance(study, Study):
        raise ValueError("it does not hold a study")
    if not same:
        return study
    parts: dict[str, Any] = {f.name: getattr(study, f.name) for f in fields(study)}
    return Study(**{**parts, "faulted": study.healthy})


def _to_plain(value: Any, path: str, arrays: dict[str, Array]) -> Any:
    """Frozen types to JSON values; arrays go into ``arrays`` under their path."""
    if is_dataclass(value) and not isinstance(value, type):
        parts = {f.name: _to_plain(getattr(value, f.name), f"{path}.{f.name}", arrays) for f in fields(value)}
        return {"type": type(value).__name__, **parts}
    if isinstance(value, np.ndarray):
        arrays[path] = value
        return {"array": path}
    if isinstance(value, np.generic):
        value = value.item()
    if isinstance(value, Mapping):
        return {"map": {str(key): _to_plain(v, f"{path}.{key}", arrays) for key, v in value.items()}}
    if isinstance(value, tuple | list):
        return [_to_plain(v, f"{path}.{i}", arrays) for i, v in enumerate(value)]
    if isinstance(value, float) and not math.isfinite(value):
        return {"float": repr(value)}  # JSON has no NaN and no infinity
    if value is None or isinstance(value, bool | int | float | str):
        return value
    raise TypeError(f"{path} is a {type(value).__name__}, which a saved study can't hold")


def _from_plain(value: Any, arrays: Mapping[str, Array]) -> Any:
    if isinstance(value, list):
        return tuple(_from_plain(v, arrays) for v in value)
    if not isinstance(value, dict):
        return value
    if "array" in value:
        return arrays[value["array"]]
    if "float" in value:
        return float(value["float"])
    if "map" in value:
        return {key: _from_plain(v, arrays) for key, v in value["map"].items()}
    kind = _TYPES[value["type"]]
    return kind(**{key: _from_plain(v, arrays) for key, v in value.items() if key != "type"})
