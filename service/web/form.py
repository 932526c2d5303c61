"""The form: its fields, its address and its way to a request.

The address holds every value of the form and nothing else, in one order, without blanks. It
carries a version; an unknown, repeated or outdated parameter is refused, never filled in.
"""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import dataclass, field
from typing import Any
from urllib.parse import quote, urlencode

from pydantic import ValidationError

from service.contract.problem import FieldError, InvalidRequest, Problem, invalid_request
from service.contract.request import MAX_LINES, EvaluationRequest
from service.web.numbers import NotANumber, parse_number, plain

__all__ = ["ADDRESS_VERSION", "BadAddress", "Form", "field_name", "label_of"]

ADDRESS_VERSION = "1"

TOP_TEXT = ("label", "rules")
TOP_NUMBERS = ("exposure_s", "distance_m")
CHOICES = {"mode": ("cw", "pulse", "train"), "profile": ("gaussian", "tophat"), "level": ("1/e2", "1/e")}
EMISSION = {
    "cw": ("power_w",),
    "pulse": ("energy_j", "pulse_s"),
    "train": ("energy_j", "average_power_w", "pulse_s", "rate_hz"),
}
EMISSION_NUMBERS = ("power_w", "energy_j", "average_power_w", "pulse_s", "rate_hz")
BEAM_NUMBERS = ("diameter_mm", "diameter_y_mm", "divergence_mrad", "divergence_y_mrad", "waist_m")
LINE_NUMBERS = ("wavelength_nm", *EMISSION_NUMBERS, *BEAM_NUMBERS, "subtense_mrad")
LINE_FIELDS = (
    "wavelength_nm",
    "mode",
    *EMISSION_NUMBERS,
    "profile",
    *BEAM_NUMBERS[:4],
    "level",
    "waist_m",
    "subtense_mrad",
)
MODE_NAMES = {"cw": "continuous wave", "pulse": "a single pulse", "train": "a pulse train"}
CHANGES = {"add": 1, "remove": -1}
LABELS = {
    "label": "Name of this laser",
    "rules": "Rule set",
    "exposure_s": "Exposure duration",
    "distance_m": "Viewing distance",
    "wavelength_nm": "Wavelength",
    "power_w": "Power",
    "energy_j": "Energy of one pulse",
    "average_power_w": "Average power",
    "pulse_s": "Pulse duration",
    "rate_hz": "Repetition rate",
    "diameter_mm": "Waist diameter",
    "diameter_y_mm": "Diameter, other axis",
    "divergence_mrad": "Divergence",
    "divergence_y_mrad": "Divergence, other axis",
    "waist_m": "Waist position",
    "subtense_mrad": "Source subtense",
}


class BadAddress(Problem):
    """The address has a parameter that this version of the service does not know."""

    slug = "bad-address"
    title = "This address cannot be used"
    status = 400


def label_of(name: str, lines: int) -> str:
    """What the page calls a field, with the number of its line where there are several."""
    base, _, line = name.rpartition("-")
    if base in LABELS:
        return f"{LABELS[base]} (line {line})" if lines > 1 else LABELS[base]
    return LABELS.get(name, name)


def field_name(name: str, line: int) -> str:
    """Form field of a line, counted from 1."""
    return f"{name}-{line}"


def _refuse(name: str, value: str, allowed: str, message: str, remedy: str) -> BadAddress:
    error = FieldError(field=name[:100], value=value[:100], allowed=allowed, message=message, remedy=remedy)
    return BadAddress(f"{name[:100]}: {message}", [error])


