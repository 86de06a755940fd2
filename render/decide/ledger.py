"""Work whose next pieces depend on what the last have shown, as in a search: kept as it is done, and gone on with.

A search is a pure function of what its pieces return, so nothing of its own state has to be kept: gone on with, it is
begun again, and each piece that is kept is read instead of flown, up to where it was interrupted. It comes to the same
result to the last bit, here or on a cluster, since what is a piece depends on neither.
"""

from __future__ import annotations

import hashlib
from collections.abc import Callable, Mapping, Sequence
from pathlib import Path
from typing import Any
from zipfile import BadZipFile

import numpy as np
from numpy.typing import NDArray

from render.decide.chunks import Folder, WorkChanged
from render.decide.runner import Local, Runner, Work
from render.files import whole_file

Columns = Mapping[str, NDArray[Any]]
"""What a piece returns: named arrays."""

MARK = "piece"


class Ledger:
    """Pieces in the order they are asked for; with a folder each is kept as it is done."""

    def __init__(self, run: Runner | None = None, folder: Folder | None = None, *, resume: bool = False,
                 force: bool = False) -> None:
        """Raises WorkUnfinished, WorkChanged or MachineError as ``Folder.begin`` does."""
        self._run: Runner = run or Local()
        self._folder = folder
        self._kept = set() if folder is None else folder.begin(resume=resume, force=force)
        self._asked = 0
        self.fresh = 0  # pieces worked on, not read

    def work(
        self, work: Work[Columns], common: Any, pieces: Sequence[Any], done: Callable[[int], None] | None = None
    ) -> list[Columns]:
        """Run the pieces of one step, or read those that are kept; results in their order.

        A piece has to be told by its ``repr``. done: called with the place of each piece that is there.
        Raises WorkChanged for a kept piece of other work, or a damaged one.
        """
        numbers = range(self._asked, self._asked + len(pieces))
        self._asked += len(pieces)
        marks = {n: _mark(work, piece) for n, piece in zip(numbers, pieces, strict=True)}
        found = {n: self._load(n, marks[n]) for n in numbers if n in self._kept}
        if done is not None:
            for n in found:
                done(n - numbers[0])
        todo = [(n, piece) for n, piece in zip(numbers, pieces, strict=True) if n not in found]
        if todo:
            for n, columns in self._run.run(work, common, todo):
                found[n] = columns
                self.fresh += 1
                self._save(n, marks[n], columns)
                if done is not None:
                    done(n - numbers[0])
        return [found[n] for n in numbers]

    def close(self) -> None:
        """All is done: what was kept goes."""
        if self._folder is not None:
            self._folder.drop()

    def _path(self, number: int) -> Path:
        assert self._folder is not None
        return self._folder.path / f"{number:06d}.npz"

    def _save(self, number: int, mark: str, columns: Columns) -> None:
        if self._folder is not None:
            with whole_file(self._path(number), force=True) as part, part.open("wb") as file:
                np.savez(file, allow_pickle=False, **{**columns, MARK: np.array(mark)})

    def _load(self, number: int, mark: str) -> Columns:
        path = self._path(number)
        try:
            with np.load(path, allow_pickle=False) as data:
                columns = {name: data[name] for name in data.files}
            kept = str(columns.pop(MARK))
        except (OSError, ValueError, KeyError, BadZipFile) as exc:
            raise WorkChanged(f"{path} is damaged ({exc}); delete it and give --resume again") from exc
        if kept != mark:
            raise WorkChanged(f"{path} holds another piece of work than is wanted now; --force starts again and drops "
                              "what is kept")
        return columns


def _mark(work: Work[Columns], piece: Any) -> str:
    return hashlib.sha256(f"{getattr(work, '__name__', work)} {piece!r}".encode()).hexdigest()
