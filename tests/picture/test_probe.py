"""The probe says what is missing and what to install, and survives what would end the process that asks."""

from __future__ import annotations

import subprocess
import sys

import pytest

from render.picture import probe

linux = pytest.mark.skipif(not sys.platform.startswith("linux"), reason="EGL is asked on Linux only")
INSTALL = "Software OpenGL is enough; on Debian or Ubuntu: apt-get install libegl1 libgl1 libgl1-mesa-dri"


@pytest.mark.draws
def test_a_machine_that_draws_says_what_draws() -> None:
    report = probe.probe_drawing()
    assert report.ok and report.renderer
    assert str(report) == f"OpenGL draws ({report.renderer})"


@linux
@pytest.mark.draws
def test_without_a_driver_the_probe_says_so(monkeypatch: pytest.MonkeyPatch) -> None:
    monkeypatch.setenv("__EGL_VENDOR_LIBRARY_FILENAMES", "/dev/null")  # libglvnd then knows no driver
    report = probe.probe_drawing()
    assert not report.ok
    assert str(report) == f"this machine can't draw: no OpenGL driver answers. {INSTALL}"


@linux
@pytest.mark.draws
def test_without_a_driver_a_stage_is_refused_in_the_same_words(monkeypatch: pytest.MonkeyPatch) -> None:
    code = (
        "from render.picture.stage import Stage\nfrom scenes.model import Day\nfrom terrain.ground import read_ground\n"
        "from render.errors import MachineError\nfrom tests.picture.test_stage import NOBODY, LEVEL\n"
        "from render.picture.camera import Camera\nimport numpy as np\n"
        "stage = Stage((), read_ground('heath', 1), Day(), (64, 36))\n"
        "try: stage.draw(NOBODY, Camera(np.array([0.0, 0.0, -300.0]), LEVEL, 1.0, 64, 36))\n"
        "except MachineError as exc: print(exc, exc.exit_code)\n"
    )
    monkeypatch.setenv("__EGL_VENDOR_LIBRARY_FILENAMES", "/dev/null")
    done = subprocess.run([sys.executable, "-c", code], capture_output=True, text=True, check=True)
    assert done.stdout == f"this machine can't draw: no OpenGL driver answers. {INSTALL} 3\n"
    assert done.stderr == ""


@linux
def test_without_the_library_nothing_is_asked_of_it(monkeypatch: pytest.MonkeyPatch) -> None:
    def missing(name: str) -> None:
        raise OSError(f"{name}: cannot open shared object file")

    monkeypatch.setattr(probe.ctypes, "CDLL", missing)
    with pytest.raises(probe.MachineError) as caught:
        probe.require_drawing()
    assert str(caught.value) == f"this machine can't draw: libEGL.so.1 is missing or broken. {INSTALL}"


@linux
def test_a_probe_that_crashes_or_hangs_is_reported(monkeypatch: pytest.MonkeyPatch) -> None:
    def crashed(*_args: object, **_kinds: object) -> subprocess.CompletedProcess[str]:
        return subprocess.CompletedProcess([], -11, "", "a library's last words\n")

    monkeypatch.setattr(probe.subprocess, "run", crashed)
    report = probe.probe_drawing()
    assert not report.ok and "ended by signal 11: a library's last words" in report.words

    def hung(*_args: object, **_kinds: object) -> subprocess.CompletedProcess[str]:
        raise subprocess.TimeoutExpired("python", probe.PROBE_WAIT_S)

    monkeypatch.setattr(probe.subprocess, "run", hung)
    assert "did not end within 60 s" in probe.probe_drawing().words
