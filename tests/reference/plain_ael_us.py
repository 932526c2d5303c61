"""Accessible emission limits of 21 CFR 1040.10(d), one value at a time, all from memory.

Wavelengths are in nm, times in s.  Every row is (tissue, effect, unit, value), a dose over the
emission duration t: a power printed in W is multiplied by t and given in J; a radiant exposure
printed in J/cm2 is given in J/m2.  Bands hold from their lower end up to, but not including, their
upper end.  The alternative Class I radiance form of extended sources is not applied (stricter).
"""

US_CLASSES = ("I", "IIa", "II", "IIIa", "IIIb")

SHORTEST_S = 1e-9
J_M2_PER_J_CM2 = 1e4


def _tissue(wavelength_nm):
    """Tissue of a band: cornea, cornea/lens, lens, retina, cornea."""
    if wavelength_nm < 302.5:
        return "cornea"
    if wavelength_nm < 315:
        return "cornea/lens"
    if wavelength_nm < 400:
        return "lens"
    if wavelength_nm < 1400:
        return "retina"
    return "cornea"


def k_1(wavelength_nm, t):
    """k1, unit 1.  21 CFR 1040.10(d) Table IV, from memory."""
    if wavelength_nm < 302.4:
        return 1.0
    if wavelength_nm < 315:
        return 10 ** ((wavelength_nm - 302.4) / 5)
    if wavelength_nm < 400:
        return 330.0
    if wavelength_nm < 700:
        return 1.0
    if wavelength_nm < 1060:
        return 10 ** ((wavelength_nm - 700) / 515)
    if wavelength_nm < 1400:
        return 5.0
    if 1535 <= wavelength_nm < 1545 and t < 1e-7:
        return 100.0
    return 1.0


def k_2(wavelength_nm, t):
    """k2, unit 1.  21 CFR 1040.10(d) Table IV, from memory."""
    if 700 <= wavelength_nm < 800:
        return max(1.0, min(t, 1e4) * (wavelength_nm - 699) / 10100)
    if 800 <= wavelength_nm < 1400:
        return max(1.0, min(t, 1e4) / 100)
    return 1.0


def _class_i(wavelength_nm, t):
    """Class I (unit, dose), t >= 1 ns.  21 CFR 1040.10(d) Table I, from memory."""
    k = k_1(wavelength_nm, t) * k_2(wavelength_nm, t)
    if wavelength_nm < 400:
        if t < 3e4:
            return ("J", 2.4e-5 * k)
        return ("J", 8.0e-10 * k * t)
    if wavelength_nm < 1400:
        if t < 2e-5:
            return ("J", 2.0e-7 * k)
        if t < 10:
            return ("J", 7.0e-4 * t**0.75 * k)
        if t < 1e4:
            return ("J", 3.9e-3 * k)
        return ("J", 3.9e-7 * k * t)
    if wavelength_nm < 2500:
        if t < 1e-7:
            return ("J", 7.9e-5 * k)
        if t < 10:
            return ("J", 4.4e-3 * t**0.25 * k)
        return ("J", 7.9e-4 * k * t)
    if t < 1e-7:
        return ("J/m2", 1.0e-2 * k * J_M2_PER_J_CM2)
    if t < 10:
        return ("J/m2", 5.6e-1 * t**0.25 * k * J_M2_PER_J_CM2)
    return ("J/m2", 1.0e-1 * t * k * J_M2_PER_J_CM2)


def _class_ii_a(wavelength_nm, t):
    """Class IIa (unit, dose), 400-710 nm, t >= 1 ns.  21 CFR 1040.10(d) Table II-A, from memory."""
    if t < 1e3:
        return _class_i(wavelength_nm, t)
    return ("J", 3.9e-6 * t)


def _class_ii(wavelength_nm, t):
    """Class II (unit, dose), 400-710 nm, t >= 1 ns.  21 CFR 1040.10(d) Table II, from memory."""
    if t < 0.25:
        return _class_i(wavelength_nm, t)
    return ("J", 1.0e-3 * t)


def _class_iii_a(wavelength_nm, t):
    """Class IIIa (unit, dose), 400-710 nm, t >= 1 ns.  21 CFR 1040.10(d) Table III-A, from memory."""
    if t < 3.8e-4:
        return _class_i(wavelength_nm, t)
    return ("J", 5.0e-3 * t)


def _class_iii_b(wavelength_nm, t):
    """Class IIIb (unit, dose), t >= 1 ns.  21 CFR 1040.10(d) Table III-B, from memory."""
    k = k_1(wavelength_nm, t) * k_2(wavelength_nm, t)
    if wavelength_nm < 400:
        if t < 0.25:
            return ("J", 3.8e-4 * k)
        return ("J", 1.5e-3 * k * t)
    if wavelength_nm < 1400:
        if t < 0.25:
            return ("J/m2", min(10.0 * k * t ** (1 / 3), 10.0) * J_M2_PER_J_CM2)
        return ("J", 0.5 * t)
    if t < 10:
        return ("J/m2", 10.0 * J_M2_PER_J_CM2)
    return ("J", 0.5 * t)


def ael_us(klass, wavelength_nm, duration_s):
    """Every row of class "I", "IIa", "II", "IIIa" or "IIIb" as (tissue, effect, "J" or "J/m2", dose).

    The tables start at 1 ns; below it the power or irradiance of the 1 ns row is kept.
    """
    if klass not in US_CLASSES:
        raise ValueError(f"unknown class {klass!r}")
    if klass in ("IIa", "II", "IIIa") and not 400 <= wavelength_nm < 710:
        return []

    t = max(duration_s, SHORTEST_S)
    if klass == "I":
        unit, dose = _class_i(wavelength_nm, t)
    elif klass == "IIa":
        unit, dose = _class_ii_a(wavelength_nm, t)
    elif klass == "II":
        unit, dose = _class_ii(wavelength_nm, t)
    elif klass == "IIIa":
        unit, dose = _class_iii_a(wavelength_nm, t)
    else:
        unit, dose = _class_iii_b(wavelength_nm, t)
    if duration_s < SHORTEST_S:
        dose = dose * duration_s / SHORTEST_S
    return [(_tissue(wavelength_nm), "thermal", unit, dose)]
