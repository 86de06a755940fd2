"""Films: what is in the file, what it shows, and that nothing half-made stays behind."""

from __future__ import annotations

import itertools
import json
import os
import re
import signal
import struct
import subprocess
import sys
import time
from dataclasses import asdict
from pathlib import Path

import imageio_ffmpeg
import numpy as np
import pytest

from render.errors import LatepullError, MachineError, OutputExists
from render.output import encode
from render.output.card import card_frame
from render.output.drawers import Drawers
from render.output.film import _job, write_film
from render.output.film_worker import segment_paths
from render.output.shot import Hold, Shot, plan_shot
from render.output.source import SourceSpec
from render.study_io import save_study
from render.types import Study
from tests.output.drawn import grey_of

START_S, SIZE = 20.0, (160, 120)


def grey(**options: object) -> SourceSpec:
    return SourceSpec("tests.output.drawn:open_grey", {"start_s": START_S, **options})


def short_shot(study: Study, **more: object) -> Shot:
    """15 frames of picture and 5 of card."""
    kind: dict[str, object] = {"start_s": START_S, "end_s": START_S + 1.4, "rate_fps": 10, "card_s": 0.5, **more}
    return plan_shot(study, "right", size_px=SIZE, **kind)  # type: ignore[arg-type]


def probe(path: Path) -> str:
    """What ffmpeg says about a file."""
    command = [imageio_ffmpeg.get_ffmpeg_exe(), "-hide_banner", "-i", str(path)]
    return subprocess.run(command, capture_output=True, text=True).stderr


def decoded(path: Path, size: tuple[int, int] = SIZE) -> np.ndarray:
    command = [imageio_ffmpeg.get_ffmpeg_exe(), "-loglevel", "error", "-i", str(path), "-fps_mode", "passthrough",
               "-f", "rawvideo", "-pix_fmt", "rgb24", "-"]  # fmt: skip
    raw = subprocess.run(command, capture_output=True, check=True).stdout
    return np.frombuffer(raw, np.uint8).reshape(-1, size[1], size[0], 3)


def boxes(path: Path) -> list[str]:
    """The file's top boxes in order (ISO/IEC 14496-12: 32-bit size, 4-character type)."""
    data, at, found = path.read_bytes(), 0, []
    while at < len(data):
        length, kind = struct.unpack(">I4s", data[at : at + 8])
        found.append(kind.decode())
        at += length
    return found


def alive(word: str) -> list[str]:
    """Command lines of running processes that contain a word."""
    lines = []
    for entry in Path("/proc").glob("[0-9]*/cmdline"):
        try:
            line = entry.read_bytes().replace(b"\0", b" ").decode("utf-8", "replace")
        except OSError:
            continue
        if word in line:
            lines.append(line)
    return lines


def test_film_holds_what_was_drawn(study: Study, tmp_path: Path) -> None:
    target, calls = tmp_path / "film.mp4", []
    plain = tmp_path / "plain.mp4"
    shot = short_shot(study)
    assert len(shot) == 20 and int(shot.card.sum()) == 5
    write_film(study, "right", target, shot=shot, plain_path=plain, source=grey(),
               progress=lambda done, total: calls.append((done, total)))  # fmt: skip
    said = probe(target)
    assert re.search(r"Video: h264 .*yuv420p\(tv, bt709, progressive\), 160x120", said), said
    assert re.search(r"title +: Right wing, line abreast, stabilator frozen after the top \(slot right\)", said)
    assert "not a clearance" in said and "latepull 0.1.0" in said
    assert "stabilator" not in probe(plain).split("comment")[0], "the plain film's title must give nothing away"
    order = boxes(target)
    assert order.index("moov") < order.index("mdat"), "fast start: the index comes first"
    assert imageio_ffmpeg.count_frames_and_secs(str(target)) == (20, pytest.approx(2.0, abs=0.01))
    film, bare = decoded(target), decoded(plain)
    assert len(film) == len(bare) == 20
    for i in range(15):
        want = grey_of(float(shot.time_s[i]) - START_S)
        # the overlay leaves the right of the picture's middle alone; 3 levels of coding error
        assert np.abs(film[i, 55:80, 20:100].astype(int) - want).max() <= 3, i
        assert np.abs(bare[i].astype(int) - want).max() <= 3, i
    card = card_frame(study, "right", SIZE)
    for frame in film[15:]:
        assert np.abs(frame.astype(int) - card).mean() < 4.0
    assert calls[-1] == (20, 20) and all(a[0] <= b[0] for a, b in itertools.pairwise(calls))
    assert sorted(p.name for p in tmp_path.iterdir()) == ["film.mp4", "plain.mp4"]


