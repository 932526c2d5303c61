"""The form of a sign: its fields beside those of the evaluation in one address."""

from __future__ import annotations

import re
from collections.abc import Sequence
from dataclasses import dataclass, field, replace
from functools import cache
from typing import Any
from urllib.parse import quote, urlencode

from pydantic import ValidationError

from service.contract.classification import schemes
from service.contract.problem import FieldError, InvalidRequest, invalid_request
from service.sign.content import edition
from service.sign.request import SignOptions
from service.sign.tables import sign_tables
from service.web.form import BadAddress

__all__ = ["FIELDS", "LABELS", "PREFIX", "SIGN_VERSION", "SignForm", "as_form_errors", "choices", "split"]

#: A change of meaning of a field needs a new version.
SIGN_VERSION = "1"
PREFIX = "sign-"
TEXTS = ("room", "lso_name", "lso_phone", "date", "valid_from", "valid_to", "extra_lines")
FIELDS = (
    "kind",
    "family",
    "sheet",
    "orientation",
    "copies",
    "label_mm",
    "language",
    "second",
    "scheme",
    "signal_word",
    "whole_room",
    *TEXTS,
)
LABELS = {
    "kind": "Kind",
    "family": "Family",
    "sheet": "Sheet",
    "orientation": "Orientation",
    "copies": "Signs on the sheet",
    "label_mm": "Label size",
    "language": "Language",
    "second": "Second language",
    "scheme": "Class after",
    "signal_word": "Signal word",
    "whole_room": "Hazard distance",
    "room": "Room",
    "lso_name": "Laser safety officer",
    "lso_phone": "Telephone",
    "date": "Date of the assessment",
    "valid_from": "First day",
    "valid_to": "Last day",
    "extra_lines": "Further lines",
}
LABEL_SIZE = re.compile(r"([0-9]{1,3}(?:\.[0-9])?)\s*[x×]\s*([0-9]{1,3}(?:\.[0-9])?)")


@cache
def choices() -> dict[str, tuple[tuple[str, str], ...]]:
    """Choices of a field with the words of the page, the first one taken where nothing was chosen."""
    tables = sign_tables()
    languages = tuple((key, p.name) for key, p in tables.phrases.items())
    papers = sorted(tables.sheets.sheet, key=lambda name: name != "A4")
    return {
        "kind": (
            ("area", "door sign"),
            ("temporary", "door sign, temporary area"),
            ("label", "warning label"),
            ("aperture", "aperture label"),
        ),
        "family": (("iso", "triangle and text panel (ISO)"), ("ansi", "signal word on top (ANSI)")),
        "sheet": (*((name, name) for name in papers), ("own", "size of the label")),
        "orientation": (("portrait", "upright"), ("landscape", "wide")),
        "language": languages,
        "second": (("", "none"), *languages),
        "scheme": tuple((key, edition(c.scheme.title)) for key, c in schemes().items()),
        "signal_word": (
            ("auto", "as the class asks"),
            ("danger", "DANGER"),
            ("warning", "WARNING"),
            ("caution", "CAUTION"),
        ),
        "whole_room": (("", "as computed"), ("1", "whole room")),
    }


