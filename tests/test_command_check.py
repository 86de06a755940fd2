"""check, list and schema from the command line, in process: exit codes, texts, JSON, no traceback."""

from __future__ import annotations

import json
import os
import subprocess
import sys
from pathlib import Path

import pytest
from jsonschema import Draft202012Validator

from render.command import CAUTION, main
from scenes.reader import airframe_names, read_scene, scene_names
from tests.scenes.made import with_line


@pytest.fixture
def bad(tmp_path: Path) -> Path:
    file = tmp_path / "bad.yaml"
    file.write_text(with_line("floor: 100 ft", "floor: 100").replace("from: right", "from: rihgt"))
    return file


def test_all_shipped_scenes_pass(capsys: pytest.CaptureFixture[str]) -> None:
    """Exit 0; each by name and title; the caution."""
    assert main(["check", *scene_names()]) == 0
    out, err = capsys.readouterr()
    lines = out.splitlines()
    assert lines[:-1] == [f"{name}: no faults found ({read_scene(name).title})" for name in scene_names()]
    assert lines[-1] == CAUTION and err == ""


def test_every_fault_of_every_scene(bad: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """A good scene, a bad one, an unknown name: all are looked at, exit 2."""
    assert main(["check", "late_freeze", str(bad), "late_freez"]) == 2
    out, err = capsys.readouterr()
    assert out.splitlines() == [
        f"late_freeze: no faults found ({read_scene('late_freeze').title})", f"{bad}: 2 faults",
        "late_freez: 1 fault", CAUTION]
    lines = err.splitlines()
    wanted = "a length with its unit (m, ft, km, NM or cm), such as 100 ft"
    assert lines[0] == f"{bad}:5:8: floor: read 100, wanted {wanted}"
    assert lines[1] == (f"{bad}:19:14: film.from: read rihgt, wanted a slot of the formation or the lead: lead, right "
                        "or left (did you mean right?)")
    assert lines[2].startswith("read late_freez, wanted a shipped scene (")
    assert lines[2].endswith("(did you mean late_freeze?)") and len(lines) == 3


def test_json_of_check(bad: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """What a program reads: scenes that pass, those that don't, each complaint in its parts."""
    assert main(["check", "--json", "late_freeze", str(bad)]) == 2
    data = json.loads(capsys.readouterr().out)
    assert data["exit_code"] == 2 and data["faulty"] == [str(bad)] and list(data["scenes"]) == ["late_freeze"]
    assert data["complaints"][0] == {
        "file": str(bad), "line": 5, "column": 8, "path": "floor", "read": "100",
        "wanted": "a length with its unit (m, ft, km, NM or cm), such as 100 ft", "nearest": None}
    assert main(["check", "--json", "late_freeze"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert data["complaints"] == [] and data["exit_code"] == 0 and data["caution"] == CAUTION


def test_other_commands_say_the_same_of_a_bad_scene(bad: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """fly, film and still stop before they do anything; under --json with the complaints."""
    for command in ("fly", "film", "still"):
        assert main([command, str(bad)]) == 2
        out, err = capsys.readouterr()
        assert out == "" and err.startswith(f"{bad}:5:8: floor: read 100") and "Traceback" not in err
    assert main(["fly", "--json", str(bad)]) == 2
    data = json.loads(capsys.readouterr().out)
    assert data["exit_code"] == 2 and [one["path"] for one in data["complaints"]] == ["floor", "film.from"]


@pytest.mark.parametrize(
    ("content", "text"),
    [
        (b"", "read an empty file, wanted a mapping of keys to values"),
        (b"a: [", "read text that is not YAML"), (b"\xff\xfe", "read the byte 0xff, wanted UTF-8 text"),
        (b"a: !!python/name:os.system\n", "wanted values without tags"), (b"a: 1\na: 2\n", "wanted each key once"),
        (b"like: bad.yaml\n", "wanted files that don't build on each other in a circle"),
    ],
)
def test_files_that_are_no_scene(bad: Path, content: bytes, text: str, capsys: pytest.CaptureFixture[str]) -> None:
    """Exit 2, one line."""
    bad.write_bytes(content)
    assert main(["check", str(bad)]) == 2
    err = capsys.readouterr().err
    assert text in err and len(err.splitlines()) == 1


def test_a_missing_file_and_a_folder(tmp_path: Path, capsys: pytest.CaptureFixture[str]) -> None:
    """Exit 2; a file named like a shipped scene has it offered."""
    assert main(["check", str(tmp_path / "late_freeze.yaml"), str(tmp_path)]) == 2
    err = capsys.readouterr().err.splitlines()
    assert "there is no such file" in err[0] and err[0].endswith("(did you mean late_freeze?)")
    assert "there is no such file" in err[1]


def test_list(capsys: pytest.CaptureFixture[str]) -> None:
    """Scenes with titles, airframes; the same as JSON."""
    assert main(["list"]) == 0
    out = capsys.readouterr().out
    assert all(name in out and read_scene(name).title in out for name in scene_names())
    assert main(["list", "--json"]) == 0
    data = json.loads(capsys.readouterr().out)
    assert tuple(data["scenes"]) == scene_names() and tuple(data["airframes"]) == airframe_names()


def test_schema(capsys: pytest.CaptureFixture[str]) -> None:
    """A JSON Schema on stdout and nothing else."""
    for arguments in (["schema"], ["schema", "--airframe"]):
        assert main(arguments) == 0
        Draft202012Validator.check_schema(json.loads(capsys.readouterr().out))


def run(arguments: list[str], **environment: str) -> subprocess.CompletedProcess[bytes]:
    """The command in a process of its own."""
    return subprocess.run([sys.executable, "-m", "render.command", *arguments], capture_output=True, check=False,
                          env={**os.environ, **environment})


def test_a_terminal_that_has_no_umlauts(tmp_path: Path) -> None:
    """Letters it can't show are escaped; no traceback."""
    file = tmp_path / "überflug.yaml"
    file.write_text(with_line("title: A loop", "title: Überflug"), encoding="utf-8")
    done = run(["check", str(file)], PYTHONIOENCODING="ascii")
    assert done.returncode == 0 and b"no faults found (\\xdcberflug)" in done.stdout and done.stderr == b""


def test_a_reader_that_stops_early() -> None:
    """As `latepull schema | head -1` does: no traceback."""
    code = f"{sys.executable} -m render.command schema | head -c 1"
    done = subprocess.run(["sh", "-c", code], capture_output=True, check=False)
    assert (done.stdout, done.stderr) == (b"{", b"")


def test_an_unknown_command_or_option() -> None:
    """argparse's own message, exit 2."""
    for arguments in ([], ["chek"], ["check"], ["check", "--force", "late_freeze"]):
        with pytest.raises(SystemExit) as caught:
            main(arguments)
        assert caught.value.code == 2