def test_two_workers_join_exactly(study: Study, tmp_path: Path) -> None:
    shot = short_shot(study, rate_fps=30, card_s=0.2)
    write_film(study, "right", tmp_path / "film.mp4", shot=shot, overlay=False, source=grey(), workers=2)
    film = decoded(tmp_path / "film.mp4")
    assert len(film) == len(shot) == 43 + 6
    want = [grey_of(float(t) - START_S) for t in shot.time_s[:43]]
    assert np.abs(film[:43, 60, 80, 0].astype(int) - want).max() <= 3


def test_draft_is_half_size_and_half_rate(study: Study, tmp_path: Path) -> None:
    shot = short_shot(study, draft=True)
    assert (shot.size_px, shot.rate_fps, len(shot)) == ((80, 60), 5.0, 8 + 2)
    write_film(study, "right", tmp_path / "film.mp4", shot=shot, source=grey())
    assert "80x60" in probe(tmp_path / "film.mp4")
    assert imageio_ffmpeg.count_frames_and_secs(str(tmp_path / "film.mp4"))[0] == 10


def test_holds_stay_out_of_the_plain_film(study: Study, tmp_path: Path) -> None:
    shot = short_shot(study, holds=(Hold(START_S + 0.7, 1.0, "look here"),))
    write_film(study, "right", tmp_path / "a.mp4", shot=shot, plain_path=tmp_path / "b.mp4", source=grey())
    assert len(decoded(tmp_path / "a.mp4")) == len(shot) == 30
    assert len(decoded(tmp_path / "b.mp4")) == 20


def test_existing_film_is_kept(study: Study, tmp_path: Path) -> None:
    target = tmp_path / "film.mp4"
    target.write_bytes(b"old")
    with pytest.raises(OutputExists):
        write_film(study, "right", target, shot=short_shot(study), source=grey())
    assert target.read_bytes() == b"old"
    with pytest.raises(MachineError):
        write_film(study, "right", target, shot=short_shot(study), source=grey(fail="error"), force=True)
    assert target.read_bytes() == b"old", "a failed film must not cost the old one"
    write_film(study, "right", target, shot=short_shot(study), source=grey(), force=True)
    assert len(decoded(target)) == 20


@pytest.mark.parametrize(
    ("fail", "words"),
    [
        ("error", "no software OpenGL here: made up"),
        ("bug", "a drawing process failed after .* frames: RuntimeError: a bug"),
        ("crash", r"ended by signal 11 \(SIGSEGV\)"),
    ],
)
def test_a_failing_worker_is_told_and_leaves_nothing(study: Study, tmp_path: Path, fail: str, words: str) -> None:
    with pytest.raises(MachineError, match=words):
        write_film(study, "right", tmp_path / "film.mp4", shot=short_shot(study),
                   source=grey(fail=fail, fail_s=START_S + 0.5))  # fmt: skip
    assert list(tmp_path.iterdir()) == [] and alive(tmp_path.name) == []


@pytest.mark.skipif(os.name != "posix", reason="signals of POSIX")
def test_a_killed_drawing_process_is_told_at_once_and_leaves_nothing(study: Study, tmp_path: Path) -> None:
    spec, target = grey(slow_s=0.2), tmp_path / "film.mp4"
    shot = short_shot(study, rate_fps=60)
    with Drawers(str(target), spec.modules) as drawers:
        begun = time.monotonic()

        def kill(done: int, total: int) -> None:
            if done:
                os.kill(drawers._process.pid, signal.SIGKILL)

        with pytest.raises(MachineError, match=r"ended by signal 9 \(SIGKILL\) after \d+ frames"):
            write_film(study, "right", target, shot=shot, source=spec, drawers=drawers, progress=kill)
        assert time.monotonic() - begun < 0.2 * len(shot) / 2, "it waited for the workers"
    assert list(tmp_path.iterdir()) == [] and alive(tmp_path.name) == []


@pytest.mark.parametrize("fail", ["", "bug"])
def test_where_forking_is_not_to_be_had(study: Study, tmp_path: Path, fail: str) -> None:
    """Workers as processes of their own draw the same pieces, and how each ended is reported."""
    shot = short_shot(study, rate_fps=30, card_s=0.2)
    folder = tmp_path / "made"
    folder.mkdir()
    save_study(study, folder / "study")
    job = _job(shot, folder, ["plain"], grey(fail=fail, fail_s=START_S + 0.5), 2, "", "superfast")
    assert job.workers == 2 and len(job.pieces) > 2
    (folder / "job.json").write_text(json.dumps(asdict(job)))
    code = "from render.output.film_worker import main; raise SystemExit(main(['film'], forks=False))"
    done = subprocess.run([sys.executable, "-c", code], input=f"{folder / 'job.json'}\n", capture_output=True,
                          text=True, cwd=Path(__file__).parents[2])  # fmt: skip
    reports = [json.loads(line) for line in done.stdout.splitlines()]
    ends = sorted((r["run"], r["exit"]) for r in reports if "exit" in r)
    if fail:
        assert done.returncode == 1 and (0, 1) in ends and "RuntimeError: a bug" in done.stderr
        return
    assert (done.returncode, ends) == (0, [(0, 0), (1, 0)]), done.stderr
    film = np.concatenate([decoded(segment_paths(job, piece)[0]) for piece in range(len(job.pieces))])
    want = [grey_of(float(t) - START_S) for t in shot.time_s[:43]]
    assert np.abs(film[:43, 60, 80, 0].astype(int) - want).max() <= 3


