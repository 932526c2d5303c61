"""Correction factors and break times, one value at a time.

Wavelengths are in nm, times in s, angles in mrad.  Bands hold from their lower end up to, but
not including, their upper end; the last band includes its end.
"""

import math

ICNIRP = "icnirp-2013"
EU = "eu-2006-25"
IEC = "iec-60825-1-2014"
ANSI = "ansi-z136-1-2014"
RULES = (ICNIRP, EU, IEC, ANSI)

ALPHA_MIN_MRAD = 1.5


def subtense(subtense_mrad):
    """Angular subtense alpha in mrad; a source below 1.5 mrad counts as 1.5 mrad (all sets)."""
    if subtense_mrad < ALPHA_MIN_MRAD:
        return ALPHA_MIN_MRAD
    return subtense_mrad


def c_a(wavelength_nm):
    """C_A (IEC: C4), 400-1400 nm, unit 1.

    Directive 2006/25/EC Annex II Table 2.5; ICNIRP 2013, IEC 60825-1:2014 Table 9 and
    ANSI Z136.1-2014 Table 6, from memory.
    """
    if wavelength_nm < 700:
        return 1.0
    if wavelength_nm < 1050:
        return 10 ** (0.002 * (wavelength_nm - 700))
    return 5.0


def c_b(wavelength_nm):
    """C_B (IEC: C3), 400-600 nm, unit 1.

    Directive 2006/25/EC Annex II Table 2.5; ICNIRP 2013, IEC 60825-1:2014 Table 9 and
    ANSI Z136.1-2014 Table 6, from memory.
    """
    if wavelength_nm < 450:
        return 1.0
    return 10 ** (0.02 * (wavelength_nm - 450))


def c_c(rules, wavelength_nm):
    """C_C (IEC: C7), 700-1400 nm, unit 1.

    Directive 2006/25/EC Annex II Table 2.5 (8.0 from 1200 nm); ICNIRP 2013, IEC 60825-1:2014
    Table 9 and ANSI Z136.1-2014 Table 6, from memory (8 + 10^(0.04(lambda-1250))).
    """
    if wavelength_nm < 1150:
        return 1.0
    if wavelength_nm < 1200:
        return 10 ** (0.018 * (wavelength_nm - 1150))
    if rules == EU:
        return 8.0
    return 8.0 + 10 ** (0.04 * (wavelength_nm - 1250))


def alpha_max(rules, duration_s):
    """alpha_max in mrad at a duration in s.

    Directive 2006/25/EC Annex II Table 2.5: 100 mrad at all times.  ICNIRP 2013,
    IEC 60825-1:2014 4.3 c) and ANSI Z136.1-2014 Table 6, from memory: 5 / 200 t^0.5 / 100 mrad.
    """
    if rules == EU:
        return 100.0
    if duration_s < 625e-6:
        return 5.0
    if duration_s < 0.25:
        return 200.0 * math.sqrt(duration_s)
    return 100.0


def c_e(rules, subtense_mrad, duration_s):
    """C_E (IEC: C6), unit 1, for the exposure from the whole source.

    Directive 2006/25/EC Annex II Table 2.5; ICNIRP 2013 and ANSI Z136.1-2014 Table 6, from
    memory.  IEC 60825-1:2014 Table 9 prints alpha_max/alpha_min for a field limited to
    alpha_max; the whole-source form used here is the same limit for a uniform source.
    """
    alpha = subtense(subtense_mrad)
    largest = alpha_max(rules, duration_s)
    if alpha <= ALPHA_MIN_MRAD:
        return 1.0
    if alpha <= largest:
        return alpha / ALPHA_MIN_MRAD
    return alpha**2 / (ALPHA_MIN_MRAD * largest)


