"""Extinction of air from the meteorological visibility."""

from __future__ import annotations

import numpy as np
from numpy.typing import NDArray

__all__ = ["extinction_per_m"]

Floats = NDArray[np.float64]

#: ln(1 / 0.02): the contrast threshold behind the visibility (Koschmieder, from memory).
CONTRAST = 3.912
#: Wavelength at which the visibility is stated [nm].
REFERENCE_NM = 550.0


def extinction_per_m(visibility_m: Floats, wavelength_nm: Floats) -> Floats:
    """Extinction coefficient [1/m]: 3.912 / V x (lambda / 550 nm)^-q.

    q = 1.6 above 50 km, 1.3 from 6 to 50 km, 0.585 (V / km)^(1/3) below 6 km. Beyond 2 um the
    formula is not supported by measurements; the value at 2 um is then kept smaller by the formula
    itself, so that the loss is rather underrated (the safe side).

    Parameters
    ----------
    visibility_m : (n,) visibility [m], infinite for clear air; wavelength_nm : (n,) [nm]

    Reference: Kruse, McGlauchlin and McQuistan, Elements of Infrared Technology (1962); Koschmieder
    (1924); both from memory.
    """
    km = visibility_m / 1e3
    exponent = np.where(km > 50.0, 1.6, np.where(km >= 6.0, 1.3, 0.585 * np.cbrt(np.minimum(km, 6.0))))
    # Below 550 nm a larger exponent would claim more loss; none is claimed beyond that at 550 nm.
    ratio = np.maximum(wavelength_nm, REFERENCE_NM) / REFERENCE_NM
    return CONTRAST / visibility_m * ratio**-exponent
