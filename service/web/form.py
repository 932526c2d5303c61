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
from service.contract.request import EvaluationRequest
from service.web.fields import (
    ADDRESS_VERSION,
    BEAM_NUMBERS,
    CHANGES,
    CHOICES,
    EMISSION,
    EMISSION_NUMBERS,
    MODE_NAMES,
    PARTS,
    TOP_NUMBERS,
    TOP_TEXT,
    field_name,
)
from service.web.numbers import NotANumber, parse_number, plain
from service.web.shelf import BadRanges, parse_ranges, shelf

__all__ = ["BadAddress", "Form"]


class BadAddress(Problem):
    """The address has a parameter that this version of the service does not know."""

    slug = "bad-address"
    title = "This address cannot be used"
    status = 400


def _refuse(
    name: str,
    value: str,
    allowed: str,
    message: str,
    remedy: str = "Use the form to make a new address.",
) -> BadAddress:
    error = FieldError(field=name[:100], value=value[:100], allowed=allowed, message=message, remedy=remedy)
    return BadAddress(f"{name[:100]}: {message}", [error])


def _known_fields(counts: dict[str, int]) -> set[str]:
    """Every field of a form with so many lines, pairs and windows."""
    repeated = {
        field_name(n, k + 1)
        for part, (fields, _, _, _) in PARTS.items()
        for n in fields
        for k in range(counts[part])
    }
    return {*TOP_TEXT, *TOP_NUMBERS} | {f"shelf-{key}" for key in shelf()} | repeated


