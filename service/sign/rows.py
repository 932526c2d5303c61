"""The rows of a sign that carry figures: output, eyewear, distances; each figure with the value behind it."""

from __future__ import annotations

import math
from dataclasses import dataclass
from decimal import Decimal
from typing import Any

from pydantic import Field

from service.contract.evaluation import EvaluationResult
from service.contract.eyewear_asked import density_asked, lines_together, places
from service.contract.result import Model, TargetAnswer
from service.sign.figures import density, exact, measure, wavelength
from service.sign.tables import Phrases

__all__ = [
    "Figure",
    "Row",
    "Speech",
    "beyond_every_filter",
    "distances",
    "eyewear",
    "needs_eyewear",
    "outputs",
]

#: Scale numbers of EN 207 end here.
HIGHEST_SCALE = 10


class Figure(Model):
    """A printed figure: where it stands in the answer, its exact value and unit, and how it is printed."""

    path: str
    value: float
    unit: str
    shown: str


class Row(Model):
    """A row: what it is about, and its lines; `label` is blank for lines in the sender's own words."""

    id: str = Field(description="output, eyewear, distance, laser, room, officer, valid or extra.")
    label: str
    lines: list[str]


@dataclass(frozen=True, slots=True)
class Speech:
    """The one or two languages of a sign."""

    phrases: list[Phrases]

    @property
    def decimal(self) -> str:
        """The decimal mark that all languages of the sign use, a point where they differ."""
        marks = {p.decimal for p in self.phrases}
        return marks.pop() if len(marks) == 1 else "."

    def distinct(self, part: str, key: str) -> list[str]:
        """A word in each language, the same word once."""
        return list(dict.fromkeys(getattr(p, part)[key] for p in self.phrases))

    def each(self, key: str, *values: object) -> list[str]:
        """A phrase in each language with its gaps filled, the same phrase once."""
        return list(dict.fromkeys(p.words[key].format(*values) for p in self.phrases))

    def joined(self, key: str, *values: object) -> str:
        """A phrase in the languages, one after the other."""
        return " / ".join(self.each(key, *values))


def outputs(result: EvaluationResult, speech: Speech, figures: list[Figure]) -> Row:
    """Wavelength, power or energy, pulse duration and rate of every line."""
    lines = []
    for k, line in enumerate(result.inputs["lines"]):
        parts = _emission(line, f"inputs.lines.{k}.emission", speech, figures)
        lines.append(f"{_wavelength(result, k, speech, figures)}: {', '.join(parts)}")
    return Row(id="output", label=speech.joined("output"), lines=lines)


def _wavelength(result: EvaluationResult, k: int, speech: Speech, figures: list[Figure]) -> str:
    value = result.inputs["lines"][k]["wavelength_nm"]
    shown = wavelength(value, speech.decimal)
    figures.append(Figure(path=f"inputs.lines.{k}.wavelength_nm", value=value, unit="nm", shown=shown))
    return shown


def _emission(line: dict[str, Any], path: str, speech: Speech, figures: list[Figure]) -> list[str]:
    """The parts of a line's output in words; in an open resonator the beam that circulates."""
    emission = line["emission"]
    share = 1 - exact(line.get("output_mirror_reflectance") or 0.0)

    def shown(name: str, unit: str, value: Decimal, *, up: bool = True) -> str:
        text = measure(value, unit, speech.decimal, up=up)
        figures.append(Figure(path=f"{path}.{name}", value=float(value), unit=unit, shown=text))
        return text

    if emission["mode"] == "cw":
        return [shown("power_w", "W", exact(emission["power_w"]) / share), speech.joined("continuous")]
    duration = shown("pulse_s", "s", exact(emission["pulse_s"]), up=False)
    if emission["mode"] == "pulse":
        return [
            f"{shown('energy_j', 'J', exact(emission['energy_j']) / share)}, {duration}",
            speech.joined("single"),
        ]
    rate = exact(emission["rate_hz"])
    if emission.get("energy_j") is not None:
        energy = exact(emission["energy_j"]) / share
        average = energy * rate
    else:
        average = exact(emission["average_power_w"]) / share
        energy = average / rate
    return [
        shown("energy_j", "J", energy),
        duration,
        shown("rate_hz", "Hz", rate),
        f"{speech.joined('average')} {shown('average_power_w', 'W', average)}",
    ]


