"""The processes that draw a film, seen from the one that wants it: started early, told a job, ended in any case."""

from __future__ import annotations

import json
import os
import queue
import signal
import subprocess
import sys
import tempfile
import threading
import time
from collections.abc import Callable, Sequence
from dataclasses import asdict
from pathlib import Path
from types import TracebackType
from typing import Any

from render.errors import LatepullError, MachineError
from render.output.film_worker import Job

Progress = Callable[[int, int], None]
END_WAIT_S = 3.0
JOB = "job.json"


class Drawers:
    """Drawing processes that load their libraries while the caller still works out what is to be drawn.

    A context manager; on leaving, none of them is left. Good for one film.
    """

    def __init__(self, name: str, modules: Sequence[str]) -> None:
        """name: for the system's list of processes; modules: what they load (``SourceSpec.modules``)."""
        self._log = tempfile.TemporaryFile()
        env = {**os.environ, "PYTHONPATH": os.pathsep.join(p or os.getcwd() for p in sys.path)}
        try:
            self._process = subprocess.Popen(
                [sys.executable, "-m", "render.output.film_worker", name, *modules],
                stdin=subprocess.PIPE,
                stdout=subprocess.PIPE,
                stderr=self._log,
                env=env,
                text=True,
                start_new_session=True,  # its encoders can be ended with it; Ctrl-C reaches only this process
            )
        except OSError as exc:
            self._log.close()
            raise MachineError(f"a drawing process can't be started ({exc.strerror})") from exc

    def __enter__(self) -> Drawers:
        return self

    def __exit__(
        self, kind: type[BaseException] | None, value: BaseException | None, trace: TracebackType | None
    ) -> None:
        _end(self._process)
        for pipe in (self._process.stdin, self._process.stdout):
            if pipe is not None:
                try:
                    pipe.close()
                except OSError:
                    pass  # what was never read by a process that is gone
        self._log.close()

    def draw(self, job: Job, progress: Progress | None = None) -> None:
        """Have all pieces of a job drawn into its folder; progress(done, total) is called in this thread.

        Raises MachineError, LatepullError: what a worker said, or how it ended.
        """
        path = Path(job.folder) / JOB
        path.write_text(json.dumps(asdict(job)), encoding="utf-8")
        reports: queue.Queue[dict[str, Any] | None] = queue.Queue()
        threading.Thread(target=_listen, args=(self._process, reports), daemon=True).start()
        try:
            assert self._process.stdin is not None
            self._process.stdin.write(f"{path}\n")
            self._process.stdin.flush()
        except OSError:
            pass  # it has ended already; below it is said why
        total = len(job.time_s)
        done: dict[int, int] = {}
        while True:
            if (self._process.poll() or 0) < 0:  # killed, though its workers may go on
                self._check(self._process.wait(), sum(done.values()))
            # a finite wait, so that Ctrl-C is taken on every system
            try:
                report = reports.get(timeout=0.5)
            except queue.Empty:
                continue
            if report is None:
                break
            if "error" in report:
                kind = MachineError if report["exit_code"] == MachineError.exit_code else LatepullError
                raise kind(report["error"])
            if "exit" in report:
                self._check(int(report["exit"]), done.get(report["run"], 0))
            else:
                done[report["run"]] = int(report["done"])
                if progress is not None:
                    progress(sum(done.values()), total)
        self._check(self._process.wait(), sum(done.values()))
        if sum(done.values()) != total:
            raise MachineError(f"the drawing processes ended after {sum(done.values())} of {total} frames")

    def _check(self, code: int, done: int) -> None:
        """Raise MachineError for a process that did not end well."""
        if code == 0:
            return
        if code < 0:
            raise MachineError(
                f"a drawing process was ended by signal {-code} ({signal.Signals(-code).name}) after {done} frames: "
                "out of memory, or no working software OpenGL; `latepull doctor` tells"
            )
        self._log.seek(0)
        said = self._log.read().decode("utf-8", "replace")
        words = [line for line in said.splitlines() if line.strip()] or [f"exit code {code}"]
        raise MachineError(f"a drawing process failed after {done} frames: {words[-1]}")


def _listen(process: subprocess.Popen[str], reports: queue.Queue[dict[str, Any] | None]) -> None:
    assert process.stdout is not None
    try:
        for line in process.stdout:
            try:
                report = json.loads(line)
            except ValueError:
                continue  # a library's chatter
            if isinstance(report, dict) and report.keys() & {"done", "error", "exit"}:
                reports.put(report)
    except ValueError:
        pass  # closed while it was read
    reports.put(None)


def _end(process: subprocess.Popen[str]) -> None:
    """End the drawing processes and their encoders, if any still runs, and wait until they are gone."""
    if process.poll() == 0:
        return
    if os.name != "posix":
        process.kill()
        process.wait()
        return
    # the group: a worker that crashed leaves its encoder behind for a moment
    signal_now: signal.Signals | int = signal.SIGKILL
    until = time.monotonic() + END_WAIT_S
    try:
        while time.monotonic() < until:
            os.killpg(process.pid, signal_now)
            process.poll()
            signal_now = 0  # from now on only asks whether anyone is left
            time.sleep(0.01)
    except (ProcessLookupError, PermissionError):
        pass
    process.wait()
