"""What the numbers of a record were made with and from."""

from __future__ import annotations

import hashlib
import platform
from collections.abc import Mapping
from dataclasses import dataclass, field
from functools import lru_cache
from importlib.metadata import version
from pathlib import Path
from types import MappingProxyType
from typing import Any

from imgcover import __version__

LIBRARIES = ("numpy", "scipy", "opencv-python-headless", "pillow", "tifffile", "imagecodecs")
"""What decodes and computes: another version may change a last digit."""
MOST_HASHED = 4_000_000_000
"""Bytes: an unreadable picture is still named by its hash, but not if that takes minutes."""


@dataclass(frozen=True, slots=True, kw_only=True)
class Provenance:
    """What the numbers were made with and from.

    Parameters
    ----------
    imgcover : str
        This program's version.
    libraries : mapping of str to str
        Versions of Python and of what computes.
    article_sha256, device, blank, dark : str or None
        SHA-256 of the files that were used.
    options : mapping of str to object
        Everything asked that can touch a digit or a decision.
    """

    imgcover: str = __version__
    libraries: Mapping[str, str] = field(default_factory=dict)
    article_sha256: str | None = None
    device: str | None = None
    blank: str | None = None
    dark: str | None = None
    options: Mapping[str, Any] = field(default_factory=dict)

    def record(self) -> dict[str, Any]:
        """Lay it out as the record holds it."""
        return {
            "imgcover": self.imgcover,
            "libraries": dict(self.libraries),
            "article_sha256": self.article_sha256,
            "device": self.device,
            "blank": self.blank,
            "dark": self.dark,
            "options": dict(self.options),
        }


@lru_cache(maxsize=1)
def library_versions() -> Mapping[str, str]:
    """Versions of Python and of the libraries that can touch a digit."""
    return MappingProxyType(
        {"python": platform.python_version(), **{each: version(each) for each in LIBRARIES}}
    )


def file_sha256(source: Path | bytes) -> str | None:
    """Hash a file, or what it holds; None where it cannot be read, or is none that ends."""
    if isinstance(source, bytes):
        return hashlib.sha256(source).hexdigest()
    try:
        if not source.is_file() or source.stat().st_size > MOST_HASHED:
            return None
        with source.open("rb") as file:
            return hashlib.file_digest(file, "sha256").hexdigest()
    except OSError:
        return None


__all__ = ["LIBRARIES", "Provenance", "file_sha256", "library_versions"]
