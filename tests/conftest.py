"""For all tests: how they are shared, commands as a user gives them; hypothesis has no deadline on a busy machine."""

from __future__ import annotations

from collections.abc import Callable, Iterator
from pathlib import Path
from typing import Any

import pytest
from hypothesis import settings

from tests import sharing

Ran = tuple[int, str, str]
Run = Callable[..., Ran]

settings.register_profile("latepull", deadline=None)
settings.load_profile("latepull")


def pytest_addoption(parser: pytest.Parser) -> None:
    """Options of our own."""
    parser.addoption("--update-baselines", action="store_true", help="renew the pictures of tests/picture/baseline")


def pytest_configure(config: pytest.Config) -> None:
    """Workers compile in turn, and fly on one thread each."""
    if sharing.is_worker():
        sharing.compile_in_turn()
        sharing.one_thread_each()


@pytest.fixture
def all_threads() -> Iterator[None]:
    """Kernels on all cores, also where the tests are shared: for what may depend on it."""
    import numba

    before = numba.get_num_threads()
    numba.set_num_threads(numba.config.NUMBA_NUM_THREADS)
    yield
    numba.set_num_threads(before)


def pytest_xdist_make_scheduler(config: pytest.Config, log: Any) -> sharing.Share | None:
    """Our own way of sharing, in place of --dist loadfile."""
    return sharing.Share(config, log) if config.getoption("dist") == "loadfile" else None


def pytest_collection_modifyitems(items: list[pytest.Item]) -> None:
    """What takes longest comes first, where the tests are shared."""
    if sharing.is_worker():
        items.sort(key=lambda item: sharing.rank(item.nodeid))


@pytest.fixture
def run(tmp_path: Path, monkeypatch: pytest.MonkeyPatch, capsys: pytest.CaptureFixture[str]) -> Run:
    """Run a command in an empty folder; returns exit code, what it printed and what it complained of."""
    monkeypatch.chdir(tmp_path)

    def command(*words: str) -> Ran:
        capsys.readouterr()
        from render.command import main

        code = main(words)
        out = capsys.readouterr()
        assert "Traceback" not in out.err
        return code, out.out, out.err

    return command
