"""An order for a machine that does not see this disk: what its files hold travels with it."""

from __future__ import annotations

import hashlib
from dataclasses import replace
from functools import lru_cache
from pathlib import Path

from imgcover.audit.grounds import OffGroundsError, read_file
from imgcover.audit.orders import Order
from imgcover.request import Enclosed


def packed(order: Order) -> Order:
    """Put into an order what its picture, its exposures and its certificate hold.

    Parameters
    ----------
    order : Order

    Returns
    -------
    Order
        A file that cannot be read is left as its name, and the worker says so.
    """
    if order.path is None:
        return order
    options = order.options
    options = replace(
        options,
        blank=_enclosed(options.blank),
        dark=_enclosed(options.dark),
        device=_certificate(options.device),
    )
    try:
        return replace(order, options=options, content=read_file(order.path))
    except OffGroundsError as fault:
        return replace(order, path=None, fault=str(fault))


def _certificate(device: str | Enclosed | None) -> str | Enclosed | None:
    if device is None or isinstance(device, Enclosed):
        return device
    from imgcover.scale.certificate import find_certificate

    enclosed = _enclosed(find_certificate(device))
    return enclosed if isinstance(enclosed, Enclosed) else device


def _enclosed(path: Path | Enclosed | None) -> Path | Enclosed | None:
    if path is None or isinstance(path, Enclosed):
        return path
    try:
        state = path.stat()
        return _read(path, state.st_mtime_ns, state.st_size)
    except (OSError, OffGroundsError):
        return path


@lru_cache(maxsize=4)
def _read(path: Path, changed_ns: int, size: int) -> Enclosed:
    """Pictures share exposures; the file's time and size show that it was replaced."""
    content = read_file(path.resolve())
    return Enclosed(path.name, hashlib.sha256(content).hexdigest(), content)


__all__ = ["packed"]
