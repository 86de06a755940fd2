"""Outputs that appear whole or not at all: written under a temporary name beside the target, then moved.

Stands low in the house because the study is written here too, not only what `render/output` makes.
"""

from __future__ import annotations

import errno
import os
import secrets
import shutil
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path

from render.errors import LatepullError, MachineError, OutputExists


def no_space(path: Path) -> MachineError:
    """The error for a full disk while ``path`` was being written."""
    return MachineError(f"the disk that holds {path} is full; nothing was left there: free some space, or use --out")


def output_error(exc: OSError, path: Path) -> LatepullError:
    """What an operating-system error met while writing ``path`` means to the user."""
    if exc.errno in (errno.ENOSPC, errno.EDQUOT):
        return no_space(path)
    if exc.errno in (errno.EACCES, errno.EPERM, errno.EROFS):
        return MachineError(f"may not write {path}: no permission there; use --out to name another place")
    if exc.errno in (errno.EISDIR, errno.ENOTDIR, errno.EEXIST):
        return LatepullError(f"can't write {path}: a file stands where a folder is wanted, or the other way round")
    return MachineError(f"can't write {path}: {exc.strerror or exc}")


def temporary_beside(target: Path) -> Path:
    """A hidden name in the target's folder that nothing uses, with the target's suffix; nothing is made."""
    return target.with_name(f".{target.stem}.part-{secrets.token_hex(4)}{target.suffix}")


def claim_output(target: Path, *, force: bool) -> None:
    """Check that ``target`` may be written and make its folder.

    Raises OutputExists if it is there and not ``force``; MachineError or LatepullError if it can't be written.
    """
    if target.is_dir():
        raise LatepullError(f"{target} is a folder; a file name is wanted")
    if target.exists() and not force:
        raise OutputExists(target)
    try:
        target.parent.mkdir(parents=True, exist_ok=True)
    except OSError as exc:
        raise output_error(exc, target) from exc
    if not os.access(target.parent, os.W_OK):
        raise output_error(PermissionError(errno.EACCES, "no permission"), target)


@contextmanager
def whole_file(path: str | Path, *, force: bool = False) -> Iterator[Path]:
    """Give a temporary path to write; at the end it becomes ``path``, on any error or Ctrl-C it goes.

    Raises OutputExists, MachineError (full disk, no permission) or LatepullError.
    """
    target = Path(path)
    claim_output(target, force=force)
    part = temporary_beside(target)
    try:
        yield part
        os.replace(part, target)
    except OSError as exc:
        raise output_error(exc, target) from exc
    finally:
        part.unlink(missing_ok=True)


@contextmanager
def scratch_folder(path: str | Path) -> Iterator[Path]:
    """A temporary folder beside ``path`` (so that a move into place stays on one disk), removed at the end."""
    target = Path(path)
    folder = target.with_name(f".{target.stem}.part-{secrets.token_hex(4)}")
    try:
        folder.mkdir(parents=True)
        yield folder
    except OSError as exc:
        raise output_error(exc, target) from exc
    finally:
        shutil.rmtree(folder, ignore_errors=True)


def move_whole(made: Path, target: Path) -> None:
    """Move a finished file into place in one step, also from another disk (then it is copied beside first)."""
    try:
        os.replace(made, target)
    except OSError as exc:
        if exc.errno != errno.EXDEV:
            raise output_error(exc, target) from exc
        with whole_file(target, force=True) as part:
            shutil.copyfile(made, part)


def write_text(path: str | Path, text: str, *, force: bool = False) -> Path:
    """Write a text file (UTF-8) whole or not at all; raises as ``whole_file`` does."""
    with whole_file(path, force=force) as part:
        part.write_text(text, encoding="utf-8", newline="")
    return Path(path)
