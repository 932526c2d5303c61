"""Comma-separated values after RFC 4180: a head, one row a line, numbers exactly as the JSON gives them."""

from __future__ import annotations

import csv
import io
from collections.abc import Iterable, Sequence

__all__ = ["MEDIA", "csv_text"]

MEDIA = "text/csv; charset=utf-8; header=present"
#: A spreadsheet would read text that starts so as a formula.
FORMULA = ("=", "+", "-", "@", "\t", "\r")


def _cell(value: str | float | None) -> str:
    if value is None:
        return ""
    if isinstance(value, str):
        return f"'{value}" if value.startswith(FORMULA) else value
    return repr(value)


def csv_text(head: Sequence[str], rows: Iterable[Sequence[str | float | None]]) -> str:
    """A table as text."""
    out = io.StringIO()
    writer = csv.writer(out, lineterminator="\r\n")
    writer.writerow(head)
    writer.writerows([[_cell(value) for value in row] for row in rows])
    return out.getvalue()
