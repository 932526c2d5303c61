"""The setup as it was given: the filled fields of the form in words, for the printed sheet."""

from __future__ import annotations

from service.web.asked import third
from service.web.fields import AID, ELEMENTS, FIELDS, PARTS, field_name, split_name
from service.web.form import Form, unit_name
from service.web.looks import looks
from service.web.shelf import shelf
from service.web.units import FAMILIES

__all__ = ["setup_given"]

Rows = list[tuple[str, str]]
BLANK = {"distance_m": "not evaluated"}


def setup_given(form: Form, titles: dict[str, str]) -> list[tuple[str, Rows]]:
    """Parts of the setup, each with the labels and values of its filled fields.

    Parameters
    ----------
    form : the form that was sent
    titles : title of every rule set by id, the default first
    """
    rules = form.get("rules", next(iter(titles)))
    named = [(FIELDS[n].label, form.get(n)) for n in ("place", "asked_by") if form.get(n)]
    laser = [("Name", form.get("label", "not named")), *named, ("Rule set", titles.get(rules, rules))]
    if form.get("basis"):
        laser.append((FIELDS["basis"].label, _value(form, "basis")))
    parts: list[tuple[str, Rows]] = [("Laser", laser)]
    for k in range(form.lines):
        name = f"Line {k + 1}" if form.lines > 1 else "Emission and beam"
        filled = _filled(form, PARTS["lines"].fields, k + 1)
        label, _, value = third(form, k + 1).partition(": ")
        parts.append((name, [*filled, (label, value)] if value else filled))
    for k in range(form.counts["elements"]):
        kind = form.get(field_name("bench_kind", k + 1))
        parts.append((f"Element {k + 1}", _filled(form, ("bench_kind", *ELEMENTS[kind][1]), k + 1)))
    look = form.get("exposure_s")
    words = f", {looks()[look]}" if form.look() in looks() else ""
    duration = _value(form, "exposure_s") + words if look else "usual duration"
    exposure = [(FIELDS["exposure_s"].label, duration)]
    exposure += [
        (FIELDS[n].label, _value(form, n) or BLANK[n])
        for n in ("distance_m", "visibility_km", "outdoors", *AID)
        if n in BLANK or form.get(n)
    ]
    parts.append(("Exposure", exposure))
    for part, name in (("pairs", "Pair"), ("windows", "Window")):
        for k in range(form.counts[part]):
            parts.append((f"{name} {k + 1}", _filled(form, PARTS[part].fields, k + 1)))
    picked = [pair["name"] for key, pair in shelf().items() if form.get(f"shelf-{key}")]
    if picked:
        parts.append(("From the shelf", [("Pair (invented)", name) for name in picked]))
    return parts


def _filled(form: Form, names: tuple[str, ...], k: int) -> Rows:
    """Label and value of the fields of part k that are not blank."""
    full = [field_name(n, k) for n in names]
    return [
        (FIELDS[split_name(n)[0]].label.removeprefix("or "), _value(form, n)) for n in full if form.get(n)
    ]


def _value(form: Form, name: str) -> str:
    """A value in words or with its unit, and what was understood where that reads otherwise."""
    text, spec = form.get(name), FIELDS[split_name(name)[0]]
    if spec.choices:
        return dict(spec.choices)[text]
    if not text or not spec.number:
        return text
    units = FAMILIES[spec.family]
    key = form.get(unit_name(name), units[0].key)
    shown = next(u.shown for u in units if u.key == key)
    understood = form.echo(name)
    return f"{text} {shown}".rstrip() + (f" ({understood})" if understood else "")
