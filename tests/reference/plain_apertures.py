"""Limiting apertures and conventional exposure durations, one value at a time."""

from .plain_factors import ANSI, EU, IEC


def _graded_mm(break_s, t):
    """1 mm, 1.5 t^0.375 mm or 3.5 mm at a duration t in s, the first break at break_s."""
    if t < break_s:
        return 1.0
    if t < 10:
        return 1.5 * t**0.375
    return 3.5


def _skin_mm(rules, wavelength_nm):
    """Skin aperture in mm.

    Directive 2006/25/EC Annex II Table 2.4 (3.5 mm everywhere); ICNIRP 2013,
    IEC 60825-1:2014 Table A.6 and ANSI Z136.1-2014 Table 8a, from memory.
    """
    if rules != EU and wavelength_nm >= 1e5:
        return 11.0
    return 3.5


def _eye_mm(rules, wavelength_nm, t, tissue):
    """Eye aperture in mm for a row of the given tissue at a duration t in s.

    The tissue decides between the retinal and the corneal aperture where rows of both meet at
    400 or 1400 nm.  Directive 2006/25/EC Annex II Tables 2.2 and 2.3; ICNIRP 2013,
    IEC 60825-1:2014 Table A.6 and ANSI Z136.1-2014 Table 8a, from memory.
    """
    if tissue == "retina":
        return 7.0
    if tissue == "anterior" and rules != ANSI:
        return _skin_mm(rules, wavelength_nm)
    if wavelength_nm >= 1e5:
        return 11.0
    if rules == IEC and wavelength_nm < 400:
        return 1.0
    if rules == EU or rules == ANSI:
        return _graded_mm(0.3, t)
    return _graded_mm(0.35, t)


def aperture_m(rules, target, wavelength_nm, duration_s, tissue):
    """Diameter of the limiting aperture in m.

    target: "eye" or "skin"; wavelength in nm; duration in s; tissue as the limit row names it.
    """
    if target == "skin":
        return _skin_mm(rules, wavelength_nm) * 1e-3
    return _eye_mm(rules, wavelength_nm, duration_s, tissue) * 1e-3


def default_duration(rules, wavelength_nm):
    """Conventional duration of an unintended exposure in s, at a wavelength in nm.

    3e4 s below 400 nm, 0.25 s at 400-700 nm, 100 s above (TROS Laserstrahlung part 2, 4.1);
    ANSI Z136.1-2014, from memory: 10 s above 700 nm.
    """
    if wavelength_nm < 400:
        return 3e4
    if wavelength_nm < 700:
        return 0.25
    if rules == ANSI:
        return 10.0
    return 100.0
