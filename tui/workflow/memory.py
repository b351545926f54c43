"""Keep freed memory in the process while fits run."""

from __future__ import annotations

import ctypes
import sys

TRIM_THRESHOLD, MMAP_THRESHOLD = -1, -3  # names of glibc's malloc.h
KEPT_BYTES = 512 << 20
LARGEST_BYTES = 32 << 20  # the most that glibc takes


def keep_freed_memory() -> None:
    """Ask glibc not to give arrays back to the system each time one is freed, only to fetch new pages at once.

    Fits make many arrays of some 100 kB; the page faults took a third of their time. Elsewhere nothing is done.
    """
    if not sys.platform.startswith("linux"):
        return
    try:
        adjust = ctypes.CDLL(None).mallopt
    except (OSError, AttributeError):  # another C library
        return
    adjust(MMAP_THRESHOLD, LARGEST_BYTES)
    adjust(TRIM_THRESHOLD, KEPT_BYTES)
