"""Requests to arrays: units are converted here, once."""

from __future__ import annotations

from collections.abc import Sequence
from dataclasses import replace

import numpy as np
from numpy.typing import NDArray

from service.assess.lines import MODES, Lines
from service.contract.bench import LEAST, apply
from service.contract.request import Cw, EvaluationRequest, Train
from service.optics.air import extinction_per_m
from service.optics.beams import Beams
from service.rules.compiled import CompiledRules

__all__ = ["behind_bench", "lines_of"]


def lines_of(requests: Sequence[EvaluationRequest], rules: CompiledRules) -> tuple[Lines, NDArray[np.intp]]:
    """The lines of all requests as they leave the laser, and the duration row of each (-1: T was chosen).

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
            emission = line.emission
            if isinstance(emission, Cw):
                emitted, pulse, rate = emission.power_w, 1.0, 1.0
            elif isinstance(emission, Train):
                emitted, pulse, rate = emission.pulse_energy_j, emission.pulse_s, emission.rate_hz
            else:
                emitted, pulse, rate = emission.energy_j, emission.pulse_s, 1.0
            if line.output_mirror_reflectance is not None:
                # Open resonator: the one-way circulating power is the output over what the mirror lets out.
                emitted /= 1.0 - line.output_mirror_reflectance
            laser.append(number)
            mode.append(MODES.index(emission.mode))
            flat, *moments = line.beam.moments(line.wavelength_nm)
            tophat.append(flat)
            rows.append((line.wavelength_nm, emitted, pulse, rate, chosen, line.subtense_mrad, *moments))
    columns = np.array(rows).T.copy()
    wavelength, emitted_, pulse_, rate_, exposure, subtense, dx, dy, px, py, waist = columns
    duration_row = np.full(len(rows), -1, dtype=np.intp)
    conventional = np.flatnonzero(np.isnan(exposure))
    if conventional.size:
        seconds, row = rules.default_duration(wavelength[conventional])
        exposure[conventional], duration_row[conventional] = seconds, row
    beams = Beams.with_waist(np.array(tophat), dx, dy, px, py, waist)
    lines = Lines(
        np.array(laser), wavelength, np.array(mode), emitted_, pulse_, rate_, exposure, subtense, beams
    )
    return lines, duration_row


def behind_bench(requests: Sequence[EvaluationRequest], lines: Lines) -> Lines:
    """The lines behind the last element of each request's bench, in its air."""
    if not any(r.bench or r.viewing.visibility_km for r in requests):
        return lines
    beams, emitted = lines.beams.take(np.arange(lines.count)), lines.emitted.copy()
    for number, request in enumerate(requests):
        index = np.flatnonzero(lines.laser == number)
        if request.bench:
            behind, left = apply(request.bench, beams.take(index), lines.wavelength_nm[index])
            emitted[index] = np.maximum(emitted[index] * left, LEAST)
            for name in Beams.__slots__:
                getattr(beams, name)[index] = getattr(behind, name)
        if request.viewing.visibility_km is not None:
            visibility = np.full(len(index), request.viewing.visibility_km * 1e3)
            beams.extinction_per_m[index] = extinction_per_m(visibility, lines.wavelength_nm[index])
    return replace(lines, emitted=emitted, beams=beams)
