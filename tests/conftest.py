"""For all tests: hypothesis without a deadline, since a test must not depend on how busy the machine is."""

from __future__ import annotations

from collections.abc import Iterator
from typing import Any

import pytest
from hypothesis import settings

from tests import sharing

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
