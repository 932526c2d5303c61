"""The form: what stands in its fields, and its address.

The address holds every value of the form and nothing else, in one order, without blanks. It
carries a version; an unknown, repeated or outdated parameter is refused, never filled in.
A value in another unit than that of the field's name has the unit beside it: ``power_w-1=5&power_w-1.in=mW``.
"""

from __future__ import annotations

import re
from collections.abc import Sequence
from contextlib import suppress
from dataclasses import dataclass, field
from urllib.parse import parse_qsl, quote, urlencode

from service.contract.problem import FieldError, Problem
from service.contract.request import EvaluationRequest
from service.web.asked import request_of
from service.web.fields import ADDRESS_VERSION, ELEMENTS, FIELDS, KINDS, PARTS, TOP, field_name, split_name
from service.web.looks import OTHER, USUAL, looks
from service.web.numbers import NotANumber, parse_number, plain
from service.web.shelf import shelf
from service.web.units import FAMILIES, base_unit, convert, echo

__all__ = ["BadAddress", "Form", "read_address", "unit_name"]

#: More than a form with every line, element, pair and window can send.
MAX_PARAMETERS = 2000

#: What the buttons of the form ask for: add-line, add-element-lens, copy-line-2, remove-pair-1, up-element-3.
CHANGE = re.compile(r"(add|copy|remove|up|down)-([a-z]+)(?:-([1-9][0-9]?|[a-z]+))?")


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


def address_items(query: str) -> list[tuple[str, str]]:
    """Names and values of the query of an address. Raises BadAddress where there are too many."""
    try:
        return parse_qsl(query, keep_blank_values=True, max_num_fields=MAX_PARAMETERS)
    except ValueError:
        raise BadAddress(f"the address has more than {MAX_PARAMETERS} parameters") from None


def read_address(query: str) -> Form:
    """The form of the query of an address. Raises BadAddress."""
    return Form.read(address_items(query))


def unit_name(name: str) -> str:
    """Parameter that holds the unit of a field."""
    return f"{name}.in"


def _known_fields(counts: dict[str, int]) -> set[str]:
    """Every field of a form with so many lines, elements, pairs and windows."""
    repeated = {
        field_name(n, k + 1) for part, spec in PARTS.items() for n in spec.fields for k in range(counts[part])
    }
    return {*TOP} | {f"shelf-{key}" for key in shelf()} | repeated


def _choices(name: str) -> tuple[str, ...]:
    """Values that a parameter may have; none where anything may be typed."""
    base, _ = split_name(name.removesuffix(".in"))
    if name.startswith("shelf-"):
        return ("1",)
    if name.endswith(".in"):
        return tuple(u.key for u in FAMILIES[FIELDS[base].family])
    if name == "look":
        return (USUAL, *looks(), OTHER)
    return tuple(value for value, _ in FIELDS[base].choices)


