"""Requests to arrays: units are converted here, once."""

from __future__ import annotations

from collections.abc import Sequence

import numpy as np
from numpy.typing import NDArray

from service.assess.lines import MODES, Lines
from service.contract.request import Cw, EvaluationRequest, Train
from service.optics.beams import SQRT2, Beams
from service.rules.compiled import CompiledRules

__all__ = ["conventional_durations", "lines_of"]


def lines_of(requests: Sequence[EvaluationRequest], rules: CompiledRules) -> tuple[Lines, NDArray[np.intp]]:
    """The lines of all requests as arrays, and the duration row of each (-1 where T was chosen).

    Millimetres and milliradians become metres and radians; 1/e2 diameters and divergences of
    Gaussian beams become 1/e ones; an average power becomes the energy of a pulse.
    """
    laser: list[int] = []
    mode: list[int] = []
    tophat: list[bool] = []
    rows: list[tuple[float, ...]] = []
    for number, request in enumerate(requests):
        chosen = np.nan if request.exposure_s is None else request.exposure_s
        for line in request.lines:
            emission, beam = line.emission, line.beam
            flat = beam.profile == "tophat"
            to_1e = 1e-3 if flat or beam.level == "1/e" else 1e-3 / SQRT2
            if isinstance(emission, Cw):
                emitted, pulse, rate = emission.power_w, 1.0, 1.0
            elif isinstance(emission, Train):
                emitted, pulse, rate = emission.pulse_energy_j, emission.pulse_s, emission.rate_hz
            else:
                emitted, pulse, rate = emission.energy_j, emission.pulse_s, 1.0
            laser.append(number)
            mode.append(MODES.index(emission.mode))
            tophat.append(flat)
            (dx, dy), (px, py) = beam.waist_diameters_mm(), beam.divergence_mrad
            rows.append(
                (
                    *(line.wavelength_nm, emitted, pulse, rate, chosen, line.subtense_mrad),
                    *(dx * to_1e, dy * to_1e, px * to_1e, py * to_1e, beam.waist_m),
                )
            )
    columns = np.array(rows).T.copy()
    wavelength, emitted_, pulse_, rate_, exposure, subtense, *beam_columns = columns
    duration_row = conventional_durations(wavelength, exposure, rules)
    beams = Beams(np.array(tophat), *beam_columns)
    lines = Lines(
        np.array(laser), wavelength, np.array(mode), emitted_, pulse_, rate_, exposure, subtense, beams
    )
    return lines, duration_row


def conventional_durations(
    wavelength_nm: NDArray[np.float64], exposure_s: NDArray[np.float64], rules: CompiledRules
) -> NDArray[np.intp]:
    """Put the rule set's conventional duration, in place, where the exposure duration [s] is NaN.

    Returns the duration row of each line, -1 where its duration was chosen.
    """
    duration_row = np.full(len(exposure_s), -1, dtype=np.intp)
    conventional = np.isnan(exposure_s).nonzero()[0]
    if conventional.size:
        seconds, row = rules.default_duration(wavelength_nm[conventional])
        exposure_s[conventional], duration_row[conventional] = seconds, row
    return duration_row
