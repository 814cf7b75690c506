"""Memory that a check gives back and the next one takes again."""

from __future__ import annotations

from functools import cache

import numpy as np

# Bytes; the C library takes no block beyond 32 MB for a measure.
MEASURE = 1 << 22


@cache
def keep_freed_memory() -> None:
    """Have the C library keep what was freed, up to 8 MB, instead of returning it to the system.

    Pages that come back from the system cost several microseconds each, at some thousand rows as much as a third of a
    check. glibc takes the largest block that was freed so far as its measure: larger blocks come from the system one by
    one, and of freed memory twice as much is kept (malloc's M_MMAP_THRESHOLD and M_TRIM_THRESHOLD). This block is never
    written, so that it takes no memory. Other C libraries are left as they are.
    """
    np.empty(MEASURE, np.uint8)
