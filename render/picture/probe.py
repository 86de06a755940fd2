"""Can this machine draw: tried in a process of its own, since a missing OpenGL can end the process that asks.

    python -m render.picture.probe      draws one small picture, prints what drew it as a line of JSON

Seen with VTK 9.7 and Mesa 22.3: without libEGL even the question ends the process by SIGSEGV; with libEGL but
no driver the question is answered with no, and drawing without asking ends the process.
"""

from __future__ import annotations

import ctypes
import json
import os
import subprocess
import sys
import tempfile
from collections.abc import Iterator
from contextlib import contextmanager
from dataclasses import dataclass
from typing import Any

from render.errors import MachineError

PACKAGES = "libegl1 libgl1 libgl1-mesa-dri"
PROBE_WAIT_S = 60.0


@dataclass(frozen=True, slots=True)
class Report:
    """What the trial drawing said. ``renderer``: the driver's name for itself, "" where nothing drew."""

    ok: bool
    words: str
    renderer: str = ""

    def __str__(self) -> str:
        return self.words


def probe_drawing() -> Report:
    """Draw one small picture in a process of its own and say what came of it. Never raises, never crashes."""
    command = [sys.executable, "-m", "render.picture.probe"]
    env = {**os.environ, "PYTHONPATH": os.pathsep.join(p or os.getcwd() for p in sys.path)}
    try:
        done = subprocess.run(
            command, env=env, stdin=subprocess.DEVNULL, capture_output=True, text=True, timeout=PROBE_WAIT_S
        )
    except subprocess.TimeoutExpired:
        return Report(False, _cannot(f"the trial drawing did not end within {PROBE_WAIT_S:g} s"))
    except OSError as exc:
        return Report(False, _cannot(f"the trial drawing did not start ({exc})"))
    said = next((line for line in reversed(done.stdout.splitlines()) if line.startswith("{")), None)
    if said is None:
        why = f"signal {-done.returncode}" if done.returncode < 0 else f"exit code {done.returncode}"
        last = [line for line in done.stderr.splitlines() if line.strip()][-1:]
        return Report(False, _cannot(f"the trial drawing ended by {why}" + (f": {last[0]}" if last else "")))
    answer = json.loads(said)
    if "error" in answer:
        return Report(False, _cannot(answer["error"]))
    return Report(True, f"OpenGL draws ({answer['renderer']})", answer["renderer"])


def require_drawing() -> None:
    """Raise MachineError, with the words of the probe, where a window can't be drawn in this process.

    Quick (about 0.06 s): on Linux it asks the library and the driver without drawing; elsewhere it takes
    VTK's word.
    """
    reason = _missing_library()
    if reason is None and not _answers():
        reason = "no OpenGL driver answers"
    if reason is not None:
        raise MachineError(_cannot(reason))


def new_window() -> Any:
    """An off-screen VTK window: EGL on Linux (no display needed), VTK's own choice elsewhere; one sample a pixel."""
    if sys.platform.startswith("linux"):
        from vtkmodules.vtkRenderingOpenGL2 import vtkEGLRenderWindow

        window = vtkEGLRenderWindow()
    else:
        import vtkmodules.vtkRenderingOpenGL2  # noqa: F401 - registers the system's window
        from vtkmodules.vtkRenderingCore import vtkRenderWindow

        window = vtkRenderWindow()
    window.SetOffScreenRendering(1)
    window.SetShowWindow(False)
    window.SetMultiSamples(0)
    return window


def _cannot(reason: str) -> str:
    words = f"this machine can't draw: {reason}"
    if sys.platform.startswith("linux"):
        words += f". Software OpenGL is enough; on Debian or Ubuntu: apt-get install {PACKAGES}"
    return words


def _missing_library() -> str | None:
    if not sys.platform.startswith("linux"):
        return None
    try:
        ctypes.CDLL("libEGL.so.1")
    except OSError:
        return "libEGL.so.1 is missing or broken"
    return None


def _answers() -> bool:
    with _silent_stderr():  # the drivers' own chatter would stand above our message
        window = new_window()
        try:
            return bool(window.SupportsOpenGL())
        finally:
            window.Finalize()


@contextmanager
def _silent_stderr() -> Iterator[None]:
    """Send what C libraries write to standard error to nowhere for a moment."""
    try:
        kept = os.dup(2)
    except OSError:
        yield
        return
    try:
        with tempfile.TemporaryFile() as nowhere:
            os.dup2(nowhere.fileno(), 2)
            try:
                yield
            finally:
                os.dup2(kept, 2)
    finally:
        os.close(kept)


def _draw_once() -> dict[str, str]:
    """Draw a red picture and read it back; what drew it, or the error in words."""
    reason = _missing_library()
    if reason is not None:
        return {"error": reason}
    if not _answers():
        return {"error": "no OpenGL driver answers"}
    import numpy as np
    from vtkmodules.util.numpy_support import vtk_to_numpy
    from vtkmodules.vtkCommonCore import vtkUnsignedCharArray
    from vtkmodules.vtkRenderingCore import vtkRenderer

    window = new_window()
    window.SetSize(32, 32)
    renderer = vtkRenderer()
    renderer.SetBackground(1.0, 0.0, 0.0)
    window.AddRenderer(renderer)
    window.Render()
    data = vtkUnsignedCharArray()
    window.GetPixelData(0, 0, 31, 31, 0, data, 0)
    pixels = vtk_to_numpy(data).reshape(-1, 3)
    lines = [line for line in window.ReportCapabilities().splitlines() if "renderer string" in line]
    window.Finalize()
    if not np.array_equal(pixels, np.tile(np.array([255, 0, 0], np.uint8), (32 * 32, 1))):
        return {"error": "the driver draws, but the picture it gives back is wrong"}
    return {"renderer": lines[0].split(":", 1)[1].strip() if lines else "unnamed driver"}


if __name__ == "__main__":
    print(json.dumps(_draw_once()), flush=True)
