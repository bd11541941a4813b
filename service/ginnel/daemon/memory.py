"""Memory of a process that runs for a year, as far as the C library has a say in it (glibc only)."""

from __future__ import annotations

import ctypes

# Numbers of mallopt(3).
_M_MMAP_THRESHOLD, _M_ARENA_MAX = -3, -8
_LARGE_BYTES = 1 << 16


def use_memory_sparingly() -> None:
    """Give arrays pages of their own, which go back when they are freed, and threads few heaps.

    Left to itself, glibc raises the size from which it does so, and the heap frays over days.
    """
    mallopt = getattr(ctypes.CDLL(None), "mallopt", None)
    if mallopt is not None:
        mallopt(_M_MMAP_THRESHOLD, _LARGE_BYTES)
        mallopt(_M_ARENA_MAX, 2)


def give_memory_back() -> None:
    """Let the system have what was used once, in a crowd, and is kept for no use."""
    trim = getattr(ctypes.CDLL(None), "malloc_trim", None)
    if trim is not None:
        trim(0)
