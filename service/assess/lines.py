"""Emission lines of one or many lasers as arrays."""

from __future__ import annotations

from dataclasses import dataclass, fields

import numpy as np
from numpy.typing import NDArray

from service.optics.beams import Beams

__all__ = ["CW", "MODES", "PULSE", "TRAIN", "Lines"]

Floats = NDArray[np.float64]
Ints = NDArray[np.intp]

MODES = ("cw", "pulse", "train")
CW, PULSE, TRAIN = range(3)
#: Fields of `Lines` that are not plain columns.
APART = ("laser", "beams")


@dataclass(slots=True)
class Lines:
    """Structure of arrays, one element per emission line; the lines of a laser stand together.

    `laser` numbers the lasers from 0 without a gap, in order. `mode` is CW, PULSE or TRAIN.
    `emitted` is the power [W] of a CW line and the energy per pulse [J] of the others. `pulse_s`
    and `rate_hz` are 1 where they do not apply. `exposure_s` is the exposure duration T [s],
    `subtense_mrad` the angular subtense of the apparent source.
    """

    laser: Ints
    wavelength_nm: Floats
    mode: Ints
    emitted: Floats
    pulse_s: Floats
    rate_hz: Floats
    exposure_s: Floats
    subtense_mrad: Floats
    beams: Beams

    def of_lasers(self, which: Ints) -> Lines:
        """The lines of some lasers, which are numbered anew; `which` ascends."""
        number = np.full(self.lasers, -1, dtype=np.intp)
        number[which] = np.arange(len(which))
        index = np.flatnonzero(number[self.laser] >= 0)
        if len(index) == self.count:
            return self
        columns = {f.name: getattr(self, f.name)[index] for f in fields(self) if f.name not in APART}
        return Lines(laser=number[self.laser[index]], beams=self.beams.take(index), **columns)

    def take(self, index: Ints, exposure_s: Floats) -> Lines:
        """The lines at `index` with exposure durations [s] of their own, each a laser of its own."""
        columns = {f.name: getattr(self, f.name)[index] for f in fields(self) if f.name not in APART}
        columns["exposure_s"] = exposure_s
        return Lines(laser=np.arange(len(index)), beams=self.beams.take(index), **columns)

    @property
    def count(self) -> int:
        """Number of lines."""
        return len(self.laser)

    @property
    def average_power_w(self) -> Floats:
        """Average power [W] of each line; 0 for a single pulse."""
        average = np.where(self.mode == TRAIN, self.emitted * self.rate_hz, 0.0)
        return np.where(self.mode == CW, self.emitted, average)

    @property
    def lasers(self) -> int:
        """Number of lasers."""
        return int(self.laser[-1]) + 1 if len(self.laser) else 0
