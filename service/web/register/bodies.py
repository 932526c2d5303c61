"""Bodies, queries and forms of the register: read under a limit, validated, with errors that say where."""

from __future__ import annotations

from functools import cache
from typing import Annotated, Any, TypeVar
from urllib.parse import parse_qsl

from fastapi import Depends
from pydantic import BaseModel, ValidationError
from starlette.datastructures import UploadFile
from starlette.formparsers import MultiPartException, MultiPartParser
from starlette.requests import Request

from service.contract.problem import (
    FieldError,
    InvalidRequest,
    MalformedBody,
    UnsupportedMedia,
    invalid_request,
)
from service.register.problems import StaleVersion, VersionNeeded, field_error
from service.web.body import read_data, read_limited
from service.web.register.access import check_form

__all__ = [
    "FormFields",
    "JsonBody",
    "etag",
    "idempotency_key",
    "if_match",
    "number_of",
    "parsed",
    "queried",
    "schema_parameters",
]

M = TypeVar("M", bound=BaseModel)
MAX_FIELDS = 2000
JsonBody = Annotated[Any, Depends(read_data)]


def parsed(model: type[M], data: Any) -> M:
    """The body as a model. Raises InvalidRequest with the fields of that model."""
    try:
        return model.model_validate(data)
    except ValidationError as error:
        raise _told(model, error) from None


def queried(model: type[M], request: Request, *also: str) -> tuple[M, dict[str, str]]:
    """The parameters of the address as a model, and those named beside. Raises InvalidRequest."""
    given: dict[str, str] = {}
    for name, value in _items(request.url.query):
        if name in given:
            raise _refused(name, value, "one value", "this parameter stands twice")
        given[name] = value
    beside = {n: given.pop(n) for n in also if n in given}
    try:
        return model.model_validate_strings(given, strict=False), beside
    except ValidationError as error:
        raise _told(model, error) from None


def number_of(beside: dict[str, str], name: str, default: int, low: int, high: int) -> int:
    """A whole number among the parameters. Raises InvalidRequest."""
    text = beside.get(name, str(default))
    if not (text.isascii() and text.isdecimal() and low <= int(text[:12]) <= high):
        raise _refused(name, text, f"a whole number, {low} to {high}", "outside the allowed range")
    return int(text)


def _items(query: str) -> list[tuple[str, str]]:
    try:
        return parse_qsl(query, keep_blank_values=True, max_num_fields=MAX_FIELDS, errors="strict")
    except ValueError:
        raise MalformedBody("the parameters cannot be read: too many, or not UTF-8") from None


def _refused(name: str, value: str, allowed: str, message: str) -> InvalidRequest:
    error = field_error(name, value, allowed, message, "Correct it.")
    return InvalidRequest(f"{error.field}: {message}", [error])


def _told(model: type[BaseModel], error: ValidationError) -> InvalidRequest:
    """The problem; fields of this model get their own words, those of a request or a pair keep theirs."""
    problem = invalid_request(error)
    own = _properties(model)
    errors = []
    for e in problem.errors:
        head, _, rest = e.field.partition(".")
        inner = head in ("request", "pair") and (rest or e.message != "this field is missing")
        if inner or (e.allowed == "no such field" and head not in own):
            errors.append(_named(e, model) if not inner else e)
        else:
            errors.append(e.model_copy(update={"allowed": _allowed(own.get(head, {}))}))
    return InvalidRequest(problem.detail, errors)


def _named(error: FieldError, model: type[BaseModel]) -> FieldError:
    return error.model_copy(update={"remedy": f"There are {', '.join(model.model_fields)}."})


@cache
def _properties(model: type[BaseModel]) -> dict[str, dict[str, Any]]:
    found: dict[str, dict[str, Any]] = model.model_json_schema().get("properties", {})
    return found


