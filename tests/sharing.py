"""How two workers share the tests so that they end together, and that only one of them compiles the flight code."""

from __future__ import annotations

import os
from collections.abc import Iterator
from contextlib import contextmanager
from pathlib import Path
from typing import Any

from xdist.scheduler import LoadFileScheduling

try:
    import fcntl
except ImportError:  # no such locks here: both compile
    fcntl = None  # type: ignore[assignment]

# Rooms and files whose tests share what takes long to make, and stay with one worker.
TOGETHER = {
    "tests/page/": "tests/page", "tests/decide/test_shape.py": "shape", "tests/decide/test_ledger.py": "shape",
    "tests/decide/test_shape_polish.py": "shape",
}
# What takes longest comes first, else one worker sits idle at the end. The first of all compiles the flight code, while
# the other worker has those that need none of it.
FIRST: tuple[str, ...] = (
    "tests/decide/test_cases.py", "tests/page", "tests/test_lint.py", "tests/output/test_film_same.py", "shape",
    "tests/test_house.py", "tests/picture/test_baselines.py", "tests/test_study.py", "tests/decide/test_scatter.py",
    "tests/decide/test_gates.py", "tests/margin/test_last_pull.py", "tests/test_command_map.py",
    "tests/picture/test_land.py", "tests/scenes/test_fuzz.py", "tests/output/test_stage_source.py",
    "tests/decide/test_map.py", "tests/decide/test_chunks.py", "tests/output/test_film.py",
    "tests/flight/test_numerics.py", "tests/test_command.py", "tests/decide/test_gate_extras.py",
    "tests/margin/test_escape.py",
)


def group_of(nodeid: str) -> str:
    """The tests that stay with one worker: a file's, a room's."""
    file = nodeid.split("::", 1)[0]
    return next((group for start, group in TOGETHER.items() if file.startswith(start)), file)


def rank(nodeid: str) -> int:
    """Where a test's group stands in ``FIRST``."""
    group = group_of(nodeid)  # what is not named there is over in seconds
    return FIRST.index(group) if group in FIRST else len(FIRST)


class Share(LoadFileScheduling):
    """``--dist loadfile`` by groups, in the order of collection."""

    def __init__(self, config: Any, log: Any = None) -> None:
        super().__init__(config, log)
        config.option.loadscopereorder = False

    def _split_scope(self, nodeid: str) -> str:
        return group_of(nodeid)


def compile_in_turn() -> None:
    """Let one process at a time compile; what it has compiled the others then find in the cache."""
    import numba
    from numba.core.compiler_lock import global_compiler_lock
    from numba.core.dispatcher import Dispatcher

    import render.flight  # noqa: F401 - says where the compiled code is kept

    if fcntl is None:
        return
    real, lock, depth = Dispatcher.compile, Path(numba.config.CACHE_DIR) / "turn", [0]

    @contextmanager
    def turn() -> Iterator[None]:
        # numba's own lock outside, so that threads can't wait for each other crosswise; it may be entered again
        with global_compiler_lock, lock.open("w") as file:
            if not depth[0]:
                fcntl.flock(file, fcntl.LOCK_EX)
            depth[0] += 1
            try:
                yield
            finally:
                depth[0] -= 1

    def compile_(self: Dispatcher, sig: Any) -> Any:
        with turn():
            return real(self, sig)

    Dispatcher.compile = compile_


def one_thread_each() -> None:
    """Two workers with two threads each on two cores only wait for each other: a seventh of the time."""
    import numba

    numba.set_num_threads(1)


def is_worker() -> bool:
    """Whether this process is one of several that share the tests."""
    return "PYTEST_XDIST_WORKER" in os.environ
