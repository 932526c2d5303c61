"""The address of a sweep: the evaluation's own address, and what runs beside it."""

from __future__ import annotations

from contextlib import suppress
from dataclasses import dataclass
from functools import cache
from typing import Any
from urllib.parse import quote, urlencode

from service.contract.problem import FieldError, InvalidRequest
from service.contract.request import EvaluationRequest, Line
from service.contract.sweep import FIELDS, MAX_POINTS, Sweep
from service.web.form import BadAddress
from service.web.numbers import NotANumber, parse_number, plain

__all__ = ["NAMES", "Choice", "choices", "filled", "query_of", "split", "sweep_of", "value_as_set"]

PREFIX = "sweep-"
NAMES = ("field", "line", "start", "stop", "points", "spacing")
#: Usual ranges where the value as set gives none.
USUAL = {"wavelength_nm": (180.0, 20000.0), "exposure_s": (1e-3, 3e4)}
#: A usual range reaches so far below and above the value as set.
REACH = 100.0
SPACINGS = ("log", "linear")


@dataclass(frozen=True, slots=True)
class Choice:
    """One input that may run: its field, its line counted from 0, and the value as set."""

    field: str
    line: int
    value: float | None


def split(items: list[tuple[str, str]]) -> tuple[list[tuple[str, str]], dict[str, str]]:
    """Parameters of the evaluation, and those of the sweep without their prefix. Raises BadAddress."""
    own: dict[str, str] = {}
    rest = []
    for name, value in items:
        if not name.startswith(PREFIX):
            rest.append((name, value))
            continue
        short = name.removeprefix(PREFIX)
        if short not in NAMES or short in own:
            raise _bad(name, value, "a field of the sweep, once", "unknown or repeated parameter")
        own[short] = value.strip()
    return rest, own


def _bad(name: str, value: str, allowed: str, message: str) -> BadAddress:
    error = FieldError(
        field=name[:100],
        value=value[:100],
        allowed=allowed,
        message=message,
        remedy="Use the form to make a new address.",
    )
    return BadAddress(f"{name[:100]}: {message}", [error])


def choices(request: EvaluationRequest) -> list[Choice]:
    """Every input of a laser that may run."""
    found = [Choice(c, k, _given(line, c)) for k, line in enumerate(request.lines) for c in FIELDS]
    found = [c for c in found if c.value is not None]
    return [*found, Choice("exposure_s", 0, request.exposure_s)]


def _given(line: Line, field: str) -> float | None:
    """The value of an input of a line; the first axis where there are two; None where it has none."""
    part: Any = getattr(line, FIELDS[field]) if FIELDS[field] else line
    value = getattr(part, field, None)
    return value[0] if isinstance(value, tuple) else value


def value_as_set(request: EvaluationRequest, sweep: Sweep) -> float | None:
    """The value of the swept input in the request itself."""
    if sweep.field == "exposure_s":
        return request.exposure_s
    return _given(request.lines[sweep.line], sweep.field)


@cache
def _allowed() -> dict[str, tuple[float, float]]:
    """Least and most of every field that may run, above 0."""
    schema = EvaluationRequest.model_json_schema()
    found = {}
    for part in (schema, *schema["$defs"].values()):
        for name, field in part.get("properties", {}).items():
            kinds = field.get("anyOf", [field])
            if name in FIELDS and "minimum" in kinds[0]:
                found[name] = (kinds[0]["minimum"] or 1e-6, kinds[0]["maximum"])
    return found


def _usual(choice: Choice) -> tuple[float, float]:
    """A range to start with."""
    low, high = _allowed()[choice.field]
    if choice.field in USUAL:
        return USUAL[choice.field]
    at = max(choice.value or low, low)
    start, stop = max(at / REACH, low), min(at * REACH, high)
    return float(f"{start:.6g}"), float(f"{stop:.6g}")


def filled(own: dict[str, str], request: EvaluationRequest) -> dict[str, str]:
    """The sweep's fields with the blank ones filled in. Raises BadAddress, InvalidRequest."""
    known = choices(request)
    first = next((c for c in known if c.field not in USUAL), known[0])
    field, line = own.get("field") or first.field, own.get("line") or "1"
    if field not in FIELDS:
        raise _bad("sweep-field", field, ", ".join(FIELDS), "unknown choice")
    if not (line.isascii() and line.isdecimal() and 1 <= int(line[:4]) <= len(request.lines)):
        raise _bad("sweep-line", line, f"1 to {len(request.lines)}", "not a number of a line")
    chosen = next((c for c in known if (c.field, c.line + 1) == (field, int(line))), None)
    if chosen is None and field == "exposure_s":
        chosen = known[-1]
    if chosen is None:
        there = ", ".join(c.field for c in known if c.line + 1 == int(line))
        raise _bad("sweep-field", field, there, "this line does not give that input")
    start, stop = _usual(chosen)
    texts = {
        "field": field,
        "line": line,
        "start": own.get("start") or plain(start),
        "stop": own.get("stop") or plain(stop),
        "points": own.get("points") or "201",
        "spacing": own.get("spacing") or "log",
    }
    if texts["spacing"] not in SPACINGS:
        raise _bad("sweep-spacing", texts["spacing"], ", ".join(SPACINGS), "unknown choice")
    for name in ("start", "stop"):
        # What is no number is shown as typed, beside the error of `sweep_of`.
        with suppress(NotANumber):
            texts[name] = plain(parse_number(texts[name]))
    return texts


def sweep_of(texts: dict[str, str]) -> Sweep:
    """The sweep that the filled fields ask for. Raises InvalidRequest with the names of the form."""
    errors: list[FieldError] = []
    numbers: dict[str, float] = {}
    for name in ("start", "stop"):
        try:
            numbers[name] = parse_number(texts[name])
        except NotANumber as error:
            errors.append(_wrong(name, texts[name], "a number", str(error), error.remedy))
    points = texts["points"]
    if not (points.isascii() and points.isdecimal() and 2 <= int(points[:9]) <= MAX_POINTS):
        errors.append(
            _wrong("points", points, f"2 to {MAX_POINTS}", "not such a whole number", "Type a whole number.")
        )
    if not errors and numbers["stop"] <= numbers["start"]:
        errors.append(
            _wrong("stop", texts["stop"], "above the first value", "too low", "Swap the two values.")
        )
    if not errors and texts["spacing"] == "log" and numbers["start"] <= 0.0:
        remedy = "Start above 0, or choose even spacing."
        errors.append(
            _wrong("start", texts["start"], "above 0", "not possible on a logarithmic axis", remedy)
        )
    if errors:
        raise InvalidRequest("Some values cannot be used; nothing was computed.", errors)
    return Sweep.model_validate(
        {
            "field": texts["field"],
            "line": int(texts["line"]) - 1,
            **numbers,
            "points": int(points),
            "spacing": texts["spacing"],
        }
    )


def _wrong(name: str, value: str, allowed: str, message: str, remedy: str) -> FieldError:
    return FieldError(
        field=f"sweep.{name}", value=value[:100], allowed=allowed, message=message, remedy=remedy
    )


def query_of(base: str, texts: dict[str, str]) -> str:
    """The canonical address: the evaluation's, then the sweep's fields in one order."""
    own = urlencode([(PREFIX + n, texts[n]) for n in NAMES if texts.get(n)], quote_via=quote)
    return f"{base}&{own}" if own else base
