"""Reading JSON strictly: no name twice, no half characters, errors that say where."""

from __future__ import annotations

import json
import math
import re
from collections.abc import Iterator
from typing import Any, TypeVar

from pydantic import BaseModel, ValidationError

from service.contract.problem import FieldError, InvalidRequest, MalformedBody, Problem, invalid_request
from service.contract.request import EvaluationRequest

__all__ = ["array_items", "model_of", "read_json", "request_of"]

Read = TypeVar("Read", bound=BaseModel)

#: Integers with more digits than any double holds are read as infinite, and refused by their field.
MAX_DIGITS = 400
SPACE = re.compile(r"[ \t\n\r]*")


class _TwiceError(Exception):
    """Some name stands twice in one object; where is found by reading again."""


class _Repeated(dict[str, Any]):
    """An object in which a name stood twice: one of the two values would be lost."""

    name = ""


def _object(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) != len(pairs):
        raise _TwiceError
    return found


def _marked_object(pairs: list[tuple[str, Any]]) -> dict[str, Any]:
    found = dict(pairs)
    if len(found) == len(pairs):
        return found
    seen: set[str] = set()
    repeated = _Repeated(found)
    for name, _ in pairs:
        if name in seen:
            repeated.name = name
        seen.add(name)
    return repeated


def _integer(text: str) -> int | float:
    return int(text) if len(text) <= MAX_DIGITS else math.copysign(math.inf, -1 if text[0] == "-" else 1)


FAST = json.JSONDecoder(object_pairs_hook=_object, parse_int=_integer)
CAREFUL = json.JSONDecoder(object_pairs_hook=_marked_object, parse_int=_integer)


def _check(data: Any) -> None:
    """Refuse repeated names, with their place, and halves of characters."""
    todo: list[tuple[str, Any]] = [("", data)]
    while todo:
        path, value = todo.pop()
        if isinstance(value, _Repeated):
            field = f"{path}{value.name}"[:100]
            error = FieldError(
                field=field,
                value=None,
                allowed="one value",
                message="this field stands twice",
                remedy="Send each field once.",
            )
            raise InvalidRequest(f"{field}: this field stands twice", [error])
        if isinstance(value, dict):
            todo += [("", name) for name in value]
            todo += [(f"{path}{name}.", inner) for name, inner in value.items()]
        elif isinstance(value, list):
            todo += [(f"{path}{n}.", inner) for n, inner in enumerate(value)]
        elif isinstance(value, str) and not value.isascii():
            try:
                value.encode()
            except UnicodeEncodeError:
                raise MalformedBody("the body holds half of a character (a lone surrogate)") from None


def _decode(text: str, at: int) -> tuple[Any, int, bool]:
    """One value from position `at` on, where it ends, and whether `_check` must look at it."""
    try:
        try:
            data, end = FAST.raw_decode(text, at)
        except _TwiceError:
            return *CAREFUL.raw_decode(text, at), True
    except json.JSONDecodeError as error:
        raise _malformed(text, error.pos, error.msg) from None
    except RecursionError:
        raise MalformedBody("the body is nested too deeply") from None
    # Text decoded from UTF-8 has no half characters; only an escape can bring one.
    return data, end, text.find("\\u", at, end) >= 0


def _malformed(text: str, at: int, what: str) -> MalformedBody:
    where = json.JSONDecodeError(what, text, at)
    return MalformedBody(f"line {where.lineno}, column {where.colno}: {what}")


def _skip(text: str, at: int) -> int:
    """The first position from `at` on that is no white space."""
    found = SPACE.match(text, at)
    assert found is not None
    return found.end()


def read_json(body: bytes | bytearray) -> Any:
    """The value in a body of JSON. Raises MalformedBody, or InvalidRequest where a name stands twice."""
    text = _text(body)
    data, end, doubtful = _decode(text, _skip(text, 0))
    end = _skip(text, end)
    if end != len(text):
        raise _malformed(text, end, "Extra data")
    if doubtful:
        _check(data)
    return data


def _text(body: bytes | bytearray) -> str:
    try:
        return body.decode()
    except UnicodeDecodeError:
        raise MalformedBody("the body is not UTF-8 text") from None


def array_items(body: bytes | bytearray) -> Iterator[Any | Problem]:
    """The items of a JSON array, one at a time; one that is JSON but cannot be used gives its Problem.

    Raises MalformedBody where the body is no array, and while iterating where its text cannot be read on.
    """
    text = _text(body)
    at = _skip(text, 0)
    if not text.startswith("[", at):
        raise MalformedBody("the body is not a JSON array; send a list of requests")
    return _items(text, _skip(text, at + 1))


def _items(text: str, at: int) -> Iterator[Any | Problem]:
    """The items from position `at` on, the first one's."""
    more = not text.startswith("]", at)
    while more:
        item, at, doubtful = _decode(text, at)
        if doubtful:
            try:
                _check(item)
            except Problem as problem:
                item = problem
        yield item
        at = _skip(text, at)
        more = text.startswith(",", at)
        if more:
            at = _skip(text, at + 1)
        elif not text.startswith("]", at):
            raise _malformed(text, at, "Expecting ',' or ']'")
    at = _skip(text, at + 1)
    if at != len(text):
        raise _malformed(text, at, "Extra data")


def model_of(model: type[Read], data: Any) -> Read:
    """The request of some kind in JSON data. Raises InvalidRequest naming every field in error."""
    try:
        return model.model_validate(data)
    except ValidationError as error:
        raise invalid_request(error, model) from None


def request_of(data: Any) -> EvaluationRequest:
    """The evaluation request in JSON data. Raises InvalidRequest naming every field in error."""
    return model_of(EvaluationRequest, data)
