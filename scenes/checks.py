"""Faults that show only when several values of a scene are seen together."""

from __future__ import annotations

from collections.abc import Mapping
from dataclasses import dataclass

from scenes.airframe import Airframe
from scenes.model import Scene


@dataclass(frozen=True, slots=True)
class Finding:
    """A fault at a dotted path."""

    path: str
    read: str
    wanted: str
    nearest: str | None = None


def scene_findings(scene: Scene, frames: Mapping[str, Airframe]) -> list[Finding]:
    """What is wrong with a scene whose single values are right; frames: its airframes by name, those that read."""
    return []


def airframe_findings(airframe: Airframe) -> list[Finding]:
    """What is wrong with an airframe whose single values are right."""
    return []
