"""What the commands that work long share: their options, their bar, what they may replace, how they end."""

from __future__ import annotations

import argparse
import json
import sys
import time
from collections.abc import Iterable, Mapping
from pathlib import Path
from typing import Any


def add_work_options(sub: argparse.ArgumentParser, *, chunk: bool = False) -> None:
    """Options of every command that works through many cases; chunk: whether their number in a chunk can be given."""
    sub.add_argument("--cluster", metavar="ADDRESS", help="a Dask scheduler, such as tcp://host:8786 (default: here)")
    sub.add_argument("--resume", action="store_true", help="go on from the chunks an interrupted run has left")
    sub.add_argument("--force", action="store_true", help="replace outputs and unfinished work that are there")
    sub.add_argument("--force-size", action="store_true", help="start work above the limits of time, memory and cases")
    if chunk:
        sub.add_argument("--chunk", type=int, metavar="N", help="cases worked on and kept together (default 128, fewer "
                         "on a cluster)")
    sub.add_argument("--out", type=Path, help="output folder (default under out/<scene>)")


class CaseBar:
    """A bar with cases (or other things) done and time left on stderr, where somebody watches."""

    def __init__(self, what: str = "cases", *, at_most: bool = False) -> None:
        """at_most: the work may end before all that is granted is done."""
        self._what, self._most = what, " at most" if at_most else ""
        self._watched, self._begun = sys.stderr.isatty(), time.monotonic()
        self._had: int | None = None

    def before(self, done: int) -> None:
        """So many were done before this run: they say nothing about its speed."""
        self._begun, self._had = time.monotonic(), done

    def show(self, done: int, total: int, stage: str = "") -> None:
        """So many of all cases are done; the first call says how many were done before."""
        if self._had is None:
            self.before(done)
        if not self._watched:
            return
        new, spent = done - (self._had or 0), time.monotonic() - self._begun
        left = f"{spent / new * max(total - done, 0):5.0f} s left" if new > 0 else "   … s left"
        bar = "#" * int(30 * min(done / max(total, 1), 1.0))
        ends = "\n" if done >= total and not stage else ""
        sys.stderr.write(f"\r\033[K{stage + ' ' if stage else ''}[{bar:<30}] {done:,}/{total:,} {self._what}, "
                         f"{left}{self._most} {ends}")
        sys.stderr.flush()

    def clear(self) -> None:
        """Leave the line clean."""
        if self._watched:
            sys.stderr.write("\r\033[K")
            sys.stderr.flush()

    def note(self, text: str) -> None:
        """A line on stderr, watched or not."""
        sys.stderr.write(f"{text}\n")
        sys.stderr.flush()


def may_replace(args: argparse.Namespace, folder: Path, names: Iterable[str], *, resumed: bool = False) -> bool:
    """Whether outputs that are there are replaced; resumed: they are what an interrupted run has begun to write.

    The default folder is the tool's own; a named one is kept unless --force. Raises OutputExists, MachineError.
    """
    from render.files import claim_output

    force = bool(args.force) or args.out is None or resumed
    for name in names:
        claim_output(folder / name, force=force)
    return force


def interrupted(bar: CaseBar, kept: Path) -> int:
    """Say where an interrupted work is kept; returns the exit code."""
    bar.note(f"\ninterrupted; finished chunks are kept in {kept}: give --resume to go on")
    return 130


def plain_json(figures: Mapping[str, Any]) -> str:
    """Figures as they are written to a file."""
    return json.dumps(figures, indent=2, allow_nan=False) + "\n"


def say(args: argparse.Namespace, text: str, figures: Mapping[str, Any], made: Iterable[Path],
        key: str = "written") -> int:
    """Print what was found and where it was written, with --json as figures; returns the exit code."""
    paths = [str(path) for path in made]
    if args.json:
        print(json.dumps({**figures, key: paths}, allow_nan=False))
    else:
        print(text)
        print(f"written: {', '.join(paths)}")
    return 0
