"""Log lines on standard error: as text for people, or a JSON object each for a log collector."""

from __future__ import annotations

import json
import logging
from datetime import UTC, datetime

__all__ = ["FORMS", "configure"]

FORMS = ("text", "json")
TEXT = "%(asctime)s %(levelname)s %(name)s: %(message)s"


class JsonLines(logging.Formatter):
    """One JSON object per record: time, level, logger, message, and the trace of an exception."""

    def format(self, record: logging.LogRecord) -> str:
        """The record as a line."""
        line = {
            "time": datetime.fromtimestamp(record.created, UTC).isoformat(),
            "level": record.levelname.lower(),
            "logger": record.name,
            "message": record.getMessage(),
            "process": record.process,
        }
        if record.exc_info:
            line["exception"] = self.formatException(record.exc_info)
        return json.dumps(line)


def configure(form: str) -> None:
    """Send warnings and errors of every logger to standard error, in one of `FORMS`."""
    handler = logging.StreamHandler()
    handler.setFormatter(JsonLines() if form == "json" else logging.Formatter(TEXT))
    logging.basicConfig(level=logging.WARNING, handlers=[handler], force=True)
