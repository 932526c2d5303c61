"""Files of lasers, read in pieces: CSV with a header, or one JSON request per line."""

from __future__ import annotations

import contextlib
import csv
import io
import re
from collections.abc import Iterator
from typing import IO, Any

from service.bulk.flat import NUMBERS, check_columns, nested
from service.bulk.records import LINE_LIMIT
from service.contract.problem import BodyTooLarge, FieldError, InvalidRequest, Problem

__all__ = ["BadFile", "csv_items", "ndjson_items"]

NUMBER = re.compile(r"[+-]?(\d+(\.\d*)?|\.\d+)([eE][+-]?\d+)?")
#: Most cells beyond the header that are told of.
SHOWN = 60


class BadFile(ValueError):
    """A file that cannot be read as what it is said to be."""


def ndjson_items(stream: IO[bytes]) -> Iterator[bytes | Problem]:
    """The lines of NDJSON that are not blank; a Problem in the place of one that is too long."""
    while line := stream.readline(LINE_LIMIT + 1):
        if len(line) > LINE_LIMIT and not line.endswith(b"\n"):
            while (rest := stream.readline(LINE_LIMIT)) and not rest.endswith(b"\n"):
                pass
            yield BodyTooLarge(f"the line is longer than {LINE_LIMIT} bytes")
        elif line := line.strip():
            yield line


def csv_items(stream: IO[bytes]) -> Iterator[dict[str, Any] | Problem]:
    """The requests of a CSV file, a row each; blank rows are skipped.

    Columns are those of `flat.COLUMNS`, separated by commas or semicolons; numbers have a decimal point.
    Raises BadFile where the header names an unknown column or the text is not UTF-8.
    """
    text = io.TextIOWrapper(stream, encoding="utf-8-sig", newline="")
    try:
        first = text.readline(LINE_LIMIT)
        separator = ";" if ";" in first and "," not in first else ","
        (header,) = list(csv.reader([first], delimiter=separator)) or [[]]
        names = [name.strip() for name in header]
        if not any(names):
            raise BadFile("the first line holds no column names")
        try:
            check_columns(names)
        except ValueError as error:
            raise BadFile(str(error)) from None
        for cells in csv.reader(text, delimiter=separator):
            if any(cell.strip() for cell in cells):
                yield _row(names, cells)
    except UnicodeDecodeError:
        raise BadFile("the file is not UTF-8 text") from None
    except csv.Error as error:
        raise BadFile(f"the file is no CSV: {error}") from None
    finally:
        # The stream is not ours to close; it may be closed already.
        with contextlib.suppress(ValueError):
            text.detach()


def _row(names: list[str], cells: list[str]) -> dict[str, Any] | Problem:
    """The request of a row, or why it has none."""
    if len(cells) != len(names):
        message = f"the row has {len(cells)} cells, the header {len(names)}"
        remedy = "Give every row as many cells as the header; put text that holds the separator in quotes."
        error = FieldError(
            field="row",
            value=",".join(cells)[:SHOWN],
            allowed=f"{len(names)} cells",
            message=message,
            remedy=remedy,
        )
        return InvalidRequest(f"row: {message}", [error])
    given = {}
    for name, cell in zip(names, cells, strict=True):
        value = cell.strip()
        if value:
            given[name] = float(value) if name in NUMBERS and NUMBER.fullmatch(value) else value
    return nested(given)
