"""A search that is interrupted, gone on with, or flown on a cluster comes to the same pull, to the last bit."""

from __future__ import annotations

import os
import signal
from collections.abc import Iterator, Sequence
from functools import partial
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from render.command import main
from render.decide import shape_search
from render.decide.chunks import Folder, WorkChanged, WorkUnfinished
from render.decide.ledger import Ledger
from render.decide.runner import Local, Runner, runner
from render.decide.shape import freeze_all
from render.decide.shape_flights import freeze_work, frozen_of, measure_work, pulls_of
from render.decide.shape_limits import measure_pulls
from render.decide.shape_search import Shape, find_shape
from render.errors import LatepullError
from render.output.shape_words import plain_shape
from scenes.model import DEG
from tests.decide.shaped import CutOff, hero, search, whole


def same(one: Shape, other: Shape) -> None:
    assert plain_shape(one) == plain_shape(other)
    for a, b in zip((one.start, *(t.frozen for t in one.trade)), (other.start, *(t.frozen for t in other.trade)),
                    strict=True):
        assert a is not None and b is not None
        np.testing.assert_array_equal(a.lateness_s, b.lateness_s)
        np.testing.assert_array_equal(a.clear_m, b.clear_m)
    assert [t.scene for t in one.trade] == [t.scene for t in other.trade]


def test_columns_say_what_the_flights_say() -> None:
    job = hero()
    pull, again = measure_pulls(job, [job.scene])[0], pulls_of(measure_work(job, (job.scene,)))[0]
    assert pull == again and len(again.flown_load) > 80
    points = (250.0 * DEG,)
    frozen = freeze_all(job, [job.scene], np.array(points))[0]
    other = frozen_of(freeze_work(job, ((job.scene,), points)), np.array(points))[0]
    np.testing.assert_array_equal(frozen.lateness_s, other.lateness_s)
    np.testing.assert_array_equal(frozen.clear_m, other.clear_m)
    assert frozen.error == other.error == (None,)


def test_an_interrupted_search_goes_on_and_ends_the_same(tmp_path: Path) -> None:
    full, pieces = whole()
    folder = Folder(tmp_path / "work", "key", None)
    assert pieces > 8
    with pytest.raises(KeyboardInterrupt):
        search(CutOff(pieces // 2), folder)
    assert len(list(folder.path.glob("*.npz"))) == pieces // 2
    with pytest.raises(WorkUnfinished, match=f"{pieces // 2} finished chunks of this work; --resume goes on"):
        search(Local(), folder)
    # only what is not there is flown; interrupted again, in the middle of another generation
    with pytest.raises(KeyboardInterrupt):
        search(CutOff(2), folder, resume=True)
    rest = CutOff()
    same(search(rest, folder, resume=True), full)
    assert rest.done == pieces - pieces // 2 - 2


def test_kept_pieces_of_other_work_are_not_taken(tmp_path: Path) -> None:
    folder = Folder(tmp_path / "work", "key", None)

    def double(common: None, piece: tuple[float, ...]) -> dict[str, Any]:
        return {"twice": 2.0 * np.array(piece)}

    seen: list[int] = []
    ledger = Ledger(Local(), folder)
    found = ledger.work(double, None, [(1.0,), (2.0,)], seen.append)
    assert [float(f["twice"][0]) for f in found] == [2.0, 4.0] and seen == [0, 1] and ledger.fresh == 2
    again = Ledger(Local(), folder, resume=True)
    assert float(again.work(double, None, [(1.0,)])[0]["twice"][0]) == 2.0 and again.fresh == 0
    with pytest.raises(WorkChanged, match="another piece of work"):
        again.work(double, None, [(3.0,)])
    (folder.path / "000000.npz").write_bytes(b"half a file")
    with pytest.raises(WorkChanged, match="damaged"):
        Ledger(Local(), folder, resume=True).work(double, None, [(1.0,)])
    with pytest.raises(WorkChanged, match="another scene text, grid or version"):
        Ledger(Local(), Folder(folder.path, "other", None), resume=True)
    ledger.close()
    assert not folder.path.exists()


def test_the_command_goes_on_and_refuses_a_changed_scene(
    tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]
) -> None:
    scene, out = tmp_path / "mine.yaml", tmp_path / "o"
    scene.write_text("like: late_freeze\ntitle: mine\n", encoding="utf-8")
    words = ["shape", str(scene), "--out", str(out), "--max-g", "4.8 g", "--freeze-step", "45 deg", "--trade", "1",
             "--budget", "60", "--no-maps"]
    monkeypatch.setattr(shape_search, "PEOPLE", 6)  # small generations, as in ``search``
    monkeypatch.setattr(shape_search, "find_shape", partial(find_shape, people=6))
    real = Local.run
    cut = CutOff(5)
    monkeypatch.setattr(Local, "run", lambda self, work, common, chunks: cut.run(work, common, chunks))
    assert main(words) == 130
    assert "give --resume to go on" in capsys.readouterr().err and not list(out.glob("shape.*g"))
    monkeypatch.setattr(Local, "run", real)
    for more, said in (([], "5 finished chunks of this work; --resume goes on from them"),
                       (["--resume", "--seed", "2"], "another scene text, grid or version")):
        assert main([*words, *more]) == 2
        assert said in capsys.readouterr().err
    text = scene.read_text(encoding="utf-8")
    scene.write_text(text + "floor: 120 ft\n", encoding="utf-8")
    assert main([*words, "--resume"]) == 2
    assert "another scene text, grid or version" in capsys.readouterr().err
    scene.write_text(text, encoding="utf-8")
    assert main([*words, "--resume"]) == 0
    assert not (out / "shape.unfinished").exists() and (out / "shape.json").exists()


@pytest.mark.slow
def test_a_search_on_a_cluster_that_loses_a_worker_is_the_local_one() -> None:
    distributed = pytest.importorskip("distributed")
    killed: list[int] = []

    class Killing:
        """A cluster's runner that ends a worker once, when some pieces are done."""

        def __init__(self, inner: Runner, pids: list[int]) -> None:
            self.inner, self.where, self.pids, self.done = inner, inner.where, pids, 0

        def run(self, work: Any, common: Any, chunks: Sequence[tuple[int, Any]]) -> Iterator[tuple[int, Any]]:
            for result in self.inner.run(work, common, chunks):
                self.done += 1
                if self.done == 3:
                    os.kill(self.pids[0], signal.SIGKILL)
                    killed.append(self.pids[0])
                yield result

    with distributed.LocalCluster(n_workers=2, threads_per_worker=1, processes=True, dashboard_address=None,
                                  host="127.0.0.1", memory_limit="4GiB") as made:
        with distributed.Client(made.scheduler_address, set_as_default=False) as client:
            pids = sorted(client.run(os.getpid).values())
        with runner(made.scheduler_address) as run:
            far = search(Killing(run, pids))
    assert killed == [pids[0]]
    same(far, whole()[0])


@pytest.mark.parametrize("address", ["nonsense", "tcp://host", "tcp:// host:1", ""])
def test_what_is_no_address_is_said_at_once(address: str) -> None:
    with pytest.raises(LatepullError, match="wanted the address of a Dask scheduler"), runner(address):
        pass
