"""Rows that ICNIRP 2013, IEC 60825-1:2014 and ANSI Z136.1-2014 have in common.

Every function answers for one wavelength (nm) and one duration (s).  A radiant exposure is in
J/m2; a row printed as an irradiance (W/m2) is multiplied by the duration.  Bands hold from their
lower end up to, but not including, their upper end.  All numbers are from memory and
cross-checked, as the result says too.
"""

from .plain_factors import (
    ANSI,
    IEC,
    c_a,
    c_b,
    c_c,
    c_e,
    photochemical_size_factor,
    subtense,
    t_2,
)


def ultraviolet_step(wavelength_nm):
    """H in J/m2 of the photochemical ultraviolet rows, 180-315 nm, any duration from 1 ns.

    Each whole-nanometre row holds up to the next one.  ICNIRP 2013 and ANSI Z136.1-2014
    Table 5a, from memory; the same values are printed in Directive 2006/25/EC Annex II Table 2.2.
    """
    if wavelength_nm < 303:
        return 30.0
    if wavelength_nm < 304:
        return 40.0
    if wavelength_nm < 305:
        return 60.0
    if wavelength_nm < 306:
        return 100.0
    if wavelength_nm < 307:
        return 160.0
    if wavelength_nm < 308:
        return 250.0
    if wavelength_nm < 309:
        return 400.0
    if wavelength_nm < 310:
        return 630.0
    if wavelength_nm < 311:
        return 1.0e3
    if wavelength_nm < 312:
        return 1.6e3
    if wavelength_nm < 313:
        return 2.5e3
    if wavelength_nm < 314:
        return 4.0e3
    return 6.3e3


def ultraviolet_tissue(rules, wavelength_nm):
    """Eye tissue of an ultraviolet row, 180-400 nm: cornea, cornea/lens or lens (all sets)."""
    cornea_ends_nm = 302.5 if rules == IEC else 303
    if wavelength_nm < cornea_ends_nm:
        return "cornea"
    if wavelength_nm < 315:
        return "cornea/lens"
    return "lens"


def ultraviolet_by_steps(wavelength_nm, t):
    """(effect, H in J/m2) rows, 180-400 nm, of the sets with whole-nanometre steps.

    303-315 nm carries the photochemical row and, below 10 s, the thermal row as well.
    ICNIRP 2013 and ANSI Z136.1-2014 Table 5a, from memory.
    """
    if t < 1e-9:
        return [("thermal", 3e10 * t)]
    if wavelength_nm < 303:
        return [("photochemical", 30.0)]
    if wavelength_nm < 315:
        rows = [("photochemical", ultraviolet_step(wavelength_nm))]
        if t < 10:
            rows.append(("thermal", 5.6e3 * t**0.25))
        return rows
    if t < 10:
        return [("thermal", 5.6e3 * t**0.25)]
    return [("photochemical", 1e4)]


def ultraviolet_iec(wavelength_nm, t):
    """(effect, H in J/m2) rows, 180-400 nm.  IEC 60825-1:2014 Tables A.1/A.2, from memory."""
    c_1 = 5.6e3 * t**0.25
    if t < 1e-9:
        return [("thermal", 3e10 * t)]
    if wavelength_nm < 302.5:
        return [("photochemical", 30.0)]
    if wavelength_nm < 315:
        t_1 = 10 ** (0.8 * (wavelength_nm - 295)) * 1e-15
        c_2 = 10 ** (0.2 * (wavelength_nm - 295))
        if t < t_1:
            return [("thermal", c_1)]
        return [("photochemical", c_2)]
    if t < 10:
        return [("thermal", c_1)]
    if t < 1e3:
        return [("photochemical", 1e4)]
    return [("photochemical", 10.0 * t)]


