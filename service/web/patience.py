"""Connections that say nothing or take nothing: closed after a while."""

from __future__ import annotations

import asyncio
from typing import Any, ClassVar

from uvicorn.protocols.http.httptools_impl import HttpToolsProtocol

__all__ = ["Patient"]

#: Time to read what has arrived, once the time is over [s].
GRACE_S = 1.0


class Patient(HttpToolsProtocol):
    """A connection that closes where the next request head takes longer than `seconds`.

    The same where the client takes nothing of its answer for as long. Time counts from the opening of the
    connection or the first byte of a request to the end of its head; between requests the server's own
    limit for idle connections holds. `seconds` is set once for the process, before it serves.
    """

    seconds: ClassVar[float] = 30.0
    head_timer: asyncio.TimerHandle | None = None
    taking_timer: asyncio.TimerHandle | None = None

    def _wait_for_head(self) -> None:
        self._head_is_there()
        self.head_timer = self.loop.call_later(self.seconds, self._give_up)

    def _head_is_there(self) -> None:
        if self.head_timer is not None:
            self.head_timer.cancel()
            self.head_timer = None

    def _give_up(self) -> None:
        # A busy process may have the head at hand and not have read it yet.
        self.head_timer = self.loop.call_later(GRACE_S, self._close)

    def _close(self) -> None:
        self.head_timer = None
        if not self.transport.is_closing():
            self.transport.close()

    def connection_made(self, transport: Any) -> None:
        """A connection opens: its first head is waited for."""
        super().connection_made(transport)
        self._wait_for_head()

    def pause_writing(self) -> None:
        """The client takes nothing: its time starts."""
        super().pause_writing()
        self.taking_timer = self.loop.call_later(self.seconds, self.transport.abort)

    def resume_writing(self) -> None:
        """The client takes again."""
        self._is_taken()
        super().resume_writing()

    def _is_taken(self) -> None:
        if self.taking_timer is not None:
            self.taking_timer.cancel()
            self.taking_timer = None

    def connection_lost(self, exc: Exception | None) -> None:
        """The connection is gone, and so are its timers."""
        self._head_is_there()
        self._is_taken()
        super().connection_lost(exc)

    def on_message_begin(self) -> None:
        """The first byte of a request: its head is waited for."""
        self._wait_for_head()
        super().on_message_begin()

    def on_headers_complete(self) -> None:
        """The head is there."""
        self._head_is_there()
        super().on_headers_complete()
