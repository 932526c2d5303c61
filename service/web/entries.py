"""Small forms whose fields are named as the fields of the request they stand for.

An address holds the values and a version; an unknown, repeated or outdated parameter is refused.
"""

from __future__ import annotations

from collections.abc import Iterable, Sequence
from dataclasses import dataclass, field
from typing import Any, TypeVar
from urllib.parse import parse_qsl, quote, urlencode

from pydantic import BaseModel, ValidationError
from starlette.requests import Request

from service.contract.problem import FieldError, InvalidRequest, invalid_request
from service.contract.request import MAX_LINES
from service.web.fields import label_of, split_name
from service.web.form import BadAddress
from service.web.numbers import NotANumber, parse_number

__all__ = ["Entry", "Group", "Sheet", "in_words", "read_items"]

M = TypeVar("M", bound=BaseModel)

VERSION = "1"
#: More than an evaluation, the longest there can be, and a tolerance for each of its figures.
MAX_PARAMETERS = 3000


@dataclass(frozen=True, slots=True)
class Entry:
    """One field: its path in the request, its label, its unit (a number) or choices, its help.

    `scale` turns the typed number into the request's unit: 0.01 for percent.
    """

    name: str
    label: str
    unit: str = ""
    help: str = ""
    choices: tuple[tuple[str, str], ...] = ()
    scale: float = 1.0
    number: bool = True
    rows: int = 0


@dataclass(frozen=True, slots=True)
class Group:
    """Fields that belong together."""

    legend: str
    entries: tuple[Entry, ...]
    text: str = ""


def read_items(request: Request) -> list[tuple[str, str]]:
    """Parameters of an address in order. Raises BadAddress where there are too many."""
    try:
        return parse_qsl(request.url.query, keep_blank_values=True, max_num_fields=MAX_PARAMETERS)
    except ValueError:
        raise BadAddress(f"the address has more than {MAX_PARAMETERS} parameters") from None


def in_words(errors: list[FieldError]) -> list[FieldError]:
    """Errors with what the form calls the fields of the evaluation that travels along."""
    found = []
    for error in errors:
        path = error.field.removeprefix("evaluation.").split(".")
        name = error.field
        if path[0] == "bench":
            name = f"Element {int(path[1]) + 1}" if len(path) > 1 else "What the light meets"
        elif path[:2] == ["viewing", "aid"]:
            name = "Optical aid"
        elif split_name(name)[1]:
            name = label_of(name, MAX_LINES)
        found.append(error.model_copy(update={"field": name}))
    return found


@dataclass(slots=True)
class Sheet:
    """A form with what was typed."""

    groups: Sequence[Group]
    values: dict[str, str] = field(default_factory=dict)

    @property
    def entries(self) -> dict[str, Entry]:
        """Every field by name."""
        return {e.name: e for g in self.groups for e in g.entries}

    @classmethod
    def read(cls, groups: Sequence[Group], items: Iterable[tuple[str, str]]) -> Sheet:
        """The form from the parameters of an address. Raises BadAddress."""
        sheet = cls(groups)
        known = sheet.entries
        version = ""
        for name, value in items:
            if name == "v":
                version = value
            elif name not in known or name in sheet.values:
                raise BadAddress(
                    f"{name[:100]}: unknown parameter, or it stands twice",
                    [
                        FieldError(
                            field=name[:100],
                            value=value[:100],
                            allowed="a field of the form, once",
                            message="unknown parameter, or it stands twice",
                            remedy="Use the form to make a new address.",
                        )
                    ],
                )
            else:
                sheet.values[name] = value.strip()
        if version != VERSION:
            raise BadAddress("the address was made for another version of the form")
        sheet.values = {k: v for k, v in sheet.values.items() if v}
        return sheet

    def get(self, name: str, default: str = "") -> str:
        """Text of a field."""
        return self.values.get(name, default)

    def query(self) -> str:
        """The address of what was typed."""
        return urlencode([("v", VERSION), *self.values.items()], quote_via=quote)

    def body(self, errors: list[FieldError]) -> dict[str, Any]:
        """The values as a nested object; what cannot be read joins the errors."""
        found: dict[str, Any] = {}
        for name, entry in self.entries.items():
            text = self.values.get(name)
            if text is None:
                continue
            *way, last = name.split(".")
            place = found
            for step in way:
                place = place.setdefault(step, {})
            place[last] = self._value(entry, text, errors)
        return found

    def _value(self, entry: Entry, text: str, errors: list[FieldError]) -> Any:
        if not entry.unit or not entry.number:
            return text
        try:
            value = parse_number(text)
        except NotANumber as error:
            errors.append(
                FieldError(
                    field=entry.name,
                    value=text[:100],
                    allowed="a number",
                    message=str(error),
                    remedy=error.remedy,
                )
            )
            return None
        return value if entry.scale == 1.0 else value * entry.scale

    def validated(self, model: type[M], body: dict[str, Any], errors: list[FieldError]) -> M:
        """The request. Raises InvalidRequest with every error there is, under the names of the fields."""
        unread = {e.field for e in errors}
        try:
            request = model.model_validate(body)
        except ValidationError as error:
            errors += [
                self._as_typed(e) for e in invalid_request(error, model).errors if e.field not in unread
            ]
        if errors:
            raise InvalidRequest("Some values cannot be used; nothing was computed.", errors)
        return request

    def _as_typed(self, error: FieldError) -> FieldError:
        """An error of the request in the words of the form: blank fields, percent."""
        if error.message == "this field is missing":
            return error.model_copy(update={"message": "a value is needed here", "remedy": "Fill it in."})
        entry = self.entries.get(error.field)
        if entry is not None and entry.scale != 1.0:
            allowed = f"{error.allowed}, given here in {entry.unit}"
            return error.model_copy(update={"value": self.get(error.field), "allowed": allowed})
        return error
