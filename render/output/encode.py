"""ffmpeg: one segment from raw frames through a pipe, segments joined without encoding again."""

from __future__ import annotations

import subprocess
import tempfile
from pathlib import Path
from types import TracebackType

import numpy as np
from numpy.typing import NDArray

from render.errors import MachineError
from render.files import no_space

TIMESCALE = 90_000  # ticks a second: a whole number of ticks for each usual frame rate


def encoder_path() -> str:
    """The ffmpeg to use; raises MachineError with what to install if there is none."""
    try:
        import imageio_ffmpeg

        path = str(imageio_ffmpeg.get_ffmpeg_exe())
    except (ImportError, RuntimeError) as exc:
        raise MachineError(
            "no video encoder: install the Python package imageio-ffmpeg, or ffmpeg itself "
            "(on a Debian or Ubuntu server: apt-get install ffmpeg)"
        ) from exc
    return path


def encode_error(text: str, target: Path) -> MachineError:
    """What the encoder's last words mean to the user."""
    if "No space left on device" in text or "Disk quota exceeded" in text:
        return no_space(target)
    if "Unknown encoder" in text:
        return MachineError("this ffmpeg has no H.264 encoder (libx264): install the Python package imageio-ffmpeg")
    last = [line.strip() for line in text.splitlines() if line.strip()]
    return MachineError(f"the video encoder failed on {target}: {last[-1] if last else 'it said nothing'}")


class SegmentWriter:
    """A context manager that encodes (h, w, 3) uint8 frames into one H.264 file.

    On leaving without an error the file is complete; on an error ffmpeg is ended and the half file is the caller's
    (it lies in a scratch folder). Raises MachineError.
    """

    def __init__(self, path: Path, size_px: tuple[int, int], rate_fps: float, preset: str = "superfast") -> None:
        width, height = size_px
        self._path, self._shape = path, (height, width, 3)
        self._log = tempfile.TemporaryFile()  # a pipe could fill and stop ffmpeg
        command = [
            encoder_path(), "-y", "-hide_banner", "-loglevel", "error", "-nostdin",
            "-f", "rawvideo", "-pix_fmt", "rgb24", "-s", f"{width}x{height}", "-r", f"{rate_fps:g}", "-i", "pipe:0",
            # the matrix that players assume for this size is written down, or reds and greens would shift
            "-vf", "scale=out_color_matrix=bt709:out_range=tv,format=yuv420p,"
            "setparams=range=tv:colorspace=bt709:color_primaries=bt709:color_trc=bt709",
            "-c:v", "libx264", "-preset", preset, "-crf", "20", "-threads", "1", "-bf", "0",
            # a whole picture each half second: a page's film can be scrubbed (a quarter larger, seeks a fifth as long)
            "-g", str(max(1, round(rate_fps / 2))),
            "-video_track_timescale", str(TIMESCALE), "-f", "mp4", str(path),
        ]  # fmt: skip
        try:
            self._process = subprocess.Popen(
                command, stdin=subprocess.PIPE, stdout=subprocess.DEVNULL, stderr=self._log
            )
        except OSError as exc:
            self._log.close()
            raise MachineError(f"the video encoder can't be started ({exc.strerror}): install ffmpeg") from exc

    def __enter__(self) -> SegmentWriter:
        return self

    def write(self, frame: NDArray[np.uint8]) -> None:
        """Encode one frame; raises ValueError for another size, MachineError if ffmpeg gave up."""
        if frame.shape != self._shape or frame.dtype != np.uint8:
            raise ValueError(f"a frame is {frame.shape} {frame.dtype}, wanted {self._shape} uint8")
        assert self._process.stdin is not None
        try:
            self._process.stdin.write(np.ascontiguousarray(frame).data)
        except (BrokenPipeError, OSError) as exc:
            self._process.wait()
            raise encode_error(self._words(), self._path) from exc

    def _words(self) -> str:
        self._log.seek(0)
        return self._log.read().decode("utf-8", "replace")

    def __exit__(
        self, kind: type[BaseException] | None, value: BaseException | None, trace: TracebackType | None
    ) -> None:
        assert self._process.stdin is not None
        try:
            if kind is not None:
                self._process.kill()
            try:
                self._process.stdin.close()
            except OSError:
                pass  # ffmpeg went first; its exit code below says why
            code = self._process.wait()
            if kind is None and code != 0:
                raise encode_error(self._words(), self._path)
        finally:
            self._log.close()


def join_segments(segments: list[Path], target: Path, metadata: dict[str, str]) -> None:
    """Join segments of one format by copying their streams, index in front (fast start); raises MachineError."""
    listing = target.with_suffix(".txt")
    # names only: the list lies in the segments' folder, and quotes in a user's path can't matter
    listing.write_text("".join(f"file '{path.name}'\n" for path in segments), encoding="utf-8")
    command = [
        encoder_path(), "-y", "-hide_banner", "-loglevel", "error", "-nostdin", "-f", "concat", "-safe", "0",
        "-i", str(listing), "-c", "copy", "-map_metadata", "-1", "-movflags", "+faststart",
        "-video_track_timescale", str(TIMESCALE),
    ]  # fmt: skip
    for key, value in metadata.items():
        command += ["-metadata", f"{key}={value}"]
    done = subprocess.run([*command, "-f", "mp4", str(target)], stdout=subprocess.DEVNULL, stderr=subprocess.PIPE)
    if done.returncode != 0:
        raise encode_error(done.stderr.decode("utf-8", "replace"), target)
