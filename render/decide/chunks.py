"""Long work in chunks that are kept as they finish: estimated first, interrupted and gone on with later.

The folder of unfinished work holds ``work.json`` (what is being worked on, by hash) and one file for each
finished chunk. It goes when all is done.
"""

from __future__ import annotations

import hashlib
import json
import os
import shutil
from collections.abc import Callable, Iterator, Mapping, Sequence
from dataclasses import dataclass, fields
from pathlib import Path
from typing import Any
from zipfile import BadZipFile

import numpy as np

from render.decide.cases import CHUNK, Cases, join
from render.decide.runner import Runner, marks
from render.decide.values import Common, work_values
from render.errors import LatepullError
from render.files import output_error, whole_file

# Measured on two cores of a shared server (tests/benchmarks): time of a case with two wings, memory.
CASE_S, OWN_TWIN_S = 0.026, 0.11  # core seconds; the second where each case closes and flies its own twin
CHUNK_BYTES, CASE_BYTES = 700e6, 1200.0  # while a chunk is worked on, and kept of each case
MOST_S, MOST_BYTES, MOST_CASES = 3600.0, 4e9, 200_000

Progress = Callable[[int, int], None]


class WorkChanged(LatepullError):
    """Unfinished work belongs to another scene text, grid or version of the program."""


class WorkUnfinished(LatepullError):
    """Finished chunks of the same work are there, and neither ``--resume`` nor ``--force`` was given."""


class TooMuch(LatepullError):
    """More work than a slip of the pen should start."""


@dataclass(frozen=True, slots=True)
class Estimate:
    """What some cases will take on this machine, roughly."""

    cases: int
    seconds: float
    memory_bytes: float

    def words(self) -> str:
        """``3,100 cases, about 1 min on 2 cores, 0.7 GB``."""
        return f"{self.cases:,} cases, about {span(self.seconds)} on {cores()} cores, {self.memory_bytes / 1e9:.1f} GB"


def cores() -> int:
    """Cores this process may use."""
    return len(os.sched_getaffinity(0)) if hasattr(os, "sched_getaffinity") else os.cpu_count() or 1


def span(seconds: float) -> str:
    """A time in words: ``40 s``, ``12 min``, ``3.5 h``."""
    if seconds < 90.0:
        return f"{max(seconds, 1.0):.0f} s"
    return f"{seconds / 60.0:.0f} min" if seconds < 5400.0 else f"{seconds / 3600.0:,.1f} h"


def estimate(cases: int, own_twins: bool, wings: int) -> Estimate:
    """Time and memory of so many cases; own_twins: something else than the fault differs between them."""
    each = (OWN_TWIN_S if own_twins else CASE_S) * (1.0 + wings) / 3.0
    return Estimate(cases, cases * each / cores(), CHUNK_BYTES * (1.0 + wings) / 3.0 + cases * CASE_BYTES)


def refuse_too_much(expected: Estimate, *, force: bool) -> None:
    """Raise TooMuch above the limits, unless forced."""
    over = [
        words for words, is_over in (
            (f"more than {MOST_CASES:,} cases", expected.cases > MOST_CASES),
            (f"longer than {span(MOST_S)}", expected.seconds > MOST_S),
            (f"more than {MOST_BYTES / 1e9:.0f} GB", expected.memory_bytes > MOST_BYTES),
        ) if is_over
    ]
    if over and not force:
        raise TooMuch(f"this is {expected.words()}: {', '.join(over)}. Take coarser steps, or give --force-size")


def work_hash(scene_text: str, values: Any) -> str:
    """SHA-256 over a scene's text, what is worked on, and versions and source of the program."""
    body = json.dumps([scene_text, values, marks()], sort_keys=True, default=str)
    return hashlib.sha256(body.encode()).hexdigest()


