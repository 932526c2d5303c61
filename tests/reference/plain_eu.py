"""Directive 2006/25/EC, Annex II: rows of Tables 2.2, 2.3 and 2.4.

A printed row includes both of its ends, so on a shared boundary two rows are returned and the
stricter one governs (note a).  The whole-nanometre ultraviolet steps, 315 nm and T2 are not
shared: there the row that begins holds.  Wavelengths in nm, times in s, angles in mrad; every
value is a radiant exposure in J/m2 (an irradiance row is multiplied by the duration).
Table 2.3 is from memory and cross-checked.
"""

from .plain_factors import EU, c_a, c_b, c_c, c_e, photochemical_size_factor, subtense, t_2


def _within(value, lower, upper):
    """Whether a value lies in a printed band, both ends included."""
    return lower <= value <= upper


def _step(wavelength_nm):
    """(break time in s, H in J/m2) of the row of a whole nanometre, 303-315 nm.

    Directive 2006/25/EC Annex II Table 2.2.
    """
    if wavelength_nm < 304:
        return 2.6e-9, 40.0
    if wavelength_nm < 305:
        return 1.3e-8, 60.0
    if wavelength_nm < 306:
        return 1.0e-7, 100.0
    if wavelength_nm < 307:
        return 6.7e-7, 160.0
    if wavelength_nm < 308:
        return 4.0e-6, 250.0
    if wavelength_nm < 309:
        return 2.6e-5, 400.0
    if wavelength_nm < 310:
        return 1.6e-4, 630.0
    if wavelength_nm < 311:
        return 1.0e-3, 1.0e3
    if wavelength_nm < 312:
        return 6.7e-3, 1.6e3
    if wavelength_nm < 313:
        return 4.0e-2, 2.5e3
    if wavelength_nm < 314:
        return 2.6e-1, 4.0e3
    return 1.6, 6.3e3


def _ultraviolet(wavelength_nm, t):
    """(tissue, effect, H in J/m2) rows, 180-400 nm.

    Directive 2006/25/EC Annex II Tables 2.2 and 2.3.
    """
    if wavelength_nm < 303:
        tissue = "cornea"
    elif wavelength_nm < 315:
        tissue = "cornea/lens"
    else:
        tissue = "lens"

    rows = []
    if _within(t, 1e-13, 1e-9):
        rows.append((tissue, "thermal", 3e10 * t))
    if wavelength_nm < 303:
        if _within(t, 1e-9, 10):
            rows.append((tissue, "photochemical", 30.0))
        if _within(t, 10, 3e4):
            rows.append((tissue, "photochemical", 30.0))
    elif wavelength_nm < 315:
        break_s, h = _step(wavelength_nm)
        if _within(t, 1e-9, break_s):
            rows.append((tissue, "thermal", 5.6e3 * t**0.25))
        if _within(t, break_s, 10):
            rows.append((tissue, "photochemical", h))
        if _within(t, 10, 3e4):
            rows.append((tissue, "photochemical", h))
    else:
        if _within(t, 1e-9, 10):
            rows.append((tissue, "thermal", 5.6e3 * t**0.25))
        if _within(t, 10, 3e4):
            rows.append((tissue, "photochemical", 1e4))
    return rows


def _retina_below_10_s(wavelength_nm, t, subtense_mrad):
    """Thermal H in J/m2 of each retinal row, 400-1400 nm, t up to 10 s.

    Directive 2006/25/EC Annex II Table 2.2.
    """
    size = c_e(EU, subtense_mrad, t)
    values = []
    if _within(wavelength_nm, 400, 700):
        if _within(t, 1e-13, 1e-11):
            values.append(1.5e-4 * size)
        if _within(t, 1e-11, 1e-9):
            values.append(2.7e4 * t**0.75 * size)
        if _within(t, 1e-9, 1.8e-5):
            values.append(5e-3 * size)
        if _within(t, 1.8e-5, 10):
            values.append(18.0 * t**0.75 * size)
    if _within(wavelength_nm, 700, 1050):
        factors = c_a(wavelength_nm) * size
        if _within(t, 1e-13, 1e-11):
            values.append(1.5e-4 * factors)
        if _within(t, 1e-11, 1e-9):
            values.append(2.7e4 * t**0.75 * factors)
        if _within(t, 1e-9, 1.8e-5):
            values.append(5e-3 * factors)
        if _within(t, 1.8e-5, 10):
            values.append(18.0 * t**0.75 * factors)
    if _within(wavelength_nm, 1050, 1400):
        factors = c_c(EU, wavelength_nm) * size
        if _within(t, 1e-13, 1e-11):
            values.append(1.5e-3 * factors)
        if _within(t, 1e-11, 1e-9):
            values.append(2.7e5 * t**0.75 * factors)
        if _within(t, 1e-9, 5e-5):
            values.append(5e-2 * factors)
        if _within(t, 5e-5, 10):
            values.append(90.0 * t**0.75 * factors)
    return values