def t_2(subtense_mrad):
    """T2 in s: 10 s at 1.5 mrad rising to 100 s at 100 mrad.

    Directive 2006/25/EC Annex II Table 2.5; ICNIRP 2013, IEC 60825-1:2014 Table 9 and
    ANSI Z136.1-2014 Table 6, from memory.
    """
    alpha = subtense(subtense_mrad)
    if alpha <= 1.5:
        return 10.0
    if alpha <= 100:
        return 10.0 * 10 ** ((alpha - 1.5) / 98.5)
    return 100.0


def gamma(duration_s):
    """Photochemical acceptance angle gamma in mrad at a duration in s.

    Directive 2006/25/EC Annex II Table 2.5; ICNIRP 2013, IEC 60825-1:2014 Table A.2 and
    ANSI Z136.1-2014 Table 5b/5c, from memory.
    """
    if duration_s < 100:
        return 11.0
    if duration_s < 1e4:
        return 1.1 * math.sqrt(duration_s)
    return 110.0


def photochemical_size_factor(subtense_mrad, duration_s):
    """(alpha/gamma)^2 for a source wider than gamma, otherwise 1; unit 1 (all sets)."""
    alpha = subtense(subtense_mrad)
    cone = gamma(duration_s)
    if alpha > cone:
        return (alpha / cone) ** 2
    return 1.0


def t_i(rules, wavelength_nm):
    """T_i (T_min, t_min) in s within which pulses count as one, or None where there is none.

    Directive 2006/25/EC Annex II Table 2.6; ICNIRP 2013, IEC 60825-1:2014 Table 2 and
    ANSI Z136.1-2014 Table 6, from memory.
    """
    if wavelength_nm < 315:
        return None
    if wavelength_nm < 400:
        if rules == EU:
            return 1e-9
        return None
    if wavelength_nm < 1050:
        if rules == EU:
            return 18e-6
        return 5e-6
    if wavelength_nm < 1400:
        if rules == EU:
            return 50e-6
        return 13e-6
    if wavelength_nm < 1500:
        return 1e-3
    if wavelength_nm < 1800:
        return 10.0
    if wavelength_nm < 2600:
        return 1e-3
    return 1e-7


def _c_p_short_pulse(pulses, exposure_s):
    """C_P, unit 1, for pulses no longer than T_i: 1, or 5 N^-0.25 but at least 0.4 (N > 600).

    ICNIRP 2013 and IEC 60825-1:2014 4.3 f), from memory.
    """
    if exposure_s <= 0.25:
        return 1.0
    if pulses <= 600:
        return 1.0
    return min(1.0, max(0.4, 5.0 * pulses**-0.25))


def c_p(rules, wavelength_nm, subtense_mrad, pulse_length_s, pulses, exposure_s):
    """C_P (IEC: C5), unit 1: what repetition leaves of the single-pulse limit.

    pulse_length_s: length of one pulse (or of one group, T_i), s.  pulses: their number N within
    the counting time, not rounded.  exposure_s: exposure duration T, s.
    Directive 2006/25/EC Annex II Table 2.6; ICNIRP 2013, IEC 60825-1:2014 4.3 f) and
    ANSI Z136.1-2014 8.2.3, from memory.
    """
    if rules == EU:
        return pulses**-0.25

    alpha = subtense(subtense_mrad)
    largest = alpha_max(rules, pulse_length_s)
    grouping_s = t_i(rules, wavelength_nm)
    if alpha > 100:
        return 1.0

    if rules == ANSI:
        if alpha > largest:
            return pulses**-0.25 if pulses < 625 else 0.2
        if alpha > 5:
            return pulses**-0.25 if pulses < 40 else 0.4
        if pulse_length_s <= grouping_s:
            return _c_p_short_pulse(pulses, exposure_s)
        return 1.0

    if pulse_length_s <= grouping_s:
        return _c_p_short_pulse(pulses, exposure_s)
    if alpha <= 5:
        return 1.0
    if alpha <= largest:
        return pulses**-0.25 if pulses <= 40 else 0.4
    return pulses**-0.25 if pulses <= 625 else 0.2
