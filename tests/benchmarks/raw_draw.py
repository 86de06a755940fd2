"""The drawing half of the raw OpenGL limit (see raw_gl.py): needs moderngl and numpy, no VTK."""

from __future__ import annotations

import pickle
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

import moderngl
import numpy as np

from render.types import Study

FACES = np.array([[0, 1, 2], [0, 2, 3]], np.int32)


class Raw:
    """Draws a written scene; frames are (h, w, 3), used again by the next call."""

    def __init__(self, path: Path, size_px: tuple[int, int]) -> None:
        scene = pickle.loads(path.read_bytes())
        self._poses, self._background = scene["poses"], scene["background"]
        self._scene, self._size = scene["things"], size_px
        self._gl: Any = None  # opened by the first frame, after the fork

    def _open(self) -> None:
        size_px = self._size
        self._gl = gl = moderngl.create_standalone_context(backend="egl")
        width, height = size_px
        self._target = gl.framebuffer(
            [gl.renderbuffer(size_px, components=4)], gl.depth_renderbuffer(size_px)
        )
        self._target.use()
        self._things = [_Thing(gl, thing) for thing in self._scene]
        self._bytes = bytearray(width * height * 3)
        self._flipped = np.frombuffer(self._bytes, np.uint8).reshape(height, width, 3)[::-1]
        self._frame = np.empty((height, width, 3), np.uint8)
        gl.enable(moderngl.DEPTH_TEST)
        gl.depth_func = "<="
        gl.blend_func = moderngl.SRC_ALPHA, moderngl.ONE_MINUS_SRC_ALPHA, moderngl.ONE, moderngl.ONE_MINUS_SRC_ALPHA

    def frame(self, time_s: float) -> np.ndarray[Any, Any]:
        """The picture of one of the written instants."""
        if self._gl is None:
            self._open()
        gl = self._gl
        view, poses = self._poses[time_s]
        self._target.depth_mask = True
        gl.disable(moderngl.BLEND)
        self._target.clear(*self._background, 1.0)
        blending = False
        for thing, (visible, matrix, moving, order) in zip(self._things, poses, strict=True):
            if not visible:
                continue
            if thing.clear and not blending:
                blending = True
                gl.enable(moderngl.BLEND)
                self._target.depth_mask = False
            thing.draw(gl, view @ matrix, moving, order)
        self._target.read_into(self._bytes, components=3)
        np.copyto(self._frame, self._flipped)
        return self._frame


class _Thing:
    """One mesh with its program."""

    def __init__(self, gl: Any, thing: dict[str, Any]) -> None:
        self.clear, self._cull = thing["clear"], thing["cull"]
        vertex, fragment = thing["code"]
        self._program = gl.program(vertex_shader=vertex, fragment_shader=fragment)
        buffers = []
        for name, values in thing["inputs"].items():
            if name in self._program:
                kind = f"{values.shape[1]}{'f1' if name == 'scalarColor' else 'f'}"
                buffers.append((gl.buffer(np.ascontiguousarray(values).tobytes()), kind, name))
        corners = np.zeros(6 * len(thing["inputs"]["vertexMC"]) // 4, np.int32) if thing["tree"] else thing["corners"]
        self._corners = gl.buffer(corners.tobytes())
        self._array = gl.vertex_array(self._program, buffers, self._corners, index_element_size=4)
        for name, value in thing["uniforms"].items():
            if name in self._program:
                self._program[name].value = value
        low, high = thing["box"]
        places = np.stack(np.meshgrid(*np.stack([low, high], axis=1), indexing="ij"), axis=-1).reshape(-1, 3)
        self._box = np.column_stack([places, np.ones(8)])

    def draw(self, gl: Any, matrix: Any, moving: dict[str, Any], order: Any) -> None:
        clip = self._box @ matrix.T
        for k in range(2):
            if (clip[:, k] > clip[:, 3]).all() or (clip[:, k] < -clip[:, 3]).all():
                return
        (gl.enable if self._cull else gl.disable)(moderngl.CULL_FACE)
        self._program["MCDCMatrix"].write(np.ascontiguousarray(matrix.T, np.float32).tobytes())
        for name, value in moving.items():
            if name in self._program:
                self._program[name].value = value
        if order is None:
            self._array.render()
        elif len(order):
            self._corners.write((4 * order[:, None, None] + FACES).tobytes())
            self._array.render(vertices=6 * len(order))


@contextmanager
def open_raw(study: Study, slot: str, size_px: tuple[int, int], *, scene: str) -> Iterator[Raw]:
    """A frame source for ``SourceSpec``: the scene written at ``scene``."""
    yield Raw(Path(scene), size_px)
