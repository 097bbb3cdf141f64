"""A real scheduler with real workers on this machine, spoken to by tls, for the cluster's tests."""

from __future__ import annotations

import contextlib
import os
import signal
import subprocess
import sys
from collections.abc import Iterator
from pathlib import Path

HERE = Path(__file__).parent
TLS = HERE / "tls"


class Rig:
    """The processes, and where the scheduler listens."""

    def __init__(self, folder: Path) -> None:
        self._folder = folder
        self._scheduler = self._start("scheduler", "--port", "0")
        self.address = self._heard("Scheduler at:")
        self.workers: list[subprocess.Popen[str]] = []

    def worker(self) -> subprocess.Popen[str]:
        """Start a worker of one thread, watched by its nanny."""
        process = self._start("worker", self.address, "--nthreads", "1")
        self.workers.append(process)
        return process

    def end(self) -> None:
        """End all of it, what a nanny started included."""
        for process in (*self.workers, self._scheduler):
            self.kill(process)
            process.wait()
            process.stderr.close()

    def kill(self, process: subprocess.Popen[str]) -> None:
        """End a worker and its nanny as a power cut would."""
        with contextlib.suppress(ProcessLookupError):
            os.killpg(process.pid, signal.SIGKILL)

    def _start(self, what: str, *options: str) -> subprocess.Popen[str]:
        paths = os.pathsep.join([str(HERE), str(HERE.parent.parent)])
        secured = ["--tls-ca-file", str(TLS / "ca.pem"), "--tls-cert", str(TLS / "cert.pem")]
        secured += ["--tls-key", str(TLS / "key.pem"), "--protocol", "tls"]
        return subprocess.Popen(
            [
                *(sys.executable, "-m", f"distributed.cli.dask_{what}", *options, *secured),
                *("--host", "127.0.0.1", "--no-dashboard"),
            ],
            stderr=subprocess.PIPE,
            stdout=subprocess.DEVNULL,
            text=True,
            cwd=self._folder,
            start_new_session=True,
            env={**os.environ, "PYTHONPATH": paths},
        )

    def _heard(self, word: str) -> str:
        said = ""
        for line in self._scheduler.stderr:
            said += line
            if word in line:
                return line.split(word)[1].strip()
        raise AssertionError(f"the scheduler did not come up:\n{said}")


@contextlib.contextmanager
def rig(folder: Path, *, workers: int) -> Iterator[Rig]:
    """Have a scheduler and some workers for a while."""
    made = Rig(folder)
    try:
        for _ in range(workers):
            made.worker()
        yield made
    finally:
        made.end()
