"""Where scenes and airframes are found: the shipped ones by name, others by path."""

from __future__ import annotations

import os
from pathlib import Path

from scenes.complaint import Log, Mark, any_of, nearest, shown

SHIPPED = Path(__file__).parent
FOLDERS = {"scene": SHIPPED, "airframe": SHIPPED / "airframes"}


def names(kind: str) -> tuple[str, ...]:
    """Names of the shipped scenes or airframes."""
    return tuple(sorted(path.stem for path in FOLDERS[kind].glob("*.yaml")))


def is_path(text: str) -> bool:
    """Whether a name is meant as a path: it has a separator or ends as a YAML file does."""
    return "/" in text or os.sep in text or text.lower().endswith((".yaml", ".yml"))


def find(kind: str, text: str, beside: Path | None, mark: Mark, path: str, log: Log) -> Path | None:
    """The file of a shipped name or of a path relative to ``beside`` (None: where the command runs).

    Notes a complaint at the mark and returns None if there is none.
    """
    if not is_path(text):
        if text in names(kind):
            return FOLDERS[kind] / f"{text}.yaml"
        here = (beside or Path()) / f"{text}.yaml"
        guess = nearest(text, names(kind)) or (f"{text}.yaml" if _exists(here) else None)
        log.add(mark, path, shown(text), f"a shipped {kind} ({any_of(names(kind))}) or the path of a YAML file", guess)
        return None
    file = (beside or Path()) / text
    if _exists(file):
        return file
    stem = Path(text).stem
    guess = stem if stem in names(kind) else None
    log.add(mark, path, f"{shown(text)}, and there is no such file",
            f"a shipped {kind} ({any_of(names(kind))}) or the path of a YAML file", guess)
    return None


def _exists(file: Path) -> bool:
    try:
        return file.is_file()
    except (OSError, ValueError):  # a name too long for the system, or with a NUL
        return False
