"""JSON Schema (2020-12) of the scene and airframe files, made from the declarations of their types."""

from __future__ import annotations

import re
from collections.abc import Mapping
from typing import Any

from scenes import shelf
from scenes.airframe import Airframe
from scenes.build import MAX_SLOTS, MAX_STEPS, declared
from scenes.model import FAULT_KINDS, GOING, POINTS, REQUIRED, STEPS, Fault, Level, Scene, Slot
from scenes.rules import KNOTS, meta_of
from scenes.units import DIMENSIONS, range_text
from terrain.ground import ground_names

Json = dict[str, Any]
NUMBER = r"[+-]?([0-9]+(\.[0-9]*)?|\.[0-9]+)([eE][+-]?[0-9]+)?"
DIALECT = "https://json-schema.org/draft/2020-12/schema"
NONE: Json = {"const": "none"}


def scene_schema() -> Json:
    """The scene file. A file that builds on another (``like:``) need not give everything."""
    properties = {"like": {"type": "string", "description": "the scene this one builds on: a shipped name or a path"}}
    whole = {key: _of_scene(key, partly=False) for key in declared(Scene)}
    partly = {key: _of_scene(key, partly=True) for key in declared(Scene)}
    needed = [key for key, f in declared(Scene).items() if f.metadata["absent"] is REQUIRED
              and key not in ("fault",)]
    return {
        "$schema": DIALECT, "title": "latepull scene", "type": "object",
        "properties": {**properties, **{key: {} for key in whole}}, "additionalProperties": False,
        "if": {"required": ["like"], "properties": {"like": {"not": NONE}}},
        "then": {"properties": partly},
        "else": {"properties": whole, "required": needed},
        "$defs": {dim: _dimension(dim) for dim in DIMENSIONS},
    }


def airframe_schema() -> Json:
    """The airframe file."""
    like = {"type": "string", "description": "the airframe this one builds on: a shipped name or a path"}
    schema = _part(Airframe, partly=False)
    needed = schema.pop("required")
    schema["properties"]["like"] = like
    return {"$schema": DIALECT, "title": "latepull airframe", **schema,
            "if": {"required": ["like"]}, "then": {}, "else": {"required": needed},
            "$defs": {dim: _dimension(dim) for dim in DIMENSIONS}}


def _dimension(dim: str) -> Json:
    """A number with its unit, as text; a bare number where that will do."""
    d = DIMENSIONS[dim]
    if dim == "count":
        return {"type": "integer"}
    units = "|".join(re.escape(u).replace(r"\ ", " ") for u in d.units if u)
    tail = rf"(\s*({units}))" if units else ""
    text: Json = {"type": "string", "pattern": rf"^\s*{NUMBER}{tail}{'?' if d.bare and tail else ''}\s*$"}
    if not d.bare:
        return {**text, "description": d.words, "examples": [d.example]}
    return {"anyOf": [{"type": "number"}, text], "description": d.words}


def _number(meta: Mapping[str, Any]) -> Json:
    dim, lo, hi = meta["dim"], meta["lo"], meta["hi"]
    schema: Json = {"$ref": f"#/$defs/{dim}"}
    if DIMENSIONS[dim].bare:  # for text with a unit the range can't be said in a schema; the reader says it
        schema |= {key: limit for key, limit in (("minimum", lo), ("maximum", hi)) if abs(limit) != float("inf")}
    return schema


def _range_words(meta: Mapping[str, Any]) -> str:
    dim = {"time_or_never": "time", "time_or_none": "time"}.get(meta["dim"], meta["dim"])
    if dim not in DIMENSIONS or (abs(meta["lo"]) == float("inf") and abs(meta["hi"]) == float("inf")):
        return ""
    unit = next((u for u in ("ft", "kt", "deg", "deg/s", "degC", "g") if u in DIMENSIONS[dim].units),
                DIMENSIONS[dim].si)
    return f" ({range_text(dim, meta['lo'], meta['hi'], unit)})"


def _value(meta: Mapping[str, Any], *, partly: bool) -> Json:
    """One declared value, with its description."""
    dim = meta["dim"]
    schema: Json
    if dim in DIMENSIONS:
        schema = _number(meta)
    elif dim == "part":
        schema = _part(meta["part"], partly=partly)
    else:
        schema = _special(meta)
    if meta["absent"] is not REQUIRED and dim != "text":
        schema = {"anyOf": [schema, NONE]}
    words = f"{meta['doc']}{_range_words(meta)}"
    return {**schema, "description": words, **({"examples": [meta["example"]]} if meta["example"] else {})}