def corneal_infrared(wavelength_nm, t):
    """H in J/m2 of the one thermal row that applies, 1400-1e6 nm.

    ICNIRP 2013, IEC 60825-1:2014 Tables A.1/A.2 and ANSI Z136.1-2014 Tables 5e/5f, from memory
    (ANSI 1400-1500 nm, pulsed: values of the 2007 edition).
    """
    if t >= 10:
        return 1000.0 * t
    if wavelength_nm < 1500:
        if t < 1e-9:
            return 1e12 * t
        if t < 1e-3:
            return 1e3
        return 5.6e3 * t**0.25
    if wavelength_nm < 1800:
        if t < 1e-9:
            return 1e13 * t
        return 1e4
    if wavelength_nm < 2600:
        if t < 1e-9:
            return 1e12 * t
        if t < 1e-3:
            return 1e3
        return 5.6e3 * t**0.25
    if t < 1e-9:
        return 1e11 * t
    if t < 1e-7:
        return 100.0
    return 5.6e3 * t**0.25


def skin_400_to_1400(wavelength_nm, t):
    """H in J/m2 of the skin row, 400-1400 nm, C_A included.

    ICNIRP 2013 and IEC 60825-1:2014 Table A.5, from memory; ANSI Z136.1-2014 Table 7.
    """
    factor = c_a(wavelength_nm)
    if t < 1e-9:
        return 2e11 * factor * t
    if t < 1e-7:
        return 200.0 * factor
    if t < 10:
        return 1.1e4 * factor * t**0.25
    return 2e3 * factor * t


def retina_thermal(rules, wavelength_nm, t, subtense_mrad):
    """H in J/m2 of the retinal thermal row, 400-1400 nm, all factors included.

    ICNIRP 2013, IEC 60825-1:2014 Tables A.1/A.2 and ANSI Z136.1-2014 Tables 5b-5d, from memory.
    """
    alpha = subtense(subtense_mrad)
    size = c_e(rules, alpha, t)
    break_s = t_2(alpha)

    if t < 10:
        if wavelength_nm < 700:
            if t < 1e-11:
                return 1e-3 * size
            if t < 5e-6:
                return 2e-3 * size
            return 18.0 * t**0.75 * size
        if wavelength_nm < 1050:
            if t < 1e-11:
                return 1e-3 * c_a(wavelength_nm) * size
            if t < 5e-6:
                return 2e-3 * c_a(wavelength_nm) * size
            return 18.0 * t**0.75 * c_a(wavelength_nm) * size
        if t < 1e-11:
            return 1e-2 * c_c(rules, wavelength_nm) * size
        if t < 13e-6:
            return 2e-2 * c_c(rules, wavelength_nm) * size
        return 90.0 * t**0.75 * c_c(rules, wavelength_nm) * size

    if wavelength_nm < 700:
        if alpha <= 1.5:
            return 10.0 * t
        if t < break_s:
            return 18.0 * t**0.75 * size
        return 18.0 * break_s**-0.25 * size * t

    if rules == ANSI and wavelength_nm < 1050:
        if alpha <= 1.5:
            return 10.0 * c_a(wavelength_nm) * t
        if t < break_s:
            return 18.0 * t**0.75 * c_a(wavelength_nm) * size
        return 18.0 * break_s**-0.25 * c_a(wavelength_nm) * size * t

    if rules == ANSI:
        if alpha <= 1.5:
            return 50.0 * c_c(rules, wavelength_nm) * t
        if t < break_s:
            return 90.0 * t**0.75 * c_c(rules, wavelength_nm) * size
        return 90.0 * break_s**-0.25 * c_c(rules, wavelength_nm) * size * t

    both = c_a(wavelength_nm) * c_c(rules, wavelength_nm)
    if alpha <= 1.5:
        return 10.0 * both * t
    if t < break_s:
        return 18.0 * t**0.75 * both * size
    return 18.0 * break_s**-0.25 * both * size * t


def retina_photochemical(wavelength_nm, t, subtense_mrad):
    """H in J/m2 of the retinal photochemical row, 400-600 nm, t >= 10 s, all factors included.

    ICNIRP 2013, IEC 60825-1:2014 Tables A.1/A.2 and ANSI Z136.1-2014 Tables 5b/5c, from memory.
    """
    factors = c_b(wavelength_nm) * photochemical_size_factor(subtense_mrad, t)
    if t < 100:
        return 100.0 * factors
    return 1.0 * factors * t
