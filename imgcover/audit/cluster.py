"""The same work on other machines: a dask.distributed scheduler and its workers.

A scheduler runs whatever code it is sent, and whoever reads along sees every picture. So off this
machine only `tls://` is spoken, with certificates on both sides.
"""

from __future__ import annotations

import contextlib
import importlib
import ipaddress
import time
from collections.abc import Callable, Iterable, Iterator
from pathlib import Path
from types import TracebackType
from typing import Any, Self
from urllib.parse import urlsplit

from imgcover.audit.outcome import Answer, Done, Load, Loss, Lost
from imgcover.errors import ClusterError

CONNECT_S = 20.0
"""To reach the scheduler, and for its first worker to be there."""
LOOK_S = 5.0
"""How often, at least, newly come workers are looked for."""
CERTIFICATES = ("ca.pem", "cert.pem", "key.pem")
"""In the folder that `--cluster-tls` names: the authority, our certificate, our key."""


def checked_address(address: str) -> str:
    """Refuse an address that would send pictures or code in the open.

    Parameters
    ----------
    address : str
        tcp://HOST:PORT on this machine, or tls://HOST:PORT anywhere.

    Raises
    ------
    ClusterError
        With the reason.

    Examples
    --------
    >>> checked_address("127.0.0.1:8786")
    'tcp://127.0.0.1:8786'
    """
    full = address if "://" in address else f"tcp://{address}"
    parts = urlsplit(full)
    try:
        port = parts.port
    except ValueError:
        port = None
    if parts.scheme not in ("tcp", "tls") or not parts.hostname or port is None:
        raise ClusterError("--cluster", f"no address: {address!r}", "write tls://HOST:PORT")
    if parts.scheme == "tcp" and not _is_loopback(parts.hostname):
        raise ClusterError(
            "--cluster",
            f"{parts.hostname} is another machine, and a scheduler runs any code it is sent",
            "use tls://HOST:PORT with --cluster-tls DIR",
        )
    return full


