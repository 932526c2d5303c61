"""A progress line on standard error."""

from __future__ import annotations

import sys
import time
from typing import IO

from service.bulk.records import Records

__all__ = ["Progress"]

WIDTH = 30
#: Least time between two looks [s].
PAUSE_S = 0.2


class Progress:
    """How far a file has been read; where its size is not known, how many lasers.

    Parameters
    ----------
    stream, size : the file that is read and its length [bytes], 0 where there is none
    show : whether anything is written
    """

    def __init__(self, stream: IO[bytes], size: int, show: bool) -> None:
        self._stream, self._size, self._show = stream, size, show
        self._start = self._last = time.monotonic()
        self._first: int | None = None

    def tell(self, records: Records) -> None:
        """Write the line again, if it is time to."""
        now, done = time.monotonic(), records.answered + records.problems
        if self._first is None:
            self._first = done
        if not self._show or now - self._last < PAUSE_S:
            return
        self._last = now
        rate = (done - self._first) / (now - self._start)
        part = f"{done:,} lasers  {rate:,.0f}/s"
        if records.problems:
            part += f"  {records.problems:,} with problems"
        if self._size:
            share = min(1.0, self._stream.tell() / self._size)
            filled = int(WIDTH * share)
            part = f"[{'#' * filled}{'.' * (WIDTH - filled)}] {100 * share:3.0f} %  {part}"
        sys.stderr.write(f"\r{part}\x1b[K")
        sys.stderr.flush()

    def end(self) -> None:
        """Clear the line."""
        if self._show:
            sys.stderr.write("\r\x1b[K")
            sys.stderr.flush()