def _allowed(schema: dict[str, Any]) -> str:
    """What a field may hold, in words."""
    if "anyOf" in schema:
        kinds = schema["anyOf"]
        return " or ".join("null" if k.get("type") == "null" else _allowed(k) for k in kinds)
    if "enum" in schema:
        return ", ".join(map(str, schema["enum"]))
    if schema.get("type") == "integer":
        return f"a whole number, {schema.get('minimum', 'any')} to {schema.get('maximum', 'any')}"
    if schema.get("format") == "date":
        return "a date, YYYY-MM-DD"
    if schema.get("type") == "string":
        return f"text of at most {schema.get('maxLength', 200)} characters"
    if schema.get("type") == "boolean":
        return "true or false"
    return "a list" if schema.get("type") == "array" else "an object"


def schema_parameters(model: type[BaseModel], *more: tuple[str, str]) -> dict[str, Any]:
    """Parameters of a list for the OpenAPI document."""
    named = [
        {"name": n, "in": "query", "schema": {k: v for k, v in s.items() if k != "description"}}
        | ({"description": s["description"]} if "description" in s else {})
        for n, s in _properties(model).items()
    ]
    others = [{"name": n, "in": "query", "schema": {"type": "string"}, "description": t} for n, t in more]
    return {"parameters": named + others}


def etag(kind: str, record_id: int, version: int) -> str:
    """The ETag of a record: it changes with every change."""
    return f'"{kind}-{record_id}-{version}"'


def if_match(request: Request, kind: str, record_id: int, needed: bool = True) -> int | None:
    """The version named in If-Match; None for * or where none is needed.

    Raises VersionNeeded where it is missing, StaleVersion where it is the ETag of something else.
    """
    text = request.headers.get("if-match", "").strip()
    if not text:
        if needed:
            raise VersionNeeded("send the ETag of the record you read in If-Match (or * to overwrite)")
        return None
    if text == "*":
        return None
    head, tail = f'"{kind}-{record_id}-', text.strip('"').rpartition("-")[2]
    if text.startswith(head) and tail.isascii() and tail.isdecimal() and len(tail) < 10:
        return int(tail)
    raise StaleVersion("If-Match does not hold an ETag of this record; read it again")


def idempotency_key(request: Request) -> str | None:
    """The Idempotency-Key, 1 to 200 visible characters. Raises InvalidRequest."""
    key = request.headers.get("idempotency-key")
    if key is not None and not (1 <= len(key) <= 200 and key.isascii() and key.isprintable()):
        raise _refused("Idempotency-Key", key, "1 to 200 visible characters", "this key cannot be used")
    return key


async def _form(request: Request) -> dict[str, str | bytes]:
    """Fields of a form of ours; a file comes as bytes. Raises Forbidden where the form is foreign."""
    media = request.headers.get("content-type", "").partition(";")[0].strip().lower()
    settings = request.app.state.settings
    if media == "multipart/form-data":
        fields = await _multipart(request, await read_limited(request, settings.import_limit))
    elif media == "application/x-www-form-urlencoded":
        body = await read_limited(request, settings.body_limit)
        try:
            fields = dict(_items(body.decode()))
        except UnicodeDecodeError:
            raise MalformedBody("the form is not UTF-8 text") from None
    else:
        raise UnsupportedMedia(f"content-type is {media[:100]!r}; send the form")
    check_form(request, fields)
    return fields


async def _multipart(request: Request, body: bytes) -> dict[str, Any]:
    async def stream() -> Any:
        yield body

    try:
        parser = MultiPartParser(
            request.headers, stream(), max_files=1, max_fields=MAX_FIELDS, max_part_size=len(body) + 1
        )
        form = await parser.parse()
    except MultiPartException as error:
        raise MalformedBody(f"the form cannot be read: {error.message}") from None
    found: dict[str, Any] = {}
    for name, value in form.multi_items():
        found[name] = await value.read() if isinstance(value, UploadFile) else value
    await form.close()
    return found


FormFields = Annotated[dict[str, Any], Depends(_form)]
