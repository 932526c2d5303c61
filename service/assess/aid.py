"""Aided viewing: binoculars, telescopes and loupes."""

from __future__ import annotations

from dataclasses import dataclass, replace

import numpy as np
from numpy.typing import NDArray

from service.assess.criteria import Criteria
from service.assess.lines import Lines
from service.rules.grid import SMALL_SOURCE_MRAD

__all__ = ["Aid"]

Floats = NDArray[np.float64]

#: Wavelengths that optical aids pass [nm] (IEC 60825-1 measurement conditions, from memory).
FROM_NM, TO_NM = 302.5, 4000.0


@dataclass(frozen=True, slots=True)
class Aid:
    """Optics in front of the eye: objective diameter [m], angular magnification, transmittance.

    They collect what passes the objective, as far as the exit pupil fits the limiting aperture:
    the collecting diameter is min(objective, M x aperture). An extended source looks M times wider.

    Reference: ANSI Z136.1 appendix B and IEC TR 60825-14 (gain of optical aids), from memory.
    """

    objective_m: float
    magnification: float
    transmittance: float

    def passes(self, wavelength_nm: Floats) -> NDArray[np.bool_]:
        """Whether the aid passes each wavelength [nm]."""
        inside: NDArray[np.bool_] = (wavelength_nm >= FROM_NM) & (wavelength_nm < TO_NM)
        return inside

    def seen_through(self, lines: Lines) -> Lines:
        """The lines with the apparent source enlarged where the aid passes them.

        A small source stays small: 1.5 mrad stands for anything up to it, a point included.
        """
        extended = self.passes(lines.wavelength_nm) & (lines.subtense_mrad > SMALL_SOURCE_MRAD)
        larger = np.where(extended, lines.subtense_mrad * self.magnification, lines.subtense_mrad)
        return replace(lines, subtense_mrad=larger)

    def collect(self, criteria: Criteria, lines: Lines) -> None:
        """Widen the apertures of the eye's criteria to the collecting diameter, in place.

        Limits stay averaged over the limiting aperture. Never less than without the aid, except for
        the transmittance.
        """
        inside = self.passes(lines.wavelength_nm)[criteria.line]
        collecting = np.minimum(self.objective_m, self.magnification * criteria.aperture_m)
        criteria.aperture_m = np.where(
            inside, np.maximum(collecting, criteria.aperture_m), criteria.aperture_m
        )
        criteria.strength = np.where(inside, criteria.strength * self.transmittance, criteria.strength)