@dataclass(slots=True)
class Form:
    """What stands in the form: text by field name, the number of lines, whether only to edit."""

    values: dict[str, str] = field(default_factory=dict)
    lines: int = 1
    edit: bool = False

    @classmethod
    def read(cls, items: Sequence[tuple[str, str]]) -> Form:
        """The form from the parameters of an address. Raises BadAddress."""
        given: dict[str, str] = {}
        for name, value in items:
            if name in given:
                raise _refuse(
                    name,
                    value,
                    "one value",
                    "this parameter stands twice",
                    "Use the form to make a new address.",
                )
            given[name] = value.strip()
        version = given.pop("v", "")
        if version != ADDRESS_VERSION:
            raise _refuse(
                "v",
                version,
                ADDRESS_VERSION,
                "the address was made for another version of the form",
                "Enter the values in the form anew; the meaning of a field may have changed.",
            )
        count = given.pop("lines", "1")
        if not (count.isascii() and count.isdecimal() and 1 <= int(count[:9]) <= MAX_LINES):
            raise _refuse(
                "lines",
                count,
                f"1 to {MAX_LINES}",
                "not a number of lines",
                "Use the form to make a new address.",
            )
        lines = int(count)
        edit, change = given.pop("edit", ""), given.pop("change", "")
        if edit not in ("", "1") or change not in ("", *CHANGES):
            raise _refuse(
                "edit" if edit else "change",
                edit or change,
                "1",
                "unknown value",
                "Use the form to make a new address.",
            )
        fields = {*TOP_TEXT, *TOP_NUMBERS} | {field_name(n, k + 1) for n in LINE_FIELDS for k in range(lines)}
        for name, value in given.items():
            if name not in fields:
                raise _refuse(
                    name,
                    value,
                    "a field of the form",
                    "unknown parameter",
                    "Use the form to make a new address.",
                )
            choices = CHOICES.get(name.rpartition("-")[0])
            if value and choices and value not in choices:
                raise _refuse(
                    name, value, ", ".join(choices), "unknown choice", "Choose one of those listed."
                )
        form = cls({k: v for k, v in given.items() if v}, lines, bool(edit))
        return form._changed(CHANGES[change]) if change else form

    def _changed(self, by: int) -> Form:
        """The form with a line more or less, to be edited."""
        lines = min(max(self.lines + by, 1), MAX_LINES)
        gone = {field_name(n, self.lines) for n in LINE_FIELDS} if lines < self.lines else set()
        return Form({k: v for k, v in self.values.items() if k not in gone}, lines, True)

    def get(self, name: str, default: str = "") -> str:
        """Text of a field."""
        return self.values.get(name, default)

    def query(self) -> str:
        """The canonical address: version first, one order, no blanks, numbers as short as can be."""
        names = [*TOP_TEXT, *TOP_NUMBERS]
        numbers = {*TOP_NUMBERS} | {field_name(n, k + 1) for n in LINE_NUMBERS for k in range(self.lines)}
        items = [("v", ADDRESS_VERSION)]
        items += [(n, self._canonical(n, n in numbers)) for n in names if n in self.values]
        items += [("lines", str(self.lines))]
        for k in range(self.lines):
            for name in (field_name(n, k + 1) for n in LINE_FIELDS):
                if name in self.values:
                    items.append((name, self._canonical(name, name in numbers)))
        if self.edit:
            items.append(("edit", "1"))
        return urlencode(items, quote_via=quote)

    def _canonical(self, name: str, number: bool) -> str:
        if number:
            try:
                return plain(parse_number(self.values[name]))
            except NotANumber:
                pass
        return self.values[name]

    def request(self) -> EvaluationRequest:
        """The request. Raises InvalidRequest with the names of the form's fields."""
        errors: list[FieldError] = []
        body: dict[str, Any] = {"lines": [self._line(k + 1, errors) for k in range(self.lines)]}
        if "label" in self.values:
            body["label"] = self.values["label"]
        if "rules" in self.values:
            body["rules"] = self.values["rules"]
        exposure, distance = (self._number(n, errors) for n in TOP_NUMBERS)
        if exposure is not None:
            body["exposure_s"] = exposure
        if distance is not None:
            body["viewing"] = {"distance_m": distance}
        unread = {e.field for e in errors}
        try:
            request = EvaluationRequest.model_validate(body)
        except ValidationError as error:
            found = [_as_form_error(e) for e in invalid_request(error).errors]
            errors += [e for e in found if e.field not in unread]
        if errors:
            raise InvalidRequest("Some values cannot be used; nothing was computed.", errors)
        return request

    def _number(self, name: str, errors: list[FieldError]) -> float | None:
        """A typed number, None where blank; what cannot be read joins the errors."""
        text = self.values.get(name)
        if text is None:
            return None
        try:
            return parse_number(text)
        except NotANumber as error:
            errors.append(
                FieldError(
                    field=name, value=text[:100], allowed="a number", message=str(error), remedy=error.remedy
                )
            )
            return None

    def _line(self, k: int, errors: list[FieldError]) -> dict[str, Any]:
        mode = self.get(field_name("mode", k), "cw")
        emission: dict[str, Any] = {"mode": mode}
        for name in EMISSION_NUMBERS:
            full = field_name(name, k)
            if name in EMISSION[mode]:
                emission[name] = self._number(full, errors)
            elif full in self.values:
                errors.append(
                    FieldError(
                        field=full,
                        value=self.values[full][:100],
                        allowed=f"blank for {MODE_NAMES[mode]}",
                        message=f"this value does not belong to {MODE_NAMES[mode]}",
                        remedy="Clear it, or choose the other kind of emission.",
                    )
                )
        diameter, diameter_y, divergence, divergence_y, waist = (
            self._number(field_name(n, k), errors) for n in BEAM_NUMBERS
        )
        beam: dict[str, Any] = {
            "profile": self.get(field_name("profile", k), "gaussian"),
            "level": self.get(field_name("level", k), "1/e2"),
            "diameter_mm": diameter if diameter_y is None or diameter is None else [diameter, diameter_y],
            "divergence_mrad": divergence
            if divergence_y is None or divergence is None
            else [divergence, divergence_y],
            "waist_m": waist,
        }
        line = {
            "wavelength_nm": self._number(field_name("wavelength_nm", k), errors),
            "subtense_mrad": self._number(field_name("subtense_mrad", k), errors),
            "emission": {n: v for n, v in emission.items() if v is not None},
            "beam": {n: v for n, v in beam.items() if v is not None},
        }
        return {n: v for n, v in line.items() if v is not None}


def _as_form_error(error: FieldError) -> FieldError:
    """An error of the request under the name of the form's field."""
    parts = error.field.split(".")
    name = error.field
    if parts[0] == "lines" and len(parts) > 2:
        leaf = next(p for p in reversed(parts) if not p.isdigit())
        if parts[-1] == "1" and leaf in ("diameter_mm", "divergence_mrad"):
            leaf = leaf.replace("_m", "_y_m")
        if leaf == "emission":
            leaf = "energy_j"
        name = field_name(leaf, int(parts[1]) + 1)
    elif parts[0] == "viewing":
        name = parts[-1]
    allowed = error.allowed.removesuffix(", or a list of two")
    message = "a value is needed here" if error.message == "this field is missing" else error.message
    remedy = "Enter it as the data sheet gives it." if error.remedy == "Add this field." else error.remedy
    return error.model_copy(update={"field": name, "allowed": allowed, "message": message, "remedy": remedy})