@dataclass(frozen=True, slots=True)
class SignForm:
    """What stands in the form of the sign: text by field name, without the prefix."""

    values: dict[str, str] = field(default_factory=dict)

    @classmethod
    def read(cls, items: Sequence[tuple[str, str]]) -> SignForm:
        """The form from the sign's parameters of an address. Raises BadAddress."""
        given: dict[str, str] = {}
        for full, value in items:
            name = full.removeprefix(PREFIX)
            if name in given:
                raise _refuse(full, value, "one value", "this parameter stands twice")
            given[name] = value.replace("\r\n", "\n").strip()
        version = given.pop("v", "" if given else SIGN_VERSION)
        if version != SIGN_VERSION:
            raise _refuse(
                f"{PREFIX}v", version, SIGN_VERSION, "the address was made for another version of the form"
            )
        for name, value in given.items():
            if name not in FIELDS:
                raise _refuse(PREFIX + name, value, "a field of the form", "unknown parameter")
            offered = [key for key, _ in choices().get(name, ())]
            if offered and value and value not in offered:
                raise _refuse(PREFIX + name, value, ", ".join(c for c in offered if c), "unknown choice")
        return cls({name: value for name, value in given.items() if value})

    def get(self, name: str, default: str = "") -> str:
        """Text of a field; a choice that was not made is the first one offered."""
        name = name.removeprefix(PREFIX)
        return self.values.get(name, choices()[name][0][0] if name in choices() else default)

    def with_date(self, day: str) -> SignForm:
        """The form with the date filled in where it is blank."""
        return self if "date" in self.values else replace(self, values={**self.values, "date": day})

    def query(self) -> str:
        """The canonical parameters: version first, one order, no blanks and no first choices."""
        items = [(f"{PREFIX}v", SIGN_VERSION)]
        for name in FIELDS:
            value = self.values.get(name)
            if value is not None and not (name in choices() and value == choices()[name][0][0]):
                items.append((PREFIX + name, value))
        return urlencode(items, quote_via=quote)

    def options(self, address: str) -> SignOptions:
        """The options of the sign. Raises InvalidRequest with the names of the form's fields."""
        body: dict[str, Any] = {
            name: self.get(name)
            for name in ("kind", "family", "sheet", "orientation", "scheme", "signal_word")
        }
        body["languages"] = [self.get("language"), *([self.get("second")] if self.get("second") else [])]
        body["whole_room"] = self.get("whole_room") == "1"
        body |= {n: self.values[n] for n in TEXTS[:-1] if n in self.values}
        body["extra_lines"] = [line.strip() for line in self.get("extra_lines").split("\n") if line.strip()]
        if self.get("kind") in ("area", "temporary"):
            body["address"] = address
        if self.get("label_mm"):
            body["label_mm"] = self._label_size()
        body["copies"] = self._copies()
        try:
            return SignOptions.model_validate(body)
        except ValidationError as error:
            raise as_form_errors(invalid_request(error, SignOptions)) from None

    def _copies(self) -> int:
        text = self.get("copies", "1")
        if not (text.isascii() and text.isdecimal() and len(text) <= 3):
            raise _invalid(
                "copies", text, "a whole number, 1 to 200", "not a whole number", "Type digits only."
            )
        return int(text)

    def _label_size(self) -> list[float]:
        text = self.get("label_mm")
        match = LABEL_SIZE.fullmatch(text)
        if match is None:
            allowed = "width x height in mm, such as 100 x 50"
            raise _invalid("label_mm", text, allowed, "not a size", "Write it as the example shows.")
        return [float(match[1]), float(match[2])]


def split(items: Sequence[tuple[str, str]]) -> tuple[list[tuple[str, str]], list[tuple[str, str]]]:
    """Parameters of the evaluation, and those of the sign."""
    own = [item for item in items if item[0].startswith(PREFIX)]
    return [item for item in items if not item[0].startswith(PREFIX)], own


def as_form_errors(problem: InvalidRequest) -> InvalidRequest:
    """A problem of the sign's request with the names of the form's fields."""
    errors = []
    for error in problem.errors:
        parts = error.field.removeprefix("sign.").split(".")
        name = {"languages": "second"}.get(parts[0], parts[0])
        if name in FIELDS:
            error = error.model_copy(update={"field": PREFIX + name})
        errors.append(error)
    return InvalidRequest("Some values cannot be used; no sign was made.", errors)


def _invalid(name: str, value: str, allowed: str, message: str, remedy: str) -> InvalidRequest:
    error = FieldError(
        field=PREFIX + name, value=value[:100], allowed=allowed, message=message, remedy=remedy
    )
    return InvalidRequest("Some values cannot be used; no sign was made.", [error])


def _refuse(name: str, value: str, allowed: str, message: str) -> BadAddress:
    error = FieldError(
        field=name[:100],
        value=value[:100],
        allowed=allowed,
        message=message,
        remedy="Use the form of the sign to make a new address.",
    )
    return BadAddress(f"{name[:100]}: {message}", [error])
