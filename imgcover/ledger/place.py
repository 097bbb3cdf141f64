"""Whether a ledger may lie where it is asked to: WAL does not hold on a network share."""

from __future__ import annotations

import re
import sys
from pathlib import Path

NETWORK_KINDS = frozenset(
    {
        *("nfs", "nfs3", "nfs4", "cifs", "smb", "smb2", "smb3", "smbfs", "afs", "ncpfs"),
        *("ceph", "lustre", "gpfs", "beegfs", "glusterfs", "davfs", "ocfs2", "gfs2", "pvfs2"),
        *("fuse.sshfs", "fuse.glusterfs", "fuse.davfs2", "fuse.rclone", "fuse.s3fs", "fuse.ceph"),
    }
)
"""File systems whose locks or shared memory do not reach every machine that has them open."""
MOUNTS = Path("/proc/self/mountinfo")
"""Linux's table of what is mounted where."""


def network_kind(path: Path, *, mounts: str | None = None) -> str | None:
    """Name the network file system that a path lies on.

    Parameters
    ----------
    path : Path
        Absolute; it need not exist.
    mounts : str, optional
        A table in the form of Linux's mountinfo; read from the system when not given.

    Returns
    -------
    str or None
        None for a local disk, and where the system does not say (macOS).
    """
    if sys.platform == "win32":
        return _windows_kind(path)
    if mounts is None:
        if not MOUNTS.exists():
            return None
        mounts = MOUNTS.read_text(encoding="utf-8", errors="surrogateescape")
    kind = _kind_by_mount(path, mounts)
    return kind if kind in NETWORK_KINDS else None


def _kind_by_mount(path: Path, mounts: str) -> str | None:
    """Follow the deepest mount above the path; of two on one point the later one is seen."""
    deepest, kind = -1, None
    for line in mounts.splitlines():
        left, bar, right = line.partition(" - ")
        fields = left.split(" ")
        if not bar or len(fields) < 5:
            continue
        point = Path(_unescaped(fields[4]))
        if path.is_relative_to(point) and len(point.parts) >= deepest:
            deepest, kind = len(point.parts), right.split(" ")[0]
    return kind


def _unescaped(field: str) -> str:
    """Undo the octal escapes that mountinfo uses for blanks and backslashes."""
    return re.sub(r"\\([0-7]{3})", lambda match: chr(int(match[1], 8)), field)


def _windows_kind(path: Path) -> str | None:
    if path.drive.startswith("\\\\"):
        return "a shared folder"
    if sys.platform == "win32":
        import ctypes

        remote = 4  # DRIVE_REMOTE of GetDriveTypeW
        if ctypes.windll.kernel32.GetDriveTypeW(path.anchor) == remote:
            return "a network drive"
    return None


__all__ = ["network_kind"]
