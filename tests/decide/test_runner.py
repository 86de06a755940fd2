"""Chunks on a cluster: a real one over loopback, a worker killed in the middle, versions that differ."""

from __future__ import annotations

import os
import signal
import socket
from collections.abc import Iterator
from pathlib import Path
from typing import Any

import numpy as np
import pytest

from render.decide.cases import per_case
from render.decide.chunks import Folder, work_in_chunks
from render.decide.map import grid_values, map_axes
from render.decide.runner import (
    Cluster,
    ClusterError,
    Local,
    VersionsDiffer,
    check_workers,
    differences,
    marks,
    runner,
    source_hash,
)
from render.decide.values import common_of
from render.errors import LatepullError
from scenes.reader import read_airframe, read_scene
from terrain.ground import read_ground


def test_marks_that_differ_are_named() -> None:
    mine = {"numpy": "2.1.0", "python": "3.11.7", "source": "ab"}
    assert differences(mine, mine) == []
    # a bugfix of Python itself decides nothing
    assert differences(mine, {**mine, "python": "3.11.9"}) == []
    assert differences(mine, {**mine, "python": "3.12.1"}) == ["python 3.12.1 there, 3.11.7 here"]
    assert differences(mine, {"numpy": "2.0.0", "python": "3.11.7"}) == [
        "numpy 2.0.0 there, 2.1.0 here", "source missing there, ab here"]


def test_the_source_is_one_and_the_same() -> None:
    assert source_hash() == source_hash() == marks()["source"]
    assert source_hash(whole=True) != source_hash()


def test_nothing_at_the_address(monkeypatch: pytest.MonkeyPatch) -> None:
    pytest.importorskip("distributed")
    monkeypatch.setattr("render.decide.runner.CONNECT_S", 0.5)
    with socket.socket() as free:
        free.bind(("127.0.0.1", 0))
        port = free.getsockname()[1]
    with pytest.raises(ClusterError, match=f"no cluster answers at tcp://127.0.0.1:{port}"), \
            runner(f"tcp://127.0.0.1:{port}"):
        pass
    with pytest.raises(LatepullError), runner("not an address"):
        pass


def test_no_dask_is_said(monkeypatch: pytest.MonkeyPatch) -> None:
    import sys

    monkeypatch.setitem(sys.modules, "distributed", None)
    with pytest.raises(LatepullError, match=r"pip install 'latepull\[cluster\]'"), runner("tcp://127.0.0.1:1"):
        pass
    with runner() as here:
        assert list(here.run(lambda common, chunk: common + chunk, 1, [(7, 2)])) == [(7, 3)]


@pytest.fixture(scope="module")
def cluster() -> Iterator[Any]:
    """Two workers over loopback, each a process of its own with a nanny that begins it again."""
    distributed = pytest.importorskip("distributed")
    with distributed.LocalCluster(n_workers=2, threads_per_worker=1, processes=True, dashboard_address=None,
                                  host="127.0.0.1", memory_limit="4GiB") as made:
        yield made


@pytest.mark.slow
def test_a_worker_killed_in_the_middle_costs_its_chunk_alone(cluster: Any, tmp_path: Path) -> None:
    """The map made without it is the local one, to the last bit."""
    scene, x, y = map_axes(read_scene("late_freeze"), "loop_angle=190:310:10deg", "fraction=0:80:20%")
    common = common_of(scene, read_airframe, read_ground(scene.ground, scene.seed))
    values = grid_values(x, y)
    local = work_in_chunks(common, values, Local(), Folder(tmp_path / "local", "k", 9), chunk=8)
    killed: list[int] = []
    done: list[int] = []

    def kill_one(finished: int, total: int) -> None:
        done.append(finished)
        if 0 < finished < total and not killed:
            # a worker that is at a chunk now, by its own process id
            pids = _pids(cluster)
            os.kill(pids[0], signal.SIGKILL)
            killed.append(pids[0])

    with runner(cluster.scheduler_address) as run:
        far = work_in_chunks(common, values, run, Folder(tmp_path / "far", "k", 9), chunk=8, progress=kill_one)
    assert len(killed) == 1 and killed[0] not in _pids(cluster)
    assert done[0] == 0 and done[-1] == len(values) == 65
    assert far.error == local.error
    for name in per_case():
        np.testing.assert_array_equal(getattr(far, name), getattr(local, name), err_msg=name)


def _pids(cluster: Any) -> list[int]:
    """Process ids of the workers there are now."""
    from distributed import Client

    with Client(cluster.scheduler_address, set_as_default=False) as client:
        return sorted(client.run(os.getpid).values())


@pytest.mark.slow
def test_workers_of_another_version_are_refused(cluster: Any) -> None:
    """At the start, and with each chunk, for workers that join later."""
    from distributed import Client

    other = {**marks(), "numpy": "9.9.9"}
    with Client(cluster.scheduler_address, set_as_default=False) as client:
        with pytest.raises(VersionsDiffer, match=r"client and workers differ[^\n]*\n.*numpy .* there, 9.9.9 here"):
            check_workers(client, "there", other)
        with pytest.raises(VersionsDiffer, match="a worker joined with other versions"):
            list(Cluster(client, "there", other).run(divmod, 7, [(0, 2)]))


@pytest.mark.slow
def test_what_a_chunk_raises_is_raised_here(cluster: Any) -> None:
    with runner(cluster.scheduler_address) as run, pytest.raises(ZeroDivisionError):
        list(run.run(divmod, 1, [(0, 0)]))
