"""Files that appear whole or not at all."""

from __future__ import annotations

import errno
from pathlib import Path

import pytest

from render.errors import LatepullError, MachineError, OutputExists
from render.files import scratch_folder, whole_file, write_text


def names(folder: Path) -> list[str]:
    return sorted(p.name for p in folder.iterdir())


def test_a_file_appears_at_the_end(tmp_path: Path) -> None:
    target = tmp_path / "new" / "film.mp4"
    with whole_file(target) as part:
        assert part.parent == target.parent and part.suffix == ".mp4"
        part.write_bytes(b"whole")
        assert not target.exists()
    assert target.read_bytes() == b"whole" and names(target.parent) == ["film.mp4"]


@pytest.mark.parametrize("fault", [RuntimeError("broken"), KeyboardInterrupt()])
def test_nothing_is_left_and_the_old_file_stays(tmp_path: Path, fault: BaseException) -> None:
    target = tmp_path / "a.txt"
    target.write_text("old")
    with pytest.raises(type(fault)), whole_file(target, force=True) as part:
        part.write_text("half")
        raise fault
    assert target.read_text() == "old" and names(tmp_path) == ["a.txt"]


def test_existing_output_is_kept(tmp_path: Path) -> None:
    write_text(tmp_path / "a.txt", "old")
    with pytest.raises(OutputExists):
        write_text(tmp_path / "a.txt", "new")
    assert (tmp_path / "a.txt").read_text() == "old"


@pytest.mark.parametrize(
    ("code", "kind", "words"),
    [
        (errno.ENOSPC, MachineError, "is full; nothing was left there"),
        (errno.EACCES, MachineError, "may not write .*: no permission"),
        (errno.EROFS, MachineError, "may not write"),
        (errno.EIO, MachineError, "can't write"),
        (errno.ENOTDIR, LatepullError, "a file stands where a folder is wanted"),
    ],
)
def test_system_errors_become_words(tmp_path: Path, code: int, kind: type[LatepullError], words: str) -> None:
    with pytest.raises(kind, match=words) as caught, whole_file(tmp_path / "a.txt") as part:
        part.write_text("half")
        raise OSError(code, "system words")
    assert caught.value.exit_code == (3 if kind is MachineError else 2)
    assert names(tmp_path) == []


def test_a_folder_is_no_file_and_a_file_is_no_folder(tmp_path: Path) -> None:
    with pytest.raises(LatepullError, match="is a folder; a file name is wanted"):
        write_text(tmp_path, "x")
    (tmp_path / "file").write_text("x")
    with pytest.raises(LatepullError, match="a file stands where a folder is wanted"):
        write_text(tmp_path / "file" / "a.txt", "x")


def test_scratch_folder_goes(tmp_path: Path) -> None:
    with pytest.raises(KeyboardInterrupt), scratch_folder(tmp_path / "film.mp4") as folder:
        (folder / "segment").write_text("x")
        raise KeyboardInterrupt
    assert names(tmp_path) == []
