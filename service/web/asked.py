"""From the form to the request, and from errors of the request back to the fields of the form."""

from __future__ import annotations

from typing import TYPE_CHECKING, Any

from pydantic import ValidationError

from service.contract.problem import FieldError, InvalidRequest, invalid_request
from service.contract.request import EvaluationRequest
from service.web.fields import AID, BEAM, ELEMENTS, EMISSION, FIELDS, PARTS, TEXT, field_name
from service.web.looks import OTHER, looks
from service.web.numbers import NotANumber, shown_up
from service.web.shelf import BadRanges, parse_ranges, shelf

if TYPE_CHECKING:
    from service.web.form import Form

__all__ = ["MISSING", "field_of", "request_of", "third"]

#: Message of a field that must not stay blank.
MISSING = "a value is needed here"
MODE_NAMES = {"cw": "continuous wave", "pulse": "a single pulse", "train": "a pulse train"}
THREE = ("energy_j", "average_power_w", "rate_hz")


def request_of(form: Form) -> EvaluationRequest:
    """The request that a form stands for. Raises InvalidRequest with the names of the form's fields."""
    reader = _Reader(form)
    body = reader.body()
    errors = reader.errors
    unread = {e.field for e in errors}
    request = None
    try:
        request = EvaluationRequest.model_validate(body)
    except ValidationError as error:
        for problem in invalid_request(error).errors:
            found = _as_form_error(problem, form)
            # What a whole part lacks is no news where one of its fields could not be read.
            whole = problem.field.endswith(".emission") or problem.field.count(".") == 1
            number = found.field.rpartition("-")[2]
            told = whole and any(name.endswith(f"-{number}") for name in unread)
            if found.field not in unread and not told:
                unread.add(found.field)
                errors.append(found)
    if errors or request is None:
        raise InvalidRequest(f"{errors[0].field}: {errors[0].message}; nothing was computed", errors)
    return request


def third(form: Form, k: int) -> str:
    """The third of energy, average power and rate of line k where two are typed, in words; else blank."""
    if form.get(field_name("mode", k), "cw") != "train":
        return ""
    try:
        energy, power, rate = (form.number(field_name(n, k)) for n in THREE)
    except NotANumber:
        return ""
    known = [x for x in (energy, power, rate) if x is not None]
    if len(known) != 2 or min(known) <= 0.0:
        return ""
    if energy is None:
        assert power is not None
        assert rate is not None
        return f"Energy of one pulse, from the other two: {shown_up(power / rate, 6)} J"
    if power is None:
        assert rate is not None
        return f"Average power, from the other two: {shown_up(energy * rate, 6)} W"
    return f"Repetition rate, from the other two: {shown_up(power / energy, 6)} Hz"