@pytest.mark.skipif(os.name != "posix", reason="signals of POSIX")
def test_interruption_leaves_no_file_and_no_process(study: Study, tmp_path: Path) -> None:
    """Ctrl-C while two workers and their encoders run."""
    save_study(study, tmp_path / "study")
    out = tmp_path / "out"
    code = (
        "import sys\n"
        "from render.study_io import load_study\n"
        "from render.output.film import write_film\n"
        "from render.output.shot import plan_shot\n"
        "from render.output.source import SourceSpec\n"
        f"study = load_study({str(tmp_path / 'study')!r})\n"
        "shot = plan_shot(study, 'right', size_px=(160, 120))\n"
        "spec = SourceSpec('tests.output.drawn:open_grey', {'slow_s': 0.05})\n"
        "try:\n"
        f"    write_film(study, 'right', {str(out / 'film.mp4')!r}, shot=shot, source=spec,\n"
        "               progress=lambda done, total: print(done, flush=True))\n"
        "except KeyboardInterrupt:\n"
        "    sys.exit(130)\n"
    )
    root = Path(__file__).parents[2]
    process = subprocess.Popen([sys.executable, "-c", code], stdout=subprocess.PIPE, text=True, cwd=root)
    assert process.stdout is not None and process.stdout.readline().strip().isdigit()
    assert len(alive(str(out))) >= 2
    process.send_signal(signal.SIGINT)
    assert process.wait(timeout=20) == 130
    assert list(out.iterdir()) == []
    assert alive(str(out)) == []


@pytest.mark.skipif(os.name != "posix", reason="signals of POSIX")
def test_workers_end_when_their_starter_is_killed(study: Study, tmp_path: Path) -> None:
    save_study(study, tmp_path / "study")
    out = tmp_path / "out"
    code = (
        "from render.study_io import load_study\n"
        "from render.output.film import write_film\n"
        "from render.output.shot import plan_shot\n"
        "from render.output.source import SourceSpec\n"
        f"study = load_study({str(tmp_path / 'study')!r})\n"
        "spec = SourceSpec('tests.output.drawn:open_grey', {'slow_s': 0.05})\n"
        f"write_film(study, 'right', {str(out / 'film.mp4')!r}, source=spec,\n"
        "           shot=plan_shot(study, 'right', size_px=(160, 120)),\n"
        "           progress=lambda done, total: print(done, flush=True))\n"
    )
    root = Path(__file__).parents[2]
    process = subprocess.Popen([sys.executable, "-c", code], stdout=subprocess.PIPE, text=True, cwd=root)
    assert process.stdout is not None and process.stdout.readline().strip().isdigit()
    process.kill()
    process.wait()
    until = time.monotonic() + 10
    while alive(str(out)) and time.monotonic() < until:
        time.sleep(0.1)
    assert alive(str(out)) == []


def test_no_encoder_says_what_to_install(study: Study, tmp_path: Path, monkeypatch: pytest.MonkeyPatch) -> None:
    def missing() -> str:
        raise RuntimeError("No ffmpeg exe could be found")

    monkeypatch.setattr(imageio_ffmpeg, "get_ffmpeg_exe", missing)
    with pytest.raises(MachineError, match="no video encoder: install the Python package imageio-ffmpeg"):
        write_film(study, "right", tmp_path / "film.mp4", shot=short_shot(study), source=grey())
    assert list(tmp_path.iterdir()) == []


@pytest.mark.skipif(not Path("/dev/full").exists(), reason="needs the device that is always full")
def test_a_full_disk_is_named(tmp_path: Path) -> None:
    with (
        pytest.raises(MachineError, match="is full; nothing was left there"),
        encode.SegmentWriter(Path("/dev/full"), SIZE, 10) as writer,
    ):
        for level in range(200):
            rng = np.random.default_rng(level)  # noise: enough bytes to meet the full disk
            writer.write(rng.integers(0, 255, (SIZE[1], SIZE[0], 3), dtype=np.uint8))


def test_sizes_that_h264_cannot_take(study: Study) -> None:
    assert short_shot(study).size_px == SIZE
    assert plan_shot(study, "right", size_px=(161, 119)).size_px == (162, 120)
    with pytest.raises(LatepullError, match="film size 10000x120: the width must be 32 to 7680 pixels"):
        plan_shot(study, "right", size_px=(10000, 120))
