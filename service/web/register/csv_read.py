"""Reading the CSV form of the register: every error with its row and column, nothing half read."""

from __future__ import annotations

import csv
import io
import json
from collections.abc import Iterator
from typing import Any

from service.contract.answer import rule_sets
from service.contract.problem import FieldError, InvalidRequest
from service.register.importing import refusal
from service.register.models import LaserIn
from service.register.problems import field_error
from service.web.numbers import NotANumber, parse_number
from service.web.register.bodies import parsed
from service.web.register.csv_columns import (
    COLUMNS,
    IDENTITY,
    NUMBERS,
    RESULTS,
    SETUP,
    request_of,
    unguarded,
)

__all__ = ["read_csv"]

#: Errors that are listed; the detail counts them all.
LISTED = 200
#: Largest cell [characters].
MAX_CELL = 100_000


def read_csv(data: bytes) -> list[tuple[int, LaserIn]]:
    """The lasers of a file, each with the number of its row (the header is row 1).

    Comma or semicolon parts the cells; UTF-8. Raises InvalidRequest that lists every error.
    """
    rows = _rows(_decoded(data))
    _, header = next(rows, (1, []))
    names = [h.strip() for h in header]
    _check_header(names)
    found: list[tuple[int, LaserIn]] = []
    errors: list[FieldError] = []
    seen: dict[str, int] = {}
    for number, cells in rows:
        if not any(c.strip() for c in cells):
            continue
        problems, body = _laser(number, names, cells)
        if body is not None and body.asset_tag in seen:
            message = f"the asset tag stands in row {seen[body.asset_tag]} too"
            problems.append(_error(number, "asset_tag", body.asset_tag, "one row each", message))
        errors += problems
        if body is not None:
            seen.setdefault(body.asset_tag, number)
            found.append((number, body))
    if errors:
        raise refusal(errors[:LISTED], len(errors))
    if not found:
        raise refusal([_error(2, "asset_tag", None, "at least one row", "there is no row with a laser")], 1)
    return found


def _error(row: int, column: str, value: Any, allowed: str, message: str, remedy: str = "") -> FieldError:
    return field_error(f"row {row}, {column}", value, allowed, message, remedy or "Correct the cell.")


def _decoded(data: bytes) -> str:
    try:
        text = data.decode("utf-8-sig")
    except UnicodeDecodeError as error:
        row = data.count(b"\n", 0, error.start) + 1
        hint = "Save the file as CSV UTF-8."
        raise refusal([_error(row, "file", None, "UTF-8 text", "this is not UTF-8", hint)], 1) from None
    if "\0" in text:
        row = text.count("\n", 0, text.index("\0")) + 1
        raise refusal([_error(row, "file", None, "text", "there is a NUL character")], 1)
    return text


def _rows(text: str) -> Iterator[tuple[int, list[str]]]:
    """Rows with the number of their last line; a broken quotation is an error."""
    head = text[: text.find("\n") + 1] or text
    delimiter = ";" if head.count(";") > head.count(",") else ","
    reader = csv.reader(io.StringIO(text, newline=""), delimiter=delimiter, strict=True)
    count = 0
    try:
        for cells in reader:
            count += 1
            yield count, cells
    except csv.Error as error:
        allowed = f"cells of at most {MAX_CELL} characters, quotation marks in pairs"
        broken = _error(count + 1, "file", None, allowed, f"the row cannot be read: {error}")
        raise refusal([broken], 1) from None


def _check_header(names: list[str]) -> None:
    errors = []
    for k, name in enumerate(names):
        if name not in COLUMNS and name not in RESULTS:
            allowed = ", ".join(COLUMNS)
            errors.append(_error(1, name[:60] or f"column {k + 1}", name, allowed, "unknown column"))
        elif name in names[:k]:
            errors.append(_error(1, name, name, "each column once", "this column stands twice"))
    needed = ["asset_tag"] if "request_json" in names else ["asset_tag", "wavelength_nm", "mode"]
    errors += [_error(1, n, None, "a column", "this column is missing") for n in needed if n not in names]
    if errors:
        raise refusal(errors[:LISTED], len(errors))


def _laser(number: int, names: list[str], cells: list[str]) -> tuple[list[FieldError], LaserIn | None]:
    """The laser of a row, or its errors."""
    if len(cells) != len(names):
        message = f"there are {len(cells)} cells"
        return [_error(number, "row", None, f"{len(names)} cells, as in the header", message)], None
    row = {n: c.strip() for n, c in zip(names, cells, strict=True) if n in COLUMNS}
    errors: list[FieldError] = []
    for name, cell in row.items():
        if len(cell) > MAX_CELL:
            errors.append(
                _error(number, name, cell[:40], f"at most {MAX_CELL} characters", "the cell is too long")
            )
            row[name] = ""
    identity = {n: unguarded(row[n]) for n in IDENTITY if n in row}
    request = _request(number, row, identity.get("label", ""), errors)
    if errors:
        return errors, None
    try:
        body = parsed(LaserIn, {**identity, "request": request})
    except InvalidRequest as problem:
        return [_placed(number, e) for e in problem.errors], None
    if body.request.rules not in rule_sets():
        allowed = ", ".join(rule_sets())
        return [_error(number, "rules", body.request.rules, allowed, "unknown rule set")], None
    return [], body


def _request(number: int, row: dict[str, str], label: str, errors: list[FieldError]) -> Any:
    text = row.get("request_json", "")
    if text:
        filled = [n for n in SETUP if row.get(n)]
        if filled:
            message = "the setup stands in request_json too"
            errors.append(_error(number, filled[0], row[filled[0]], "blank", message))
        try:
            return json.loads(text)
        except (ValueError, RecursionError):
            errors.append(_error(number, "request_json", text[:60], "a JSON object", "this is not JSON"))
            return None
    values: dict[str, Any] = {}
    for name in SETUP:
        cell = row.get(name, "")
        if not cell:
            continue
        if name not in NUMBERS:
            values[name] = cell
            continue
        try:
            values[name] = parse_number(cell)
        except NotANumber as error:
            errors.append(_error(number, name, cell, "a number", str(error), error.remedy))
    return request_of(values, label)


def _placed(number: int, error: FieldError) -> FieldError:
    """An error of the body under the name of its column."""
    parts = [p for p in error.field.split(".") if not p.isdigit() and p not in ("request", "lines")]
    name = parts[-1] if parts and parts[-1] in COLUMNS else ".".join(parts) or "row"
    if name == "emission":
        name = "mode"
    return error.model_copy(update={"field": f"row {number}, {name}"})
