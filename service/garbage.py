"""The garbage collector, settled once a process has loaded everything it keeps."""

from __future__ import annotations

import gc

__all__ = ["settle"]

#: New objects after which the youngest are looked through; a pass over many requests makes about as many.
YOUNG = 50_000


def settle() -> None:
    """Take what is loaded for permanent and look through new objects less often.

    Reference counting frees nearly everything; tables, models and routes live as long as the process, and
    looking through them again and again costs a third of the time of a large batch.
    """
    gc.collect()
    gc.freeze()
    gc.set_threshold(YOUNG, 10, 10)