class _Reader:
    """Reads a form part by part; what cannot be read joins `errors`."""

    def __init__(self, form: Form) -> None:
        self.form, self.errors = form, list[FieldError]()

    def body(self) -> dict[str, Any]:
        """The body of the request."""
        form = self.form
        viewing: dict[str, Any] = {
            name: self.number(name) for name in ("distance_m", "visibility_km") if name in form.values
        }
        if "outdoors" in form.values:
            viewing["outdoors"] = True
        if any(name in form.values for name in AID):
            viewing["aid"] = self.leaves(AID, "aid_")
        self.look()
        parts = {
            **{name: form.get(name) for name in TEXT},
            "exposure_s": self.number("exposure_s"),
            "viewing": {n: v for n, v in viewing.items() if v is not None},
            "bench": [self.element(k + 1) for k in range(form.counts["elements"])],
            "eyewear": [self.pair(k + 1) for k in range(form.counts["pairs"])]
            + [pair for key, pair in shelf().items() if f"shelf-{key}" in form.values],
            "windows": [self.window(k + 1) for k in range(form.counts["windows"])],
        }
        lines = [self.line(k + 1) for k in range(form.lines)]
        return {"lines": lines} | {n: v for n, v in parts.items() if v not in (None, "", [], {})}

    def refuse(self, name: str, allowed: str, message: str, remedy: str) -> None:
        """One more error."""
        self.errors.append(
            FieldError(
                field=name, value=self.form.get(name)[:100], allowed=allowed, message=message, remedy=remedy
            )
        )

    def number(self, name: str) -> float | None:
        """A typed number, None where blank."""
        try:
            return self.form.number(name)
        except NotANumber as error:
            self.refuse(name, "a number", str(error), error.remedy)
            return None

    def leaves(self, names: tuple[str, ...], prefix: str, k: int = 0) -> dict[str, Any]:
        """Filled fields by the name the request gives them."""
        found: dict[str, Any] = {}
        for name in names:
            full = field_name(name, k) if k else name
            if full in self.form.values:
                number = FIELDS[name].number
                found[name.removeprefix(prefix)] = self.number(full) if number else self.form.get(full)
        return {n: v for n, v in found.items() if v is not None}

    def look(self) -> None:
        """The duration in words and the one in digits must not say two things."""
        look, typed = self.form.get("look"), self.form.get("exposure_s")
        if look == OTHER and not typed:
            self.refuse("exposure_s", "1e-13 to 3e4 s", MISSING, "Type a duration, or choose one in words.")
        elif look and typed:
            said = f"{look} s, {looks()[look]}" if look in looks() else "the usual duration"
            self.refuse(
                "exposure_s",
                "one duration",
                f"you chose {said}, and typed another",
                "Clear the number, or choose another duration.",
            )

    def only(self, k: int, kinds: dict[str, tuple[str, ...]], chosen: str, called: str) -> None:
        """Fields of another kind than the chosen one must be blank: their value would be lost."""
        others = dict.fromkeys(n for names in kinds.values() for n in names if n not in kinds[chosen])
        for full in (field_name(n, k) for n in others):
            if full in self.form.values and not FIELDS[full.rpartition("-")[0]].choices:
                self.refuse(
                    full,
                    f"blank for {called}",
                    f"this value does not belong to {called}",
                    "Clear it, or choose the other kind.",
                )

    def line(self, k: int) -> dict[str, Any]:
        """One emission line."""
        form = self.form
        mode, profile = form.get(field_name("mode", k), "cw"), form.get(field_name("profile", k), "gaussian")
        self.only(k, EMISSION, mode, MODE_NAMES[mode])
        self.only(k, BEAM, profile, "a fibre end" if profile.startswith("fibre") else "a free beam")
        emission = {"mode": mode, **self.leaves(EMISSION[mode], "", k)}
        if mode == "train":
            self.two_of_three(k, emission)
        beam = {"profile": profile, **self.leaves(BEAM[profile], "", k)}
        for first, other in (("diameter_mm", "diameter_y_mm"), ("divergence_mrad", "divergence_y_mrad")):
            second = beam.pop(other, None)
            if second is not None and first in beam:
                beam[first] = [beam[first], second]
        own = ("wavelength_nm", "subtense_mrad", "output_mirror_reflectance")
        return {**self.leaves(own, "", k), "emission": emission, "beam": beam}

    def two_of_three(self, k: int, emission: dict[str, Any]) -> None:
        """Energy and average power give the rate; three values of three are refused, they may disagree."""
        energy, power, rate = (emission.get(n) for n in THREE)
        if energy is None or power is None or energy <= 0.0 or power <= 0.0:
            return
        if rate is None:
            del emission["average_power_w"]
            emission["rate_hz"] = power / energy
            return
        del emission["average_power_w"]
        self.refuse(
            field_name("average_power_w", k),
            "two of energy, average power and rate",
            "two of energy, average power and repetition rate give the third, and three were typed",
            f"Energy and rate give {shown_up(energy * rate, 6)} W. Clear one of the three.",
        )

    def element(self, k: int) -> dict[str, Any]:
        """One element of the bench."""
        kind = self.form.get(field_name("bench_kind", k))
        if not kind:
            self.refuse(field_name("bench_kind", k), "an element", MISSING, "Choose what the light meets.")
            return {"element": "space", "length_m": 0.0}
        element = {"element": kind, **self.leaves(ELEMENTS[kind][1], "bench_", k)}
        whole = {n: int(float(element[n])) for n in ("surfaces", "rows") if _is_whole(element.get(n))}
        return element | whole

    def pair(self, k: int) -> dict[str, Any]:
        """One typed pair of eyewear."""
        pair: dict[str, Any] = {"name": self.form.get(field_name("pair_name", k), f"Pair {k}")}
        full = field_name("pair_ranges", k)
        try:
            pair["ranges"] = parse_ranges(self.form.get(full))
        except BadRanges as error:
            allowed = "ranges, for example 780-1100: OD 7 | D LB6 + IR LB7"
            self.refuse(full, allowed, str(error), "Write it as the example shows.")
        light = self.number(field_name("pair_light_percent", k))
        return pair if light is None else {**pair, "luminous_transmittance": light / 100.0}

    def window(self, k: int) -> dict[str, Any]:
        """One typed window."""
        found = self.leaves(PARTS["windows"].fields[1:], "window_", k)
        if "density" in found:
            found["optical_density"] = found.pop("density")
        return {"name": self.form.get(field_name("window_name", k), f"Window {k}"), **found}