def _special(meta: Mapping[str, Any]) -> Json:
    part = {"$ref": "#/$defs/fraction", "minimum": 0, "maximum": 1}
    time: Json = {"$ref": "#/$defs/time"}
    elevation = {"type": "string", "pattern": r"\.([aA][sS][cC]|[hH][gG][tT]|[nN][pP][zZ]|[tT][iI][fF][fF]?)(@.*)?$"}
    path = {"type": "string", "pattern": r"/|\\|\.[yY][aA]?[mM][lL]$"}
    rules: dict[str, Json] = {
        "text": {"type": "string", "minLength": 1},
        "word": {"enum": list(meta["choices"])},
        "flag": {"type": "boolean"},
        "power": {"anyOf": [{"enum": ["full", "idle", "held"]}, part]},
        "time_or_never": {"anyOf": [{"const": "never"}, time]},
        "time_or_none": {"anyOf": [NONE, time]},
        "engines": {"anyOf": [{"const": "all"}, {"type": "integer", "minimum": 1, "maximum": 4}]},
        "ground": {"anyOf": [{"enum": list(ground_names())}, elevation]},
        "airframe": {"anyOf": [{"enum": list(shelf.names("airframe"))}, path]},
        "seat": {"type": "string"},
        "size": {"type": "string", "pattern": r"^[0-9]{2,5}[02468]x[0-9]{1,5}[02468]$"},
        "point": _point(),
        "loop_table": {"type": "object", "minProperties": KNOTS[0], "maxProperties": KNOTS[1],
                       "propertyNames": {"pattern": rf"^{NUMBER}$"},
                       "additionalProperties": _number(meta_of("load_factor", meta["lo"], meta["hi"]))},
    }
    return rules[meta["dim"]]


def _point() -> Json:
    alternatives = []
    for kind, (dim, lo, hi, doc) in POINTS.items():
        properties: Json = {kind: {**_number(meta_of(dim, lo, hi)), "description": doc}}
        if kind == "height":
            properties["going"] = {"enum": list(GOING)}
        alternatives.append({"type": "object", "properties": properties, "required": [kind],
                             "additionalProperties": False})
    return {"oneOf": alternatives}


def _part(cls: type, *, partly: bool, needed: tuple[str, ...] = ()) -> Json:
    """A declared type; partly: as it stands in a file that builds on another, where nothing is required."""
    keys = declared(cls)
    required = [k for k, f in keys.items() if f.metadata["absent"] is REQUIRED or k in needed]
    return {
        "type": "object", "additionalProperties": False,
        "properties": {key: _value(f.metadata, partly=partly) for key, f in keys.items()},
        **({} if partly or not required else {"required": required}),
    }


def _fault(*, partly: bool) -> Json:
    schema = _part(Fault, partly=partly)
    kinds = [{"const": kind, "description": doc} for kind, doc in FAULT_KINDS.items()]
    schema["properties"]["kind"] = {"oneOf": kinds, "description": "what fails"}
    cases = []
    for kind in FAULT_KINDS:
        own = [k for k, f in declared(Fault).items() if kind in f.metadata["kinds"]]
        others = [k for k, f in declared(Fault).items() if f.metadata["kinds"] and kind not in f.metadata["kinds"]]
        then: Json = {"properties": {key: False for key in others}}
        if own and not partly:
            then["required"] = own
        cases.append({"if": {"properties": {"kind": {"const": kind}}, "required": ["kind"]}, "then": then})
    return {"anyOf": [NONE, {**schema, "allOf": cases}]}


def _of_scene(key: str, *, partly: bool) -> Json:
    meta = declared(Scene)[key].metadata
    doc = {"description": meta["doc"]}
    if key in ("script", "briefed"):
        steps = [{"type": "object", "properties": {name: _part(cls, partly=False)}, "required": [name],
                  "additionalProperties": False} for name, cls in STEPS.items()]
        first = {"type": "object", "required": ["level"], "additionalProperties": False,
                 "properties": {"level": _part(Level, partly=False, needed=("speed", "height", "heading"))}}
        script: Json = {"type": "array", "minItems": 1, "maxItems": MAX_STEPS, "prefixItems": [first],
                        "items": {"oneOf": steps}}
        return {**script, **doc} if key == "script" else {"anyOf": [NONE, script], **doc}
    if key == "formation":
        return {"type": "object", "maxProperties": MAX_SLOTS,
                "propertyNames": {"pattern": r"^[^\s0-9.:/\\-][^\s.:/\\-]{0,23}$", "not": {"const": "lead"}},
                "additionalProperties": {"anyOf": [_part(Slot, partly=partly), NONE]}, **doc}
    if key == "fault":
        return {**_fault(partly=partly), **doc}
    return _value(meta, partly=partly)