@dataclass(slots=True)
class Form:
    """What stands in the form: text by field name, how many of each part, whether only to edit.

    `anchor` names the part that a button has just added or moved.
    """

    values: dict[str, str] = field(default_factory=dict)
    counts: dict[str, int] = field(default_factory=lambda: {part: spec.least for part, spec in PARTS.items()})
    edit: bool = False
    anchor: str = ""

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
        for part, spec in PARTS.items():
            text = given.pop(part, str(spec.least))
            if not (text.isascii() and text.isdecimal() and spec.least <= int(text[:9]) <= spec.most):
                raise _refuse(part, text, f"{spec.least} to {spec.most}", f"not a number of {part}")
            counts[part] = int(text)
        edit, change = given.pop("edit", ""), given.pop("change", "")
        if edit not in ("", "1"):
            raise _refuse("edit", edit, "1", "unknown value")
        known = _known_fields(counts)
        for name, value in given.items():
            plain_name = name.removesuffix(".in")
            base, _ = split_name(plain_name)
            if plain_name not in known or (plain_name != name and base not in FIELDS):
                raise _refuse(name, value, "a field of the form", "unknown parameter")
            if plain_name != name and not FIELDS[base].number:
                raise _refuse(name, value, "a field with a unit", "unknown parameter")
            choices = _choices(name)
            if value and choices and value not in choices:
                raise _refuse(
                    name, value, ", ".join(choices), "unknown choice", "Choose one of those listed."
                )
        form = cls({k: v for k, v in given.items() if v}, counts, bool(edit))
        form._refuse_strangers()
        form._settle_look()
        return form._changed(change) if change else form

    def _refuse_strangers(self) -> None:
        """An element has the fields of its kind. Raises BadAddress."""
        for k in range(1, self.counts["elements"] + 1):
            kind = self.get(field_name("bench_kind", k))
            own = ("bench_kind", *(ELEMENTS[kind][1] if kind else ()))
            for full in (field_name(n, k) for n in PARTS["elements"].fields if n not in own):
                if full in self.values:
                    allowed = f"a field of {ELEMENTS[kind][0].lower() if kind else 'no element yet'}"
                    raise _refuse(full, self.values[full], allowed, "this element has no such field")

    def canonical(self) -> Form:
        """The same form with every number as its address gives it."""
        texts = dict(parse_qsl(self.query()))
        return Form({k: texts[k] for k in self.values if k in texts}, self.counts, self.edit)

    def _settle_look(self) -> None:
        """A duration chosen in words becomes its number; a choice that disagrees with a number stays."""
        look, typed = self.get("look"), self.get("exposure_s")
        if look in (USUAL, "") or (look == OTHER and typed):
            if look != USUAL or not typed:
                self.values.pop("look", None)
        elif look != OTHER and typed in ("", look) and not self.get("exposure_s.in"):
            self.values["exposure_s"] = look
            del self.values["look"]

    def look(self) -> str:
        """Which choice of duration is in force."""
        typed = self.get("exposure_s")
        if self.get("look"):
            return self.get("look")
        if not typed:
            return USUAL
        return typed if typed in looks() and "exposure_s.in" not in self.values else OTHER

    def _rows(self, part: str) -> list[dict[str, str]]:
        """Filled fields of every one of a part, by name without its number; units as well."""
        names = [n for f in PARTS[part].fields for n in (f, unit_name(f))]
        full = {n: (n.removesuffix(".in"), ".in" if n.endswith(".in") else "") for n in names}
        return [
            {n: v for n in names if (v := self.get(field_name(full[n][0], k + 1) + full[n][1]))}
            for k in range(self.counts[part])
        ]

    def _changed(self, change: str) -> Form:
        """The form after a button that adds, copies, removes or moves one of a part. Raises BadAddress."""
        match = CHANGE.fullmatch(change)
        verb, word, which = match.groups("") if match else ("", "", "")
        part = next((p for p, s in PARTS.items() if s.word == word), "")
        expected = verb != "add" or (which in KINDS if part == "elements" else which == "")
        if not part or not expected or (verb != "add" and not which.isdecimal()):
            raise _refuse("change", change, "add-line, remove-line-1, ...", "unknown change")
        rows, spec = self._rows(part), PARTS[part]
        at = len(rows) if verb == "add" else int(which) - 1
        if verb != "add" and at >= len(rows):
            raise _refuse("change", change, f"1 to {len(rows)}", f"there is no such {word}")
        if verb in ("add", "copy") and len(rows) < spec.most:
            at = at + 1 if verb == "copy" else at
            rows.insert(at, dict(rows[at - 1]) if verb == "copy" else {"bench_kind": which} if which else {})
        elif verb == "remove" and len(rows) > spec.least:
            del rows[at]
        elif verb in ("up", "down"):
            to = min(max(at + (1 if verb == "down" else -1), 0), len(rows) - 1)
            rows.insert(to, rows.pop(at))
            at = to
        gone = {
            name + end for name in _known_fields(self.counts) if split_name(name)[0] in spec.fields
            for end in ("", ".in")
        }  # fmt: skip
        values = {k: v for k, v in self.values.items() if k not in gone}
        for k, row in enumerate(rows, start=1):
            for name, value in row.items():
                stem = name.removesuffix(".in")
                values[field_name(stem, k) + name.removeprefix(stem)] = value
        anchor = f"{spec.word}-{at + 1}" if at < len(rows) else spec.place
        return Form(values, {**self.counts, part: len(rows)}, True, anchor)

    def get(self, name: str, default: str = "") -> str:
        """Text of a field."""
        return self.values.get(name, default)

    def text(self, name: str) -> str:
        """What the box of a field shows: a duration that was chosen in words leaves its box blank."""
        chosen = name == "exposure_s" and "look" not in self.values and self.look() != OTHER
        return "" if chosen else self.get(name)

    def query(self) -> str:
        """The canonical address: version first, one order, no blanks, numbers as short as can be."""
        items = [("v", ADDRESS_VERSION)]
        for name in TOP:
            items += self._items(name)
        for part, spec in PARTS.items():
            if part == "lines" or self.counts[part] > spec.least:
                items.append((part, str(self.counts[part])))
            for k in range(self.counts[part]):
                for name in spec.fields:
                    items += self._items(field_name(name, k + 1))
        items += [(f"shelf-{key}", "1") for key in shelf() if f"shelf-{key}" in self.values]
        if self.edit:
            items.append(("edit", "1"))
        return urlencode(items, quote_via=quote)

    def _items(self, name: str) -> list[tuple[str, str]]:
        """A field of the address with its unit, as far as they say something."""
        base = FIELDS[split_name(name)[0]]
        text, unit = self.get(name), self.get(unit_name(name))
        found = [(name, text)] if text else []
        if text and base.number:
            with suppress(NotANumber):
                found = [(name, plain(parse_number(text)))]
        if unit and base.number and unit != base_unit(base.family).key:
            found.append((unit_name(name), unit))
        return found

    def request(self) -> EvaluationRequest:
        """The request that the form stands for. Raises InvalidRequest with the names of the form's fields."""
        return request_of(self)

    def number(self, name: str) -> float | None:
        """A typed number in the unit of the field's name; None where blank. Raises NotANumber."""
        text = self.get(name)
        if not text:
            return None
        family = FIELDS[split_name(name)[0]].family
        return convert(parse_number(text), family, self.get(unit_name(name)))

    def echo(self, name: str) -> str:
        """What was understood of a number, where it reads otherwise than what was typed."""
        text, family = self.get(name), FIELDS[split_name(name)[0]].family
        try:
            return echo(parse_number(text), text, family, self.get(unit_name(name))) if text else ""
        except NotANumber:
            return ""

    def numbers(self) -> list[str]:
        """Every field of this form that holds a number."""
        names = _known_fields(self.counts)
        return sorted(n for n in names if (f := FIELDS.get(split_name(n)[0])) and f.number)