@dataclass(slots=True)
class Form:
    """What stands in the form: text by field name, how many of each part, whether only to edit."""

    values: dict[str, str] = field(default_factory=dict)
    counts: dict[str, int] = field(
        default_factory=lambda: {part: least for part, (_, _, least, _) in PARTS.items()}
    )
    edit: bool = False

    @property
    def lines(self) -> int:
        """Number of emission lines."""
        return self.counts["lines"]

    @classmethod
    def read(cls, items: Sequence[tuple[str, str]]) -> Form:
        """The form from the parameters of an address. Raises BadAddress."""
        given: dict[str, str] = {}
        for name, value in items:
            if name in given:
                raise _refuse(name, value, "one value", "this parameter stands twice")
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
        counts = {}
        for part, (_, _, least, most) in PARTS.items():
            text = given.pop(part, str(least))
            if not (text.isascii() and text.isdecimal() and least <= int(text[:9]) <= most):
                raise _refuse(part, text, f"{least} to {most}", f"not a number of {part}")
            counts[part] = int(text)
        edit, change = given.pop("edit", ""), given.pop("change", "")
        if edit not in ("", "1") or change not in ("", *CHANGES):
            raise _refuse("edit" if edit not in ("", "1") else "change", edit or change, "1", "unknown value")
        known = _known_fields(counts)
        for name, value in given.items():
            if name not in known:
                raise _refuse(name, value, "a field of the form", "unknown parameter")
            choices = ("1",) if name.startswith("shelf-") else CHOICES.get(name.rpartition("-")[0])
            if value and choices and value not in choices:
                raise _refuse(
                    name, value, ", ".join(choices), "unknown choice", "Choose one of those listed."
                )
        form = cls({k: v for k, v in given.items() if v}, counts, bool(edit))
        return form._changed(*CHANGES[change]) if change else form

    def _changed(self, part: str, by: int) -> Form:
        """The form with one of a part more or less, to be edited."""
        fields, _, least, most = PARTS[part]
        count = min(max(self.counts[part] + by, least), most)
        gone = {field_name(n, self.counts[part]) for n in fields} if count < self.counts[part] else set()
        return Form(
            {k: v for k, v in self.values.items() if k not in gone}, {**self.counts, part: count}, True
        )

    def get(self, name: str, default: str = "") -> str:
        """Text of a field."""
        return self.values.get(name, default)

    def query(self) -> str:
        """The canonical address: version first, one order, no blanks, numbers as short as can be."""
        items = [("v", ADDRESS_VERSION)]
        items += [
            (n, self._canonical(n, n in TOP_NUMBERS)) for n in (*TOP_TEXT, *TOP_NUMBERS) if n in self.values
        ]
        for part, (fields, numbers, least, _) in PARTS.items():
            if part == "lines" or self.counts[part] > least:
                items.append((part, str(self.counts[part])))
            for k in range(self.counts[part]):
                for name in fields:
                    full = field_name(name, k + 1)
                    if full in self.values:
                        items.append((full, self._canonical(full, name in numbers)))
        items += [(f"shelf-{key}", "1") for key in shelf() if f"shelf-{key}" in self.values]
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
        body |= {name: self.values[name] for name in TOP_TEXT if name in self.values}
        exposure, distance = (self._number(n, errors) for n in TOP_NUMBERS)
        if exposure is not None:
            body["exposure_s"] = exposure
        if distance is not None:
            body["viewing"] = {"distance_m": distance}
        pairs = [self._pair(k + 1, errors) for k in range(self.counts["pairs"])]
        pairs += [pair for key, pair in shelf().items() if f"shelf-{key}" in self.values]
        windows = [self._window(k + 1, errors) for k in range(self.counts["windows"])]
        body |= {name: given for name, given in (("eyewear", pairs), ("windows", windows)) if given}
        unread = {e.field for e in errors}
        try:
            request = EvaluationRequest.model_validate(body)
        except ValidationError as error:
            for found in (_as_form_error(e) for e in invalid_request(error).errors):
                if found.field not in unread:
                    unread.add(found.field)
                    errors.append(found)
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
            "diameter_at": self.get(field_name("diameter_at", k), "waist"),
        }
        line = {
            "wavelength_nm": self._number(field_name("wavelength_nm", k), errors),
            "subtense_mrad": self._number(field_name("subtense_mrad", k), errors),
            "emission": {n: v for n, v in emission.items() if v is not None},
            "beam": {n: v for n, v in beam.items() if v is not None},
        }
        return {n: v for n, v in line.items() if v is not None}

    def _pair(self, k: int, errors: list[FieldError]) -> dict[str, Any]:
        """One typed pair of eyewear."""
        pair: dict[str, Any] = {"name": self.get(field_name("pair_name", k), f"Pair {k}")}
        full = field_name("pair_ranges", k)
        try:
            pair["ranges"] = parse_ranges(self.get(full))
        except BadRanges as error:
            allowed = "ranges, for example 780-1100: OD 7 | D LB6 + IR LB7"
            remedy = "Write it as the example shows."
            errors.append(
                FieldError(
                    field=full, value=self.get(full)[:100], allowed=allowed, message=str(error), remedy=remedy
                )
            )
        light = self._number(field_name("pair_light_percent", k), errors)
        return pair if light is None else {**pair, "luminous_transmittance": light / 100.0}

    def _window(self, k: int, errors: list[FieldError]) -> dict[str, Any]:
        """One typed window."""
        window: dict[str, Any] = {
            "name": self.get(field_name("window_name", k), f"Window {k}"),
            "distance_m": self._number(field_name("window_distance_m", k), errors),
            "optical_density": self._number(field_name("window_density", k), errors),
        }
        return {n: v for n, v in window.items() if v is not None}


PAIR_NAMES = {"name": "pair_name", "luminous_transmittance": "pair_light_percent"}
WINDOW_NAMES = {"name": "window_name", "optical_density": "window_density"}


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
    elif parts[0] == "eyewear" and len(parts) > 1:
        leaf = {"name": "pair_name", "luminous_transmittance": "pair_light_percent"}.get(
            parts[-1], "pair_ranges"
        )
        name = field_name(leaf, int(parts[1]) + 1)
    elif parts[0] == "eyewear":
        name = "protection"
    elif parts[0] == "windows" and len(parts) > 1:
        leaf = {"name": "window_name", "optical_density": "window_density"}.get(
            parts[-1], "window_distance_m"
        )
        name = field_name(leaf, int(parts[1]) + 1)
    allowed = error.allowed.removesuffix(", or a list of two")
    if name.startswith("pair_light_percent"):
        allowed = "a number, above 0 to 100 %"
    message = "a value is needed here" if error.message == "this field is missing" else error.message
    remedy = "Enter it as the data sheet gives it." if error.remedy == "Add this field." else error.remedy
    return error.model_copy(update={"field": name, "allowed": allowed, "message": message, "remedy": remedy})