class ClusterCrew:
    """The workers of a scheduler.

    Parameters
    ----------
    address : str
        As `checked_address` takes it.
    limit_s : float
        Seconds that one piece of work may take.
    certificates : Path or None
        A folder with ca.pem, cert.pem and key.pem; needed for tls://.
    alike : callable
        Called on every worker and here; where the answers differ the cluster is refused, since the
        same picture would give different records on different machines.

    Raises
    ------
    ClusterError
        When the extra is not installed, the scheduler is not reached, has no worker, or its
        workers differ from this machine.
    """

    def __init__(
        self,
        address: str,
        *,
        limit_s: float,
        certificates: Path | None,
        alike: Callable[[], object],
    ) -> None:
        self._limit_s = limit_s
        full = checked_address(address)
        distributed = _distributed()
        try:
            self._client = distributed.Client(
                full,
                security=_security(full, certificates),
                timeout=CONNECT_S,
                set_as_default=False,
            )
            self._client.wait_for_workers(1, timeout=CONNECT_S)
            theirs = self._client.run(alike)
        except (OSError, TimeoutError) as fault:
            raise ClusterError(
                full, f"no worker is reached ({fault})", "start a scheduler and workers"
            ) from None
        here = alike()
        odd = sorted(worker for worker, said in theirs.items() if said != here)
        if odd:
            self._client.close()
            raise ClusterError(
                full,
                f"{odd[0]} has other versions of imgcover or its libraries",
                "install the same versions everywhere: records must not depend on the machine",
            )

    def __enter__(self) -> Self:
        return self

    def __exit__(
        self,
        kind: type[BaseException] | None,
        fault: BaseException | None,
        trace: TracebackType | None,
    ) -> None:
        self._client.close()

    def run(
        self, work: Callable[[Load], Answer], loads: Iterable[tuple[int, Load]]
    ) -> Iterator[Done[Answer] | Lost]:
        """Do the work on every load, as `imgcover.audit.crew.LocalCrew.run` does.

        Work on a worker that is lost is done by another; the scheduler sees to it. What took its
        workers down several times, or ran out of time, is done once more at the end, alone.
        """
        lost: list[tuple[int, Load]] = []
        for outcome, load in self._spread(work, iter(loads), alone=False):
            if isinstance(outcome, Lost) and outcome.loss is not Loss.FAULT:
                lost.append((outcome.index, load))
            else:
                yield outcome
        for outcome, _ in self._spread(work, iter(lost), alone=True):
            yield outcome

    def _spread(
        self, work: Callable[[Load], Answer], loads: Iterator[tuple[int, Load]], *, alone: bool
    ) -> Iterator[tuple[Done[Answer] | Lost, Load]]:
        underway: dict[Any, tuple[int, Load, float]] = {}
        try:
            while True:
                # asked anew each time: workers come and go
                most = 1 if alone else max(1, sum(self._client.nthreads().values()))
                while len(underway) < most:
                    following = next(loads, None)
                    if following is None:
                        break
                    index, load = following
                    future = self._client.submit(work, load, pure=False)
                    underway[future] = (index, load, time.monotonic() + self._limit_s)
                if not underway:
                    return
                for future, outcome in self._gather(underway):
                    _, load, _ = underway.pop(future)
                    yield outcome, load
        finally:
            with contextlib.suppress(Exception):  # the scheduler may be what was lost
                self._client.cancel(list(underway), force=True)

    def _gather(
        self, underway: dict[Any, tuple[int, Any, float]]
    ) -> list[tuple[Any, Done[Any] | Lost]]:
        first = min(until for _, _, until in underway.values())
        patience = min(LOOK_S, max(0.1, first - time.monotonic()))
        with self._client.as_current(), contextlib.suppress(TimeoutError):
            _distributed().wait(list(underway), timeout=patience, return_when="FIRST_COMPLETED")
        outcomes: list[tuple[Any, Done[Any] | Lost]] = []
        for future, (index, _, until) in underway.items():
            if future.done():
                outcomes.append((future, self._outcome(future, index)))
            elif time.monotonic() > until:
                self._abandon(future)
                said = f"not done in {self._limit_s:g} s"
                outcomes.append((future, Lost(index, Loss.HUNG, said)))
        return outcomes

    def _outcome(self, future: Any, index: int) -> Done[Any] | Lost:
        if future.status == "finished":
            return Done(index, future.result())
        if future.cancelled():
            raise ClusterError("--cluster", "the scheduler was lost", "start it, and audit again")
        fault = future.exception()
        if isinstance(fault, (_distributed().KilledWorker, MemoryError)):
            return Lost(index, Loss.DIED, str(fault))
        return Lost(index, Loss.FAULT, repr(fault))

    def _abandon(self, future: Any) -> None:
        """Have the worker that hangs on it started anew; only its nanny can do that."""
        busy = self._client.processing()
        holders = [worker for worker, keys in busy.items() if future.key in keys]
        self._client.cancel([future], force=True)
        with contextlib.suppress(Exception):  # a worker without a nanny stays lost
            self._client.restart_workers(holders, timeout=CONNECT_S, raise_for_error=False)


def _distributed() -> Any:
    """Load the extra: it is large, untyped, and most audits run without it."""
    try:
        return importlib.import_module("distributed")
    except ImportError:
        raise ClusterError(
            "--cluster", "dask.distributed is missing", "install imgcover[cluster]"
        ) from None


def _is_loopback(host: str) -> bool:
    if host == "localhost":
        return True
    try:
        return ipaddress.ip_address(host).is_loopback
    except ValueError:
        return False


def _security(address: str, certificates: Path | None) -> Any:
    if not address.startswith("tls:"):
        return None
    if certificates is None:
        raise ClusterError("--cluster", "tls:// needs certificates", "give --cluster-tls DIR")
    missing = [name for name in CERTIFICATES if not (certificates / name).is_file()]
    if missing:
        raise ClusterError("--cluster-tls", f"no {missing[0]} in {certificates}", "put it there")
    authority, ours, key = (str(certificates / name) for name in CERTIFICATES)
    return _distributed().Security(
        tls_ca_file=authority, tls_client_cert=ours, tls_client_key=key, require_encryption=True
    )


__all__ = ["ClusterCrew", "checked_address"]
