"""The setup as it was given: the filled fields of the form in words, for the printed sheet."""

from __future__ import annotations

from service.contract.problem import UNITS
from service.web.fields import LABELS, LINE_FIELDS, PAIR_FIELDS, TOP_NUMBERS, WINDOW_FIELDS, field_name
from service.web.form import Form
from service.web.numbers import NotANumber, parse_number, plain
from service.web.shelf import shelf

__all__ = ["setup_given"]

WORDS = {
    "basis": (
        "Figures",
        {"measured": "measured", "data_sheet": "data sheet", "bound": "bound, not measured"},
    ),
    "mode": ("Emission", {"cw": "continuous", "pulse": "single pulse", "train": "pulse train"}),
    "profile": ("Profile", {"gaussian": "Gaussian", "tophat": "top hat"}),
    "level": ("Diameter and divergence at", {"1/e2": "1/e² of the peak", "1/e": "1/e of the peak"}),
    "diameter_at": ("Diameter given at", {"waist": "the waist", "exit": "the exit"}),
}
BLANK = {"exposure_s": "usual duration", "distance_m": "not evaluated"}


def setup_given(form: Form, titles: dict[str, str]) -> list[tuple[str, list[tuple[str, str]]]]:
    """Parts of the setup, each with the labels and values of its filled fields.

    Parameters
    ----------
    form : the form that was sent
    titles : title of every rule set by id, the default first
    """
    rules = form.get("rules", next(iter(titles)))
    parts = [("Laser", [("Name", form.get("label", "not named")), ("Rule set", titles.get(rules, rules))])]
    if form.get("basis"):
        parts[0][1].append((WORDS["basis"][0], _value("basis", form.get("basis"))))
    for k in range(form.lines):
        name = f"Line {k + 1}" if form.lines > 1 else "Emission and beam"
        parts.append((name, _filled(form, LINE_FIELDS, k + 1)))
    parts.append(("Exposure", [(LABELS[n], _value(n, form.get(n)) or BLANK[n]) for n in TOP_NUMBERS]))
    for part, name, names in (("pairs", "Pair", PAIR_FIELDS), ("windows", "Window", WINDOW_FIELDS)):
        parts += [(f"{name} {k + 1}", _filled(form, names, k + 1)) for k in range(form.counts[part])]
    picked = [pair["name"] for key, pair in shelf().items() if form.get(f"shelf-{key}")]
    if picked:
        parts.append(("From the shelf", [("Pair (invented)", name) for name in picked]))
    return parts


def _filled(form: Form, names: tuple[str, ...], k: int) -> list[tuple[str, str]]:
    """Label and value of the fields of part k that are not blank."""
    found = [(n, form.get(field_name(n, k))) for n in names]
    return [(WORDS[n][0] if n in WORDS else LABELS[n], _value(n, text)) for n, text in found if text]


def _value(name: str, text: str) -> str:
    """A value in words or with its unit."""
    if name in WORDS:
        return WORDS[name][1][text]
    unit = "%" if name.endswith("_percent") else UNITS.get(name.rpartition("_")[2], "")
    if not text or not unit:
        return text
    try:
        return f"{plain(parse_number(text))} {unit}"
    except NotANumber:
        return text