def _is_whole(value: Any) -> bool:
    """Whether a choice or a number can be counted with."""
    return value is not None and float(value).is_integer()


#: Names of the form where they are not those of the request.
PAIR_NAMES = {"name": "pair_name", "luminous_transmittance": "pair_light_percent"}
WINDOW_NAMES = {"name": "window_name", "optical_density": "window_density"}


def field_of(path: str, form: Form) -> str:
    """Name on the form of a field of the request, such as lines.0.beam.diameter_mm."""
    parts = path.split(".")
    more = len(parts) > 1
    number = int(parts[1]) + 1 if more and parts[1].isdigit() else 0
    leaf = next((p for p in reversed(parts) if not p.isdigit()), "")
    if parts[0] == "lines" and number and len(parts) == 2:
        return field_name("line", number)
    if parts[0] == "lines" and number:
        if parts[-1] == "1" and leaf in ("diameter_mm", "divergence_mrad"):
            leaf = leaf.replace("_m", "_y_m")
        profile = form.get(field_name("profile", number), "gaussian")
        whole = {"emission": "energy_j", "beam": BEAM[profile][0]}
        return field_name(whole.get(leaf, leaf), number)
    if parts[0] == "bench" and number:
        kind = form.get(field_name("bench_kind", number))
        first = ELEMENTS[kind][1][0] if kind else "bench_kind"
        return field_name(first if leaf in ("bench", "element") else f"bench_{leaf}", number)
    if parts[0] == "bench":
        return "elements"
    if parts[0] == "viewing":
        return f"aid_{leaf}" if "aid" in parts and leaf != "aid" else leaf
    if parts[0] == "eyewear":
        return field_name(PAIR_NAMES.get(leaf, "pair_ranges"), number) if number else "protection"
    if parts[0] == "windows" and number:
        return field_name(WINDOW_NAMES.get(leaf, "window_distance_m"), number)
    return "look" if path == "exposure_s" and form.look() != OTHER else parts[-1]


def _as_form_error(error: FieldError, form: Form) -> FieldError:
    """An error of the request under the name of the form's field."""
    name = field_of(error.field, form)
    allowed = error.allowed.removesuffix(", or a list of two")
    if name.startswith("pair_light_percent"):
        allowed = "a number, above 0 to 100 %"
    missing = error.message == "this field is missing"
    remedy = {
        "Add this field.": "Enter it as the data sheet gives it.",
        "Check the unit: the name of the field ends with it.": "Check the unit.",
    }.get(error.remedy, error.remedy)
    message = MISSING if missing else error.message
    return error.model_copy(update={"field": name, "allowed": allowed, "message": message, "remedy": remedy})