@dataclass(frozen=True, slots=True)
class Folder:
    """Where unfinished work is kept."""

    path: Path
    key: str
    chunks: int | None  # None: nobody knows yet, as in a search

    def begin(self, *, resume: bool, force: bool) -> set[int]:
        """Make the folder or take over what is in it; returns the numbers of the chunks that are finished.

        Raises WorkUnfinished, WorkChanged, MachineError.
        """
        note = self.path / "work.json"
        found = _read(note)
        if found is not None and not force:
            done = {int(p.stem) for p in self.path.glob("[0-9]*.npz")}
            if found.get("key") != self.key or found.get("chunks") != self.chunks:
                if resume or done:
                    raise WorkChanged(
                        f"{self.path} holds unfinished work ({_some(len(done), found.get('chunks'))}) of another "
                        "scene text, grid or version; --force starts again and drops it"
                    )
            elif not resume and done:
                raise WorkUnfinished(f"{self.path} holds {_some(len(done), self.chunks)} of this work; --resume goes "
                                     "on from them, --force starts again")
            elif resume:
                return done
        self.drop()
        try:
            self.path.mkdir(parents=True, exist_ok=True)
        except OSError as exc:
            raise output_error(exc, self.path) from exc
        with whole_file(note, force=True) as part:
            part.write_text(json.dumps({"key": self.key, "chunks": self.chunks}), encoding="utf-8")
        return set()

    def save(self, number: int, cases: Cases) -> None:
        """Keep a finished chunk, whole or not at all."""
        with whole_file(self.path / f"{number:06d}.npz", force=True) as part, part.open("wb") as file:
            np.savez(file, allow_pickle=False, **columns_of(cases))

    def load(self, number: int) -> Cases:
        """A finished chunk. Raises WorkChanged if the file is damaged."""
        path = self.path / f"{number:06d}.npz"
        try:
            with np.load(path, allow_pickle=False) as data:
                return cases_of(data)
        except (OSError, ValueError, KeyError, BadZipFile) as exc:
            raise WorkChanged(f"{path} is damaged ({exc}); delete it and give --resume again") from exc

    def drop(self) -> None:
        """Remove the folder."""
        shutil.rmtree(self.path, ignore_errors=True)


def _some(done: int, chunks: Any) -> str:
    return f"{done} finished chunks" if chunks is None else f"{done} of {chunks} chunks"


def _read(note: Path) -> dict[str, Any] | None:
    try:
        found = json.loads(note.read_text(encoding="utf-8"))
    except (OSError, ValueError):
        return None
    return found if isinstance(found, dict) else None


def columns_of(cases: Cases) -> dict[str, Any]:
    """The columns as plain arrays, for a file; an error that is none as an empty text."""
    columns = {f.name: getattr(cases, f.name) for f in fields(cases)}
    return {**columns, "names": np.array(cases.names, dtype=np.str_),
            "error": np.array([e or "" for e in cases.error], dtype=np.str_)}


def cases_of(columns: Mapping[str, Any]) -> Cases:
    """The table from such arrays."""
    found = {f.name: columns[f.name] for f in fields(Cases)}
    found["names"] = tuple(str(n) for n in found["names"])
    found["error"] = tuple(str(e) or None for e in found["error"])
    return Cases(**found)


def work_in_chunks(
    common: Common, values: Sequence[Mapping[str, float]], runner: Runner, folder: Folder, *, resume: bool = False,
    force: bool = False, chunk: int = CHUNK, progress: Progress | None = None,
) -> Cases:
    """Work through many changes of a scene, keeping each chunk as it finishes; the folder goes when all are there.

    The folder's number of chunks must be that of ``chunk_count``. Ctrl-C leaves the finished ones.
    """
    done = folder.begin(resume=resume, force=force)
    pieces = [values[at : at + chunk] for at in range(0, len(values), chunk)]
    finished = sum(len(pieces[i]) for i in done)
    if progress is not None:
        progress(finished, len(values))
    for number, cases in _run(runner, common, pieces, done):
        folder.save(number, cases)
        finished += len(cases)
        if progress is not None:
            progress(finished, len(values))
    table = join([folder.load(i) for i in range(len(pieces))])
    folder.drop()
    return table


def _run(
    runner: Runner, common: Common, pieces: Sequence[Any], done: set[int]
) -> Iterator[tuple[int, Cases]]:
    todo = [(i, piece) for i, piece in enumerate(pieces) if i not in done]
    return runner.run(work_values, common, todo)


def chunk_count(cases: int, chunk: int = CHUNK) -> int:
    """How many chunks so many cases make."""
    return -(-cases // chunk)
