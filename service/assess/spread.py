"""One laser many times over, with some of its figures changed: draws and corners as a batch.

Nothing is judged here: the batches go through the same `evaluate` and `classify` as single lasers.
"""

from __future__ import annotations

from collections.abc import Iterator, Mapping, Sequence
from dataclasses import dataclass

import numpy as np
from numpy.typing import NDArray

from service.assess.classification import classify
from service.assess.evaluate import evaluate, optical_density
from service.assess.lines import Lines
from service.optics.beams import Beams
from service.rules.classes import CompiledScheme
from service.rules.compiled import CompiledRules

__all__ = ["CHUNK", "Knob", "Nominal", "Outcomes", "outcomes", "spread"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

#: Lasers judged at once: small enough to stay in the processor's cache.
CHUNK = 2048

#: What can be turned: the exposure duration of all lines, or a figure of one line.
EXPOSURE = "exposure_s"
FIGURES = (
    "wavelength_nm",
    "emitted",
    "average_power_w",
    "pulse_s",
    "rate_hz",
    "subtense_mrad",
    "diameter_x",
    "diameter_y",
    "divergence_x",
    "divergence_y",
    "waist_m",
    "mode_field",
)
#: Figures of the beam alone.
OF_BEAM = FIGURES[FIGURES.index("diameter_x") :]


@dataclass(frozen=True, slots=True)
class Knob:
    """A figure that varies: `line` -1 and figure `exposure_s`, or a line and one of `FIGURES`."""

    line: int
    figure: str


@dataclass(frozen=True, slots=True)
class Nominal:
    """One line as it was given, in the units of the draws.

    `diameters` and `divergences` of both axes and `waist_m` as given; `at_exit` says that the diameter
    was given at the exit instead of the waist. `single_mode`: a Gaussian as wide as the mode field (its
    `diameters`) that spreads as diffraction has it, with the wavelength over the mode field.
    """

    emitted: float
    average_power_w: float | None
    diameters: tuple[float, float]
    divergences: tuple[float, float]
    waist_m: float
    at_exit: bool
    single_mode: bool = False


@dataclass(slots=True)
class Outcomes:
    """What each laser comes to: (m,) arrays. `classes` numbers the classes of each scheme by its id."""

    eye_ratio: Floats
    eye_distance_m: Floats
    skin_ratio: Floats
    skin_distance_m: Floats
    classes: dict[str, Ints]

    @property
    def eye_density(self) -> Floats:
        """Optical density for the eye."""
        return optical_density(self.eye_ratio)

    @property
    def skin_density(self) -> Floats:
        """Optical density for the skin."""
        return optical_density(self.skin_ratio)


def spread(
    base: Lines,
    nominal: Sequence[Nominal],
    turned: Mapping[Knob, Floats],
    rules: CompiledRules,
    by_convention: NDArray[np.bool_],
) -> Lines:
    """The laser `base` once for each element of the turned figures.

    Parameters
    ----------
    base : lines of one laser, in the units of the engine
    nominal : its lines as given, (l,)
    turned : (m,) values of every figure that varies, in the unit it was given in
    by_convention : (l,) True where the exposure duration follows from the wavelength

    Figures keep the conversion of the base: a diameter that is 1 % wider than given is 1 % wider in the
    engine's unit too.
    """
    count = len(next(iter(turned.values())))
    number = base.count
    take = np.tile(np.arange(number), count)
    columns = {n: getattr(base, n)[take] for n in Lines.__slots__ if n not in ("laser", "beams")}
    beam = {n: getattr(base.beams, n)[take] for n in Beams.__slots__}

    def of(line: int) -> slice:
        return slice(line, None, number)

    for knob, values in turned.items():
        if knob.line < 0:
            for line in range(number):
                columns["exposure_s"][of(line)] = values
        elif knob.figure in ("wavelength_nm", "pulse_s", "rate_hz", "subtense_mrad"):
            columns[knob.figure][of(knob.line)] = values
        elif knob.figure == "emitted":
            given = nominal[knob.line]
            columns["emitted"][of(knob.line)] *= values / given.emitted
    for line, given in enumerate(nominal):
        mine = {k.figure: v for k, v in turned.items() if k.line == line}
        if given.average_power_w is not None and {"average_power_w", "rate_hz"} & mine.keys():
            power = mine.get("average_power_w", given.average_power_w)
            rate = columns["rate_hz"][of(line)]
            columns["emitted"][of(line)] *= power / given.average_power_w * (base.rate_hz[line] / rate)
        if given.single_mode:
            _turn_mode_field(beam, of(line), given, mine, float(base.wavelength_nm[line]))
        elif mine.keys() & set(OF_BEAM):
            _turn_beam(beam, of(line), given, mine)
    conventional = np.flatnonzero(by_convention[take])
    if conventional.size and any(k.figure == "wavelength_nm" for k in turned):
        seconds, _ = rules.default_duration(columns["wavelength_nm"][conventional])
        columns["exposure_s"][conventional] = seconds
    return Lines(laser=np.repeat(np.arange(count), number), beams=Beams(**beam), **columns)


def _turn_beam(beam: dict[str, Floats], at: slice, given: Nominal, mine: Mapping[str, Floats]) -> None:
    """Scale the beam of one line, in place; d0^2 = d^2 - (divergence x waist)^2 where given at the exit."""
    waist = mine.get("waist_m", np.full(len(beam["waist_x_m"][at]), given.waist_m))
    for k, axis in enumerate("xy"):
        diameter = mine.get(f"diameter_{axis}", np.full(len(waist), given.diameters[k]))
        divergence = mine.get(f"divergence_{axis}", np.full(len(waist), given.divergences[k]))
        before, after = given.diameters[k], diameter
        if given.at_exit:
            before = float(np.sqrt(before**2 - (given.divergences[k] * given.waist_m) ** 2))
            after = np.sqrt(np.maximum(diameter**2 - (divergence * waist) ** 2, 0.0))
        beam[f"diameter_{axis}_m"][at] *= after / before
        if given.divergences[k] > 0.0:
            beam[f"divergence_{axis}_rad"][at] *= divergence / given.divergences[k]
        beam[f"waist_{axis}_m"][at] += waist - given.waist_m


def _turn_mode_field(
    beam: dict[str, Floats], at: slice, given: Nominal, mine: Mapping[str, Floats], wavelength_nm: float
) -> None:
    """Scale the beam of a single-mode fibre, in place: full divergence 4 lambda / (pi MFD)."""
    across = mine.get("mode_field", np.array([given.diameters[0]])) / given.diameters[0]
    longer = mine.get("wavelength_nm", np.array([wavelength_nm])) / wavelength_nm
    for axis in "xy":
        beam[f"diameter_{axis}_m"][at] *= across
        beam[f"divergence_{axis}_rad"][at] *= longer / across


def _chunks(count: int) -> Iterator[slice]:
    for start in range(0, count, CHUNK):
        yield slice(start, min(count, start + CHUNK))


def outcomes(
    base: Lines,
    behind: Lines,
    nominal: Sequence[Nominal],
    turned: Mapping[Knob, Floats],
    rules: CompiledRules,
    schemes: Mapping[str, CompiledScheme],
    by_convention: NDArray[np.bool_],
) -> Outcomes:
    """Judge the laser for every element of the turned figures, chunk by chunk. Arguments as `spread`.

    `base` is classified; `behind`, the same lines behind the bench, is judged by the limits (`base` itself
    without a bench). Figures of the beam must not turn where the bench changes it.
    """
    count = len(next(iter(turned.values())))
    found = np.empty((4, count))
    classes = {key: np.empty(count, dtype=np.intp) for key in schemes}
    with np.errstate(over="ignore", under="ignore"):
        for part in _chunks(count):
            some = {k: v[part] for k, v in turned.items()}
            lines = spread(base, nominal, some, rules, by_convention)
            judged = lines if behind is base else spread(behind, nominal, some, rules, by_convention)
            result = evaluate(judged, rules)
            found[:, part] = (
                result.eye.worst_ratio,
                result.eye.far_m,
                result.skin.worst_ratio,
                result.skin.far_m,
            )
            for key, scheme in schemes.items():
                classes[key][part] = classify(lines, scheme).number
    eye_ratio, eye_far, skin_ratio, skin_far = found
    return Outcomes(eye_ratio, eye_far, skin_ratio, skin_far, classes)