def eyewear(result: EvaluationResult, speech: Speech, figures: list[Figure]) -> Row | None:
    """Optical density and scale numbers that each wavelength needs; None where none is needed.

    Where lines add, a line's exposure counts as many times as lines add (log10 n more density), so that
    behind the filter all of them together stay within the limit. An optical aid that was entered counts,
    and a sweep counts as stopped.
    """
    lines = []
    for k, need in enumerate(result.protection.lines):
        name, asked = density_asked(result, k)
        if asked == 0.0:
            continue
        marks, beyond = _marks(result, k)
        shown = density(exact(asked), speech.decimal)
        path = f"protection.lines.{need.line}.{name}.optical_density"
        figures.append(Figure(path=path, value=asked, unit="1", shown=shown))
        parts = [f"OD ≥ {shown}"]
        parts += [speech.joined("beyond")] if beyond else [marks] if marks else []
        lines.append(f"{_wavelength(result, k, speech, figures)}: {', '.join(parts)}")
    return Row(id="eyewear", label=_label(result, "eyewear", speech), lines=lines) if lines else None


def _label(result: EvaluationResult, key: str, speech: Speech) -> str:
    """What a row is about; behind a diffuser it holds for the scattered light alone, and says so."""
    if result.diffuse is None:
        return speech.joined(key)
    phrases = [p.words["scattered"].format(p.words[key]) for p in speech.phrases]
    return " / ".join(dict.fromkeys(phrases))


def _marks(result: EvaluationResult, k: int) -> tuple[str, bool]:
    """Scale numbers of line k by mode as marked, D LB5 + IR LB6, and whether one lies beyond the scale."""
    numbers: dict[str, int] = {}
    together = lines_together(result, k)
    for scale in (s for at in places(result, k).values() for s in at.scale_numbers):
        asked = scale.scale_number_needed
        if together > 1 and scale.hazard_ratio > 0.0:
            asked = max(asked, math.ceil(round(math.log10(together * scale.hazard_ratio), 9)))
        if asked > 0:
            numbers[scale.mode] = max(numbers.get(scale.mode, 0), asked)
    beyond = any(n > HIGHEST_SCALE for n in numbers.values())
    return " + ".join(f"{mode} LB{n}" for mode, n in numbers.items()), beyond


def beyond_every_filter(result: EvaluationResult) -> bool:
    """Whether some line asks for more than the highest scale number there is."""
    return any(_marks(result, k)[1] for k in range(len(result.protection.lines)))


def needs_eyewear(result: EvaluationResult) -> bool:
    """Whether some line asks for an optical density."""
    return any(density_asked(result, k)[1] > 0.0 for k in range(len(result.protection.lines)))


def distances(
    result: EvaluationResult, speech: Speech, figures: list[Figure], *, whole_room: bool
) -> Row | None:
    """Hazard distances, 'whole room' where there is no end; None where nothing is exceeded.

    A sweeping beam counts as if it stopped, where that reaches farther.
    """
    targets: dict[str, dict[str, TargetAnswer]] = {"eye": {"eye": result.eye}, "skin": {"skin": result.skin}}
    if result.scan is not None:
        targets["eye"]["scan.failure_eye"] = result.scan.failure_eye
        targets["skin"]["scan.failure_skin"] = result.scan.failure_skin
    if result.eye_aided is not None:
        targets["aided"] = {"eye_aided": result.eye_aided}
        if result.scan is not None and result.scan.failure_eye_aided is not None:
            targets["aided"]["scan.failure_eye_aided"] = result.scan.failure_eye_aided
    parts = []
    for name, found in targets.items():
        ends = {path: t.hazard_distance_m for path, t in found.items()}
        path, far = max(ends.items(), key=lambda e: math.inf if e[1] is None else e[1])
        if far == 0.0:
            continue
        if far is None or whole_room:
            parts.append(f"{speech.joined(name)}: {speech.joined('whole_room')}")
            continue
        shown = measure(exact(far), "m", speech.decimal, prefixes="km")
        figures.append(Figure(path=f"{path}.hazard_distance_m", value=far, unit="m", shown=shown))
        parts.append(f"{speech.joined(name)}: {shown}")
    return Row(id="distance", label=_label(result, "distance", speech), lines=parts) if parts else None
