"""Memory that is freed and soon wanted again, kept by the process where a log is very long."""

from __future__ import annotations

import sys

__all__ = ["keep_freed_memory"]

# of the GNU C library, as <malloc.h> numbers them
_TRIM_THRESHOLD, _MMAP_THRESHOLD, _ARENAS = -1, -3, -8
_LARGEST_BLOCK = 32 << 20  # bytes; the library takes no larger threshold
_MOST_KEPT = 2**31 - 1
_FEW = 2


def keep_freed_memory() -> bool:
    """Have the C library reuse what is freed, rather than hand it back and ask for it anew; whether it could be told.

    Thousands of arrays of some megabytes are formed and dropped while a very long log is read. Handed back each
    time, the system clears their pages each time, which takes a sixth of the whole run. The largest amount in use
    stays what it was.
    """
    if not sys.platform.startswith("linux"):
        return False
    import ctypes

    try:
        mallopt = ctypes.CDLL(None).mallopt
    except (AttributeError, OSError):  # another C library
        return False
    told = [mallopt(_MMAP_THRESHOLD, _LARGEST_BLOCK), mallopt(_TRIM_THRESHOLD, _MOST_KEPT), mallopt(_ARENAS, _FEW)]
    return all(told)
