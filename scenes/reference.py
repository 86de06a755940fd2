"""The table of a scene file's keys for the README, made from the same declarations as the reader."""

from __future__ import annotations

from collections.abc import Iterator, Mapping
from typing import Any

from scenes.build import at_path, declared
from scenes.model import FAULT_KINDS, POINTS, REQUIRED, STEPS, Fault, Scene, Slot
from scenes.rules import wanted_of


def key_table() -> str:
    """A Markdown table: key, what it is, what is wanted, whether it must be there."""
    rows = [f"| `{key}` | {doc} | {wanted} |" for key, doc, wanted in _rows(Scene, "")]
    return "\n".join(["| key | what it is | what is wanted |", "|---|---|---|", *rows])


def _rows(cls: type, path: str) -> Iterator[tuple[str, str, str]]:
    for key, field in declared(cls).items():
        meta = field.metadata
        here = at_path(path, key)
        must = "" if meta["absent"] is not REQUIRED else "; required"
        if meta["part"] is not None and meta["dim"] == "part":
            yield here, meta["doc"] + must, "a group"
            yield from _rows(meta["part"], here)
        elif key == "fault":
            yield here, meta["doc"], "none or a group"
            yield from _fault(here)
        elif key == "script":
            yield here, meta["doc"] + must, "a list of steps"
            for name, step in STEPS.items():
                yield f"- {name}", str(step.__doc__).splitlines()[0].rstrip("."), "a step"
                yield from _rows(step, f"- {name}")
        elif key == "formation":
            yield here, meta["doc"] + must, "a group of slots, each with a name of yours"
            yield from _rows(Slot, f"{here}.NAME")
        elif key == "briefed":
            yield here, meta["doc"], "none or a list of steps"
        else:
            yield here, meta["doc"] + must, _wanted(meta)


def _fault(path: str) -> Iterator[tuple[str, str, str]]:
    for key, field in declared(Fault).items():
        meta = field.metadata
        here = at_path(path, key)
        if key == "kind":
            yield here, "; ".join(f"`{kind}`: {doc}" for kind, doc in FAULT_KINDS.items()), "one of these"
        elif key == "at":
            for kind, (dim, _, _, doc) in POINTS.items():
                yield f"{here}.{kind}", doc, _wanted({**meta, "dim": dim, "example": ""})
        else:
            yield here, f"{meta['doc']} ({', '.join(meta['kinds'])} only)", _wanted(meta)


def _wanted(meta: Mapping[str, Any]) -> str:
    return wanted_of(meta).replace("|", "\\|")


def with_table(readme: str) -> str:
    """A README's text with the table between its marks renewed. Raises ValueError where the marks are missing."""
    head, start, rest = readme.partition("<!-- keys -->")
    _, end, tail = rest.partition("<!-- end of keys -->")
    if not start or not end:
        raise ValueError("README.md: the marks around the table of keys are missing")
    return f"{head}{start}\n{key_table()}\n{end}{tail}"
