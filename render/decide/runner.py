"""Chunks of work run here or on a Dask cluster: the same pure function, the same results.

A chunk is done whole or not at all. On a cluster a worker that is lost costs the chunks it was at, which go to
others; versions and source are compared between this machine and every worker, at the start and with each chunk.
"""

from __future__ import annotations

import hashlib
import re
import threading
from collections.abc import Callable, Iterator, Sequence
from contextlib import contextmanager
from pathlib import Path
from typing import Any, Protocol, TypeVar

from render.errors import LatepullError, MachineError
from render.study import versions

Result = TypeVar("Result")
Work = Callable[[Any, Any], Result]
"""A pure function at the top of a module: what all chunks share, then the chunk."""

CONNECT_S = 10.0
ADDRESS = re.compile(r"([a-z]+://)?([\w.-]+|\[[0-9a-fA-F:.]+\]):\d{1,5}(/\S*)?")
_ALONE = threading.Lock()
RETRIES = 3  # how often a chunk is begun again after losing its worker or machine trouble there


class ClusterError(MachineError):
    """The cluster can't be reached, has no workers, or lost them."""


class VersionsDiffer(LatepullError):
    """Client and workers would not compute the same thing."""


class Runner(Protocol):
    """Runs chunks; yields (chunk's number, result) as they are done, in any order."""

    where: str

    def run(self, work: Work[Any], common: Any, chunks: Sequence[tuple[int, Any]]) -> Iterator[tuple[int, Any]]:
        """Run numbered chunks. Whatever a chunk raises is raised here."""
        ...


def source_hash(*, whole: bool = False) -> str:
    """SHA-256 over the source of everything that decides a figure, so that equal versions mean equal code.

    whole: over all of the program, pictures and outputs too.
    """
    root = Path(__file__).resolve().parents[2]
    digest = hashlib.sha256()
    rooms = ("terrain", "scenes", "render") if whole else (
        "terrain", "scenes", "render/flight", "render/margin", "render/sight", "render/decide")
    files = [f for room in rooms for f in sorted((root / room).rglob("*")) if f.suffix in (".py", ".glsl")]
    for file in [*files, root / "render" / "frames.py", root / "render" / "study.py"]:
        digest.update(file.relative_to(root).as_posix().encode() + b"\0" + file.read_bytes())
    return digest.hexdigest()[:16]


def marks() -> dict[str, str]:
    """Versions of what the figures come from, with the hash of our own source."""
    return {**versions(), "source": source_hash()}


def differences(mine: dict[str, str], theirs: dict[str, str]) -> list[str]:
    """What differs between two sets of marks, in words; the last digit of a Python version doesn't count."""

    def plain(name: str, value: str | None) -> str | None:
        return ".".join(value.split(".")[:2]) if name == "python" and value else value

    return [
        f"{name} {theirs.get(name, 'missing')} there, {mine.get(name, 'missing')} here"
        for name in sorted(mine.keys() | theirs.keys())
        if plain(name, mine.get(name)) != plain(name, theirs.get(name))
    ]


class Local:
    """Chunks one after another in this process; the kernels inside use all its cores."""

    where = "on this machine"

    def run(self, work: Work[Any], common: Any, chunks: Sequence[tuple[int, Any]]) -> Iterator[tuple[int, Any]]:
        """See Runner."""
        for number, chunk in chunks:
            yield number, work(common, chunk)


def _same(common: Any) -> Any:
    return common


def _checked(work: Work[Any], common: Any, chunk: Any, mine: dict[str, str]) -> Any:
    """Run a chunk on a worker whose marks are the client's; else say what differs (not raised: no retries for it)."""
    found = differences(mine, marks())
    if found:
        return VersionsDiffer("a worker joined with other versions: " + "; ".join(found))
    # the simplest of numba's ways to use all cores can't be entered by two threads of a worker at once
    with _ALONE:
        return work(common, chunk)


class Cluster:
    """Chunks on the workers of a Dask cluster."""

    def __init__(self, client: Any, address: str, mine: dict[str, str]) -> None:
        self._client, self._mine = client, mine
        self._shared: tuple[Any, Any] | None = None  # what the last chunks shared, and where it is
        self.where = f"on the cluster at {address}"

    def run(self, work: Work[Any], common: Any, chunks: Sequence[tuple[int, Any]]) -> Iterator[tuple[int, Any]]:
        """See Runner."""
        from distributed import KilledWorker, as_completed

        # what is shared goes out once, not with every chunk; as a task, so that it is made again if it is lost
        if self._shared is None or self._shared[0] is not common:
            self._shared = common, self._client.submit(_same, common, pure=False)
        shared = self._shared[1]
        numbers = {}
        for number, chunk in chunks:
            future = self._client.submit(_checked, work, shared, chunk, self._mine, retries=RETRIES, pure=False)
            numbers[future] = number
        try:
            for future in as_completed(list(numbers), loop=self._client.loop):
                try:
                    result = future.result()
                except KilledWorker as exc:
                    raise ClusterError(
                        f"chunk {numbers[future]} lost its worker {RETRIES + 1} times; the finished ones are kept: "
                        "look at the workers' memory and logs, then go on with --resume"
                    ) from exc
                if isinstance(result, VersionsDiffer):
                    raise result
                yield numbers[future], result
                future.release()
        finally:
            # also after Ctrl-C or an error: nothing goes on unseen
            self._client.cancel([f for f in numbers if not f.done()])


@contextmanager
def runner(cluster: str | None = None) -> Iterator[Runner]:
    """The runner for this machine, or for the Dask scheduler at an address such as ``tcp://host:8786``.

    Raises LatepullError (Dask is not installed, versions differ) or ClusterError (nothing there, no workers).
    """
    if cluster is None:
        yield Local()
        return
    try:
        from distributed import Client
    except ImportError:
        raise LatepullError("--cluster needs Dask, which is not installed: pip install 'latepull[cluster]'") from None
    if not ADDRESS.fullmatch(cluster):
        raise ClusterError(f"--cluster: read {cluster}, wanted the address of a Dask scheduler, such as tcp://host:8786")
    try:
        client = Client(cluster, timeout=CONNECT_S, set_as_default=False)
    except (OSError, ValueError, TimeoutError) as exc:
        raise ClusterError(f"no cluster answers at {cluster} within {CONNECT_S:.0f} s; wanted the address of a Dask "
                           "scheduler, such as tcp://host:8786") from exc
    try:
        mine = marks()
        check_workers(client, cluster, mine)
        yield Cluster(client, cluster, mine)
    finally:
        client.close()


def check_workers(client: Any, address: str, mine: dict[str, str]) -> None:
    """Compare versions and source with every worker there is now. Raises VersionsDiffer or ClusterError."""
    if not client.scheduler_info(n_workers=-1)["workers"]:
        raise ClusterError(f"the cluster at {address} has no workers; start some with `dask worker {address}`")
    try:
        theirs = client.run(marks)
    except ModuleNotFoundError as exc:
        raise VersionsDiffer(f"the workers at {address} lack latepull: {exc}; install the same version there") from exc
    except Exception as exc:
        raise ClusterError(f"the workers at {address} don't answer: {exc}") from exc
    bad = {worker: differences(mine, found) for worker, found in theirs.items()}
    bad = {worker: found for worker, found in bad.items() if found}
    if bad:
        lines = [f"  {worker}: {'; '.join(found)}" for worker, found in sorted(bad.items())]
        raise VersionsDiffer("client and workers differ, so their figures would too:\n" + "\n".join(lines))