def _retina_from_10_s(wavelength_nm, t, subtense_mrad):
    """Thermal H in J/m2 of each retinal row, 400-1400 nm, t from 10 s.

    Directive 2006/25/EC Annex II Table 2.3 (from memory).
    """
    values = []
    if not _within(t, 10, 3e4):
        return values
    alpha = subtense(subtense_mrad)
    size = c_e(EU, alpha, t)
    break_s = t_2(alpha)
    if _within(wavelength_nm, 400, 700):
        if alpha <= 1.5:
            values.append(10.0 * t)
        elif t < break_s:
            values.append(18.0 * t**0.75 * size)
        else:
            values.append(18.0 * break_s**-0.25 * size * t)
    if _within(wavelength_nm, 700, 1400):
        both = c_a(wavelength_nm) * c_c(EU, wavelength_nm)
        if alpha <= 1.5:
            values.append(10.0 * both * t)
        elif t < break_s:
            values.append(18.0 * t**0.75 * both * size)
        else:
            values.append(min(18.0 * break_s**-0.25 * both * size, 1000.0) * t)
    return values


def _retina_photochemical(wavelength_nm, t, subtense_mrad):
    """Photochemical H in J/m2 of each retinal row, 400-600 nm, t from 10 s.

    Directive 2006/25/EC Annex II Table 2.3 (from memory).
    """
    values = []
    if not _within(wavelength_nm, 400, 600):
        return values
    factors = c_b(wavelength_nm) * photochemical_size_factor(subtense_mrad, t)
    if _within(t, 10, 100):
        values.append(100.0 * factors)
    if _within(t, 100, 1e4):
        values.append(1.0 * factors * t)
    if _within(t, 1e4, 3e4):
        values.append(1.0 * factors * t)
    return values


def _infrared(wavelength_nm, t):
    """Thermal H in J/m2 of each row, 1400-1e6 nm.

    Directive 2006/25/EC Annex II Tables 2.2 and 2.3.
    """
    values = []
    if _within(wavelength_nm, 1400, 1500):
        if _within(t, 1e-13, 1e-9):
            values.append(1e12 * t)
        if _within(t, 1e-9, 1e-3):
            values.append(1e3)
        if _within(t, 1e-3, 10):
            values.append(5.6e3 * t**0.25)
    if _within(wavelength_nm, 1500, 1800):
        if _within(t, 1e-13, 1e-9):
            values.append(1e13 * t)
        if _within(t, 1e-9, 10):
            values.append(1e4)
    if _within(wavelength_nm, 1800, 2600):
        if _within(t, 1e-13, 1e-9):
            values.append(1e12 * t)
        if _within(t, 1e-9, 1e-3):
            values.append(1e3)
        if _within(t, 1e-3, 10):
            values.append(5.6e3 * t**0.25)
    if _within(wavelength_nm, 2600, 1e6):
        if _within(t, 1e-13, 1e-9):
            values.append(1e11 * t)
        if _within(t, 1e-9, 1e-7):
            values.append(100.0)
        if _within(t, 1e-7, 10):
            values.append(5.6e3 * t**0.25)
    if _within(wavelength_nm, 1400, 1e6) and _within(t, 10, 3e4):
        values.append(1000.0 * t)
    return values


def eu_eye(wavelength_nm, t, subtense_mrad):
    """Eye rows (tissue, effect, H in J/m2).

    Directive 2006/25/EC Annex II Tables 2.2 (t < 10 s) and 2.3 (t >= 10 s).
    """
    rows = []
    if wavelength_nm <= 400:
        rows += _ultraviolet(wavelength_nm, t)
    for h in _retina_below_10_s(wavelength_nm, t, subtense_mrad):
        rows.append(("retina", "thermal", h))
    for h in _retina_from_10_s(wavelength_nm, t, subtense_mrad):
        rows.append(("retina", "thermal", h))
    for h in _retina_photochemical(wavelength_nm, t, subtense_mrad):
        rows.append(("retina", "photochemical", h))
    for h in _infrared(wavelength_nm, t):
        rows.append(("cornea", "thermal", h))
    return rows


def eu_skin(wavelength_nm, t):
    """Skin rows (tissue, effect, H in J/m2).  Directive 2006/25/EC Annex II Table 2.4."""
    rows = []
    if wavelength_nm <= 400:
        for _, effect, h in _ultraviolet(wavelength_nm, t):
            rows.append(("skin", effect, h))
    if _within(t, 1e-13, 1e-9):
        if _within(wavelength_nm, 400, 700):
            rows.append(("skin", "thermal", 2e11 * t))
        if _within(wavelength_nm, 700, 1400):
            rows.append(("skin", "thermal", 2e11 * c_a(wavelength_nm) * t))
    if _within(wavelength_nm, 400, 1400):
        factor = c_a(wavelength_nm)
        if _within(t, 1e-9, 1e-7):
            rows.append(("skin", "thermal", 200.0 * factor))
        if _within(t, 1e-7, 10):
            rows.append(("skin", "thermal", 1.1e4 * factor * t**0.25))
        if _within(t, 10, 3e4):
            rows.append(("skin", "thermal", 2e3 * factor * t))
    for h in _infrared(wavelength_nm, t):
        rows.append(("skin", "thermal", h))
    return rows
