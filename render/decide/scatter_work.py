"""The work of a scatter study: what all passes share, worked out first, and chunks of passes for a runner."""

from __future__ import annotations

from collections.abc import Callable, Iterator, Mapping
from dataclasses import dataclass
from pathlib import Path
from typing import Any
from zipfile import BadZipFile

import numpy as np

from render.decide.cases import Cases, join, work_cases
from render.decide.chunks import Folder, WorkChanged, cases_of, columns_of
from render.decide.known import PassEvidence, calibrate, known_in_passes, with_technique
from render.decide.passes import OWN, draw, pass_scenes
from render.decide.runner import Local, Runner
from render.decide.technique import healthy_evidence, technique_scatter
from render.decide.values import Common, common_of
from render.errors import LatepullError
from render.files import whole_file
from render.frames import Array
from render.sight.evidence import Evidence
from scenes.airframe import Airframe
from scenes.model import Scatter, Scene
from terrain.ground import Ground

TECHNIQUE_PASSES = 60  # healthy passes that a team's technique scatter is taken from
CHUNK = 64

Piece = tuple[int, int]
"""The first pass and how many."""


@dataclass(frozen=True, slots=True)
class PassWork:
    """What all passes of a study share."""

    common: Common
    scatter: Scatter
    seed: int
    measured: bool  # the scatter is from recordings: its technique stands in place of the table's guesses
    technique: tuple[Mapping[str, float], ...]  # of each slot: cue -> one sigma
    bound: tuple[float, ...]  # of each slot: the evidence at which he knows
    false_alarms: tuple[float, ...]


def prepare(
    scene: Scene, scatter: Scatter, airframe_of: Callable[[str], Airframe], ground: Ground, seed: int, *,
    measured: bool = False, technique: bool = True,
) -> PassWork:
    """Work out technique and bounds of a study. technique: whether the team's own is, or the table's guesses stand.

    Raises LatepullError for a scene without a fault or without wings, or one that can't be flown as it is.
    """
    if scene.briefed is not None or scene.fault is None:
        raise LatepullError(f"'{scene.name}' has no fault: a scatter study asks in how many passes one is known "
                            "in time")
    if not scene.formation:
        raise LatepullError(f"'{scene.name}' has no wing pilots")
    nominal = work_cases([scene], airframe_of, ground)
    if nominal.error[0] is not None:
        raise LatepullError(nominal.error[0])
    slots, scale = len(scene.formation), float(nominal.loop_scale[0])
    own: tuple[Mapping[str, float], ...] = tuple({} for _ in range(slots))
    if technique and scatter != Scatter():
        passes = pass_scenes(scene, scatter, draw(TECHNIQUE_PASSES, slots, seed))
        own = technique_scatter(scene, scale, passes, float(nominal.fault_s[0]), airframe_of, ground)
    bounds = []
    for k, (time_s, evidence) in enumerate(healthy_evidence(scene, scale, airframe_of, ground)):
        bounds.append(calibrate(PassEvidence(time_s, with_technique(evidence, own[k], measured=measured)), seed, k))
    return PassWork(common_of(scene, airframe_of, ground), scatter, seed, measured, own,
                    tuple(b for b, _ in bounds), tuple(a for _, a in bounds))


def work_passes(work: PassWork, piece: Piece) -> tuple[Cases, Array]:
    """Fly a chunk of passes: their cases, and when each wing pilot knew, s from the start of the pass, (n, S).

    A pure function, for a runner. Infinity: never.
    """
    first, count = piece
    common = work.common
    slots = len(common.scene.formation)
    draws = draw(count, slots, work.seed, first)
    kept: dict[tuple[int, int], PassEvidence] = {}

    def sink(case: int, aircraft: int, time_s: Array, evidence: Evidence) -> None:
        if aircraft > 0:
            k = aircraft - 1
            kept[case, k] = _trimmed(time_s, with_technique(evidence, work.technique[k], measured=work.measured))

    cases = work_cases(pass_scenes(common.scene, work.scatter, draws), common.airframes.__getitem__, common.ground,
                       chunk=count, threads=common.threads, sink=sink)
    known = np.empty((count, slots))
    for k in range(slots):
        # less attention is more noise
        noise = np.exp(work.scatter.attention * draws.own[:, k, OWN.index("attention")])
        known[:, k] = known_in_passes([kept.get((i, k)) for i in range(count)], range(first, first + count),
                                      work.bound[k], noise, work.seed, k)
    return cases, known


def _trimmed(time_s: Array, e: Evidence) -> PassEvidence:
    """Evidence up to the last instant at which any cue can be had, so that it doesn't depend on its chunk."""
    any_there = np.flatnonzero(np.any(e.there, axis=0))
    n = int(any_there[-1]) + 1 if any_there.size else 0
    return PassEvidence(time_s[:n].copy(), Evidence(
        e.names, e.difference[:, :n].copy(), e.sigma[..., :n].copy(), e.technique[:, :n].copy(),
        e.there[:, :n].copy(), e.time_to_ground_s[:n].copy()))


def fly_passes(
    work: PassWork, passes: int, *, run: Runner | None = None, folder: Folder | None = None, chunk: int = CHUNK,
    resume: bool = False, force: bool = False, progress: Callable[[int, int], None] | None = None,
) -> tuple[Cases, Array]:
    """Fly so many passes here or on a cluster; with a folder each finished chunk is kept until all are there.

    The folder's number of chunks is that of ``chunks.chunk_count``. Returns cases (N) and when each knew (N, S).
    """
    pieces = [(at, min(chunk, passes - at)) for at in range(0, passes, chunk)]
    found: dict[int, tuple[Cases, Array]] = {}
    if folder is not None:
        for i in sorted(folder.begin(resume=resume, force=force)):
            found[i] = _load(folder.path / f"{i:06d}.npz")
    done = sum(pieces[i][1] for i in found)
    if progress is not None:
        progress(done, passes)
    for number, result in _todo(run or Local(), work, pieces, found):
        found[number] = result
        if folder is not None:
            _save(folder.path / f"{number:06d}.npz", *result)
        done += pieces[number][1]
        if progress is not None:
            progress(done, passes)
    if folder is not None:
        folder.drop()
    parts = [found[i] for i in range(len(pieces))]
    return join([c for c, _ in parts]), np.concatenate([k for _, k in parts])


def _todo(run: Runner, work: PassWork, pieces: list[Piece], found: Mapping[int, Any]) -> Iterator[tuple[int, Any]]:
    return run.run(work_passes, work, [(i, piece) for i, piece in enumerate(pieces) if i not in found])


def _save(path: Path, cases: Cases, known_s: Array) -> None:
    with whole_file(path, force=True) as part, part.open("wb") as file:
        np.savez(file, allow_pickle=False, known_s=known_s, **columns_of(cases))


def _load(path: Path) -> tuple[Cases, Array]:
    try:
        with np.load(path, allow_pickle=False) as data:
            return cases_of(data), data["known_s"]
    except (OSError, ValueError, KeyError, BadZipFile) as exc:
        raise WorkChanged(f"{path} is damaged ({exc}); delete it and give --resume again") from exc
