"""Times of the register: UTC, as text that sorts."""

from __future__ import annotations

from datetime import UTC, datetime, timedelta

__all__ = ["in_future", "now", "seconds_since", "today"]


def now() -> str:
    """This moment, to the microsecond: 2026-05-04T09:30:00.123456Z."""
    return _text(datetime.now(UTC))


def in_future(seconds: float) -> str:
    """The moment so many seconds from now (or ago, where negative)."""
    return _text(datetime.now(UTC) + timedelta(seconds=seconds))


def today() -> str:
    """The date in UTC: 2026-05-04."""
    return datetime.now(UTC).date().isoformat()


def seconds_since(moment: str) -> float:
    """Seconds since a moment written by `now`."""
    return (datetime.now(UTC) - datetime.fromisoformat(moment)).total_seconds()


def _text(moment: datetime) -> str:
    return f"{moment.replace(tzinfo=None).isoformat(timespec='microseconds')}Z"
