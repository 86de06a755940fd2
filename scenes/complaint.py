"""What is wrong with a scene file: where, what was read, what is wanted."""

from __future__ import annotations

import dataclasses
import difflib
from collections.abc import Iterable
from dataclasses import dataclass
from typing import Any

SHOWN = 60  # characters of a bad value that are shown


@dataclass(frozen=True, slots=True)
class Mark:
    """A place in a file; line and column count from 1, 0 where there is none."""

    file: str
    line: int = 0
    column: int = 0


@dataclass(frozen=True, slots=True)
class Complaint:
    """One fault of a scene file."""

    file: str
    line: int
    column: int
    path: str  # dotted path of the value, "" for the file as a whole
    read: str
    wanted: str
    nearest: str | None = None

    def __str__(self) -> str:
        """``file:line:column: path: read X, wanted Y (did you mean Z?)``, parts that are unknown left out."""
        place = ":".join([self.file, *(str(n) for n in (self.line, self.column) if n > 0)]) if self.file else ""
        parts = [part for part in (place, self.path) if part]
        guess = f" (did you mean {self.nearest}?)" if self.nearest else ""
        return ": ".join([*parts, f"read {self.read}, wanted {self.wanted}{guess}"])


class SceneError(Exception):
    """A scene or airframe file with faults, all of them at once; exit code 2."""

    exit_code = 2

    def __init__(self, complaints: Iterable[Complaint]) -> None:
        unique = dict.fromkeys(complaints)
        self.complaints = tuple(sorted(unique, key=lambda c: (c.file, c.line, c.column)))
        super().__init__("\n".join(str(c) for c in self.complaints))

    def __reduce__(self) -> tuple[Any, ...]:
        """Pickled by its complaints, so that a worker process can hand it on."""
        return SceneError, (self.complaints,)

    def details(self) -> dict[str, Any]:
        """The complaints as plain data."""
        return {"complaints": [dataclasses.asdict(c) for c in self.complaints]}


class Log:
    """Complaints as they are found."""

    def __init__(self) -> None:
        self.complaints: list[Complaint] = []

    def add(self, mark: Mark, path: str, read: str, wanted: str, nearest: str | None = None) -> None:
        """Note one fault."""
        self.complaints.append(Complaint(mark.file, mark.line, mark.column, path, read, wanted, nearest))

    def raise_if_any(self) -> None:
        """Raise SceneError with everything noted so far."""
        if self.complaints:
            raise SceneError(self.complaints)


def nearest(word: str, known: Iterable[str]) -> str | None:
    """The known word most like another, or None if none is."""
    known = list(known)
    by_lower = {k.lower(): k for k in reversed(known)}
    found = difflib.get_close_matches(word[:SHOWN].lower(), by_lower, 1, 0.6)
    return by_lower[found[0]] if found else None


def shown(text: str) -> str:
    """A value as an error shows it: one line, printable, not too long."""
    short = text if len(text) <= SHOWN else text[: SHOWN - 3] + "..."
    return "".join(ch if ch.isprintable() else "\ufffd" if ch not in "\n\t\r" else " " for ch in short) or '""'


def any_of(words: Iterable[str]) -> str:
    """``a, b or c``."""
    listed = list(words)
    return listed[0] if len(listed) == 1 else f"{', '.join(listed[:-1])} or {listed[-1]}"
