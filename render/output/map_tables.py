"""The map as files and text: ``map.csv`` (tidy), ``map.npz``, ``map.txt``, the chart, and a summary for a program."""

from __future__ import annotations

import csv
import io
import json
from contextlib import ExitStack
from pathlib import Path
from textwrap import wrap
from typing import Any

import numpy as np

from render.decide.cases import CUES
from render.decide.map import Map, Outcome, columns, same_slots
from render.decide.map_words import map_sentences, own_row
from render.decide.runner import marks
from render.files import claim_output, whole_file
from render.output.map_chart import LEGEND, axis_words, reading, write_map_chart
from render.output.words import CAUTION
from render.types import OBSERVERS

NAMES = {o: o.name.lower() for o in Outcome}
LETTERS = {Outcome.UNKNOWN: "?", Outcome.CLEARS: ".", Outcome.ALL_IN_TIME: "3", Outcome.LIKELY_IN_TIME: "2",
           Outcome.EARLY_IN_TIME: "1", Outcome.TOO_LATE: "#"}
COLUMNS = 100
FILES = ("map.csv", "map.npz", "map.txt")


def map_csv(found: Map) -> str:
    """One row for each point, slot and observer; the unit in each header; nothing where there is nothing."""
    out = io.StringIO()
    write = csv.writer(out, lineterminator="\n")
    write.writerow([
        found.x.name, found.y.name, "slot", "observer", "outcome", "fault_s", "contact_s", "lead_contact_s",
        "lowest_height_above_ground_m", "last_pull_floor_s", "last_pull_ground_s", "noticed_s", "cue", "reaction_s",
        "lateness_s", "clearance_above_floor_m", "clearance_above_ground_m", "error",
    ])
    c = found.cases
    xs, ys = found.x.shown(), found.y.shown()
    for b, why in enumerate(c.error):
        x, y = f"{xs[b // len(ys)]:.10g}", f"{ys[b % len(ys)]:.10g}"
        for k, slot in enumerate(c.names):
            outcome = NAMES[Outcome(int(found.outcome[b // len(ys), b % len(ys), k]))]
            own = [c.fault_s[b], c.contact_s[b, k + 1], c.contact_s[b, 0], c.lowest_m[b, k + 1],
                   c.last_pull_floor_s[b, k], c.last_pull_ground_s[b, k]]
            for o, observer in enumerate(OBSERVERS):
                cue = int(c.cue[b, k, o])
                seen = [c.reaction_s[o], c.lateness_s[b, k, o], c.clearance_floor_m[b, k, o],
                        c.clearance_ground_m[b, k, o]]
                write.writerow([x, y, slot, observer, outcome, *map(_cell, own), _cell(c.notice_s[b, k, o]),
                                CUES[cue] if cue >= 0 else "", *map(_cell, seen), why or ""])
    return out.getvalue()


def _cell(value: float) -> str:
    # 12 digits, so that a cell can be compared with a flight of the same scene
    return "" if np.isnan(value) else f"{value:.12g}"


def map_text(found: Map) -> str:
    """The sentences, and each group of slots as letters, for a terminal."""
    lines = [found.scene.title, ""]
    for names, own, whole in map_sentences(found):
        lines += [*wrap(f"{names}: {own}", COLUMNS), *wrap(whole, COLUMNS), ""]
    for group in same_slots(found):
        names = " and ".join(found.cases.names[k] for k in group)
        lines += [names, f"  up: {axis_words(found.y)}", f"  right: {axis_words(found.x)}", *_letters(found, group[0]),
                  ""]
    used = [o for o in LETTERS if np.any(found.outcome == o)]
    lines += [f"  {LETTERS[o]}  {LEGEND[o].replace(chr(10), ' ')}" for o in used]
    return "\n".join([*lines, "", *wrap(reading_text(found), COLUMNS), CAUTION]) + "\n"


def reading_text(found: Map) -> str:
    """What the map rests on, without what is said of the chart's numbers."""
    text = reading(found)
    return text[text.index("Floor "):]


def _letters(found: Map, slot: int) -> list[str]:
    nx, ny = found.shape
    wide = max(len(f"{v:.6g}") for v in found.y.shown())
    own = own_row(found)
    rows = []
    for j in reversed(range(ny)):
        mark = ">" if j == own and found.here[1] is not None else " "
        cells = " ".join(LETTERS[Outcome(int(v))] for v in found.outcome[:, j, slot])
        rows.append(f"  {found.y.shown()[j]:>{wide}.6g}{mark} {cells}")
    first, last = f"{found.x.shown()[0]:.6g}", f"{found.x.shown()[-1]:.6g}"
    gap = max(2 * nx - 1 - len(first) - len(last), 1)
    rows.append(f"  {'':>{wide}}  {first}{' ' * gap}{last}")
    return rows


def summary(found: Map) -> dict[str, Any]:
    """The map's words and counts, for ``--json``."""
    counts = {
        slot: {NAMES[o]: int(np.count_nonzero(found.outcome[..., k] == o)) for o in Outcome}
        for k, slot in enumerate(found.cases.names)
    }
    words = [{"slots": names, "sentences": [own, whole]} for names, own, whole in map_sentences(found)]
    return {"scene": found.scene.name, "x": found.x.name, "y": found.y.name, "cells": len(found.cases), "words": words,
            "counts": counts, "caution": CAUTION}


def write_map(found: Map, folder: Path, *, force: bool = False) -> tuple[Path, ...]:
    """Write ``map.csv``, ``map.npz``, ``map.txt`` and the chart into a folder; returns their paths.

    Raises OutputExists before anything is written, MachineError on a full disk.
    """
    charts = [folder / f"map{suffix}" for suffix in (".png", ".pdf", ".svg")]
    for path in (*(folder / name for name in FILES), *charts):
        claim_output(path, force=force)
    with ExitStack() as stack:
        table, arrays, text = (stack.enter_context(whole_file(folder / name, force=force)) for name in FILES)
        table.write_text(map_csv(found), encoding="utf-8", newline="")
        text.write_text(map_text(found), encoding="utf-8", newline="")
        notes = {"x": found.x.path, "y": found.y.path, "slots": found.cases.names, "observers": OBSERVERS, "cues": CUES,
                 "outcomes": {str(int(o)): NAMES[o] for o in Outcome}, "versions": marks(), "caution": CAUTION,
                 "units": "SI and radians"}
        with arrays.open("wb") as file:
            np.savez(file, allow_pickle=False, notes=np.array(json.dumps(notes)), **columns(found))
    return (*(folder / name for name in FILES), *write_map_chart(found, folder / "map", force=force))
