"""On what kind of filesystem a file lies, where the system tells."""

from __future__ import annotations

import os
from pathlib import Path

# Filesystems over a network, on which SQLite's write-ahead log is unsafe ("Write-Ahead Logging", sqlite.org,
# section 1: all processes must be on one host). Names as Linux mount tables print them.
NETWORK_TYPES = frozenset(
    "nfs nfs3 nfs4 cifs smb smb2 smb3 smbfs ncpfs ncp afs coda ceph glusterfs lustre gpfs beegfs panfs pvfs2 orangefs "
    "ocfs2 gfs gfs2 davfs davfs2 webdav sshfs afpfs acfs".split()
)
NETWORK_FUSE = frozenset(
    "sshfs s3fs rclone glusterfs cephfs davfs davfs2 smbnetfs curlftpfs gcsfuse goofys blobfuse".split()
)
MOUNT_TABLE = "/proc/self/mounts"


def network_type(path: str | os.PathLike[str], mount_table: str = MOUNT_TABLE) -> str:
    """The network filesystem that `path` lies on, such as `nfs4`; empty where it is local or unknown."""
    text = os.fspath(path)
    if text.startswith(("\\\\", "//")) and os.name == "nt":
        return "a network share"
    kind = mounted_type(os.path.realpath(text), mount_table)
    if kind.startswith("fuse."):
        return kind if kind.removeprefix("fuse.") in NETWORK_FUSE else ""
    return kind if kind in NETWORK_TYPES else ""


def mounted_type(real_path: str, mount_table: str) -> str:
    """The type of the innermost mount that holds `real_path`; empty where the table cannot be read."""
    try:
        lines = Path(mount_table).read_text(encoding="utf-8", errors="surrogateescape").splitlines()
    except OSError:
        return ""
    best, best_type = "", ""
    for line in lines:
        fields = line.split(" ")
        if len(fields) < 3:
            continue
        point = unescaped(fields[1])
        inside = real_path == point or real_path.startswith(point.rstrip("/") + "/")
        if inside and len(point) >= len(best):  # a later mount on one point covers the earlier
            best, best_type = point, fields[2]
    return best_type


def unescaped(point: str) -> str:
    r"""A mount point with its octal escapes undone.

    >>> unescaped(r"/media/my\040disk")
    '/media/my disk'
    """
    for code, plain in (("\\040", " "), ("\\011", "\t"), ("\\012", "\n"), ("\\134", "\\")):
        point = point.replace(code, plain)
    return point
