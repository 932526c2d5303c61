"""Accessible emission limits of IEC 60825-1:2014, one value at a time, all from memory.

Wavelengths are in nm, times in s, angles in mrad.  Every row is (tissue, effect, unit, value), a
dose over the duration t: a power printed in W is multiplied by t and given in J, an irradiance
printed in W/m2 is multiplied by t and given in J/m2.  Bands hold from their lower end up to, but
not including, their upper end.  Sources up to 1.5 mrad take Tables 3 and 6, wider ones 4 and 7.
"""

from .plain_factors import IEC, c_a, c_b, c_c, c_e, photochemical_size_factor, subtense, t_2

IEC_CLASSES = ("1", "2", "3R", "3B")


def band_tissue(wavelength_nm):
    """Tissue of a band: cornea, cornea/lens, lens, retina, cornea.  IEC 60825-1:2014, from memory."""
    if wavelength_nm < 302.5:
        return "cornea"
    if wavelength_nm < 315:
        return "cornea/lens"
    if wavelength_nm < 400:
        return "lens"
    if wavelength_nm < 1400:
        return "retina"
    return "cornea"


def _c_1(t):
    """C1 as a number in J/m2, 302.5-400 nm.  IEC 60825-1:2014 Table 9, from memory."""
    return 5.6e3 * t**0.25


def _c_2(wavelength_nm):
    """C2 as a number in J/m2, 302.5-315 nm.  IEC 60825-1:2014 Table 9, from memory."""
    return 10 ** (0.2 * (wavelength_nm - 295))


def _t_1(wavelength_nm):
    """T1 in s, 302.5-315 nm.  IEC 60825-1:2014 Table 9, from memory."""
    return 10 ** (0.8 * (wavelength_nm - 295)) * 1e-15


def _class_1_ultraviolet(wavelength_nm, t):
    """Class 1 row, 180-400 nm, as (effect, unit, dose).  IEC 60825-1:2014 Table 3, from memory."""
    if wavelength_nm < 302.5:
        if t < 1e-9:
            return ("thermal", "J/m2", 3e10 * t)
        return ("photochemical", "J/m2", 30.0)
    if t < 1e-9:
        return ("thermal", "J", 2.4e4 * t)
    if wavelength_nm < 315:
        if t < _t_1(wavelength_nm):
            return ("thermal", "J", 7.9e-7 * _c_1(t))
        return ("photochemical", "J", 7.9e-7 * _c_2(wavelength_nm))
    if t < 10:
        return ("thermal", "J", 7.9e-7 * _c_1(t))
    if t < 1e3:
        return ("photochemical", "J", 7.9e-3)
    return ("photochemical", "J", 7.9e-6 * t)


def _class_1_below_10_s(wavelength_nm, t):
    """Class 1 retinal thermal dose in J, 400-1400 nm, t < 10 s, without C6.

    IEC 60825-1:2014 Tables 3 and 4 (the same numbers), from memory.
    """
    if wavelength_nm < 700:
        if t < 1e-11:
            return 3.8e-8
        if t < 5e-6:
            return 7.7e-8
        return 7e-4 * t**0.75
    if wavelength_nm < 1050:
        if t < 1e-11:
            return 3.8e-8 * c_a(wavelength_nm)
        if t < 5e-6:
            return 7.7e-8 * c_a(wavelength_nm)
        return 7e-4 * t**0.75 * c_a(wavelength_nm)
    if t < 1e-11:
        return 3.8e-7 * c_c(IEC, wavelength_nm)
    if t < 13e-6:
        return 7.7e-7 * c_c(IEC, wavelength_nm)
    return 3.5e-3 * t**0.75 * c_c(IEC, wavelength_nm)


def _class_1_retina_small(wavelength_nm, t):
    """Class 1 retinal rows (effect, dose in J), alpha <= 1.5 mrad.  IEC 60825-1:2014 Table 3, from memory."""
    if t < 10:
        return [("thermal", _class_1_below_10_s(wavelength_nm, t))]
    if wavelength_nm < 450:
        if t < 100:
            return [("photochemical", 3.9e-3)]
        return [("photochemical", 3.9e-5 * c_b(wavelength_nm) * t)]
    if wavelength_nm < 500:
        if t < 100:
            return [("photochemical", 3.9e-3 * c_b(wavelength_nm)), ("thermal", 3.9e-4 * t)]
        return [("photochemical", 3.9e-5 * c_b(wavelength_nm) * t)]
    if wavelength_nm < 700:
        return [("thermal", 3.9e-4 * t)]
    return [("thermal", 3.9e-4 * c_a(wavelength_nm) * c_c(IEC, wavelength_nm) * t)]


def _class_1_retina_extended(wavelength_nm, t, alpha):
    """Class 1 retinal rows (effect, dose in J), alpha > 1.5 mrad.  IEC 60825-1:2014 Table 4, from memory.

    Photochemical rows hold within the angle gamma_ph: a wider source may emit (alpha/gamma_ph)^2 more.
    """
    c_6 = c_e(IEC, alpha, t)
    if t < 10:
        return [("thermal", _class_1_below_10_s(wavelength_nm, t) * c_6)]

    if t < t_2(alpha):
        dose = 7e-4 * t**0.75
    else:
        dose = 7e-4 * t_2(alpha) ** -0.25 * t
    if wavelength_nm < 700:
        rows = [("thermal", dose * c_6)]
    else:
        rows = [("thermal", dose * c_a(wavelength_nm) * c_6 * c_c(IEC, wavelength_nm))]

    if wavelength_nm < 600:
        if t < 100:
            dose = 3.9e-3 * c_b(wavelength_nm)
        else:
            dose = 3.9e-5 * c_b(wavelength_nm) * t
        rows.append(("photochemical", dose * photochemical_size_factor(alpha, t)))
    return rows


def _class_1_cornea(wavelength_nm, t):
    """Class 1 thermal row, 1400-1e6 nm, as (unit, dose).  IEC 60825-1:2014 Table 3, from memory."""
    if wavelength_nm >= 4000:
        if t < 1e-9:
            return ("J/m2", 1e11 * t)
        if t < 1e-7:
            return ("J/m2", 100.0)
        if t < 10:
            return ("J/m2", 5.6e3 * t**0.25)
        return ("J/m2", 1000.0 * t)

    if t >= 10:
        return ("J", 1.0e-2 * t)
    if 1500 <= wavelength_nm < 1800:
        if t < 1e-9:
            return ("J", 8e6 * t)
        if t < 0.35:
            return ("J", 8e-3)
        return ("J", 1.8e-2 * t**0.75)
    if t >= 0.35:
        return ("J", 1.0e-2 * t)
    if wavelength_nm < 2600:
        if t < 1e-9:
            return ("J", 8e5 * t)
        if t < 1e-3:
            return ("J", 8e-4)
        return ("J", 4.4e-3 * t**0.25)
    if t < 1e-9:
        return ("J", 8e4 * t)
    if t < 1e-7:
        return ("J", 8e-5)
    return ("J", 4.4e-3 * t**0.25)


def _class_1(wavelength_nm, t, alpha):
    """Class 1 rows.  IEC 60825-1:2014 Tables 3 and 4, from memory.

    1250-1400 nm: also not above Class 3B, which protects the anterior eye.
    """
    tissue = band_tissue(wavelength_nm)
    if wavelength_nm < 400:
        effect, unit, dose = _class_1_ultraviolet(wavelength_nm, t)
        return [(tissue, effect, unit, dose)]
    if wavelength_nm >= 1400:
        unit, dose = _class_1_cornea(wavelength_nm, t)
        return [(tissue, "thermal", unit, dose)]

    if alpha <= 1.5:
        retinal = _class_1_retina_small(wavelength_nm, t)
    else:
        retinal = _class_1_retina_extended(wavelength_nm, t, alpha)
    rows = [(tissue, effect, "J", dose) for effect, dose in retinal]
    if 1250 <= wavelength_nm < 1400:
        rows.append(("anterior", "thermal", "J", _class_3b_dose(wavelength_nm, t)))
    return rows


def _class_2(wavelength_nm, t, alpha):
    """Class 2 rows, 400-700 nm only.  IEC 60825-1:2014 Table 5, from memory."""
    if not 400 <= wavelength_nm < 700:
        return []
    if t < 0.25:
        dose = _class_1_below_10_s(wavelength_nm, t)
    else:
        dose = 1e-3 * t
    return [("retina", "thermal", "J", dose * c_e(IEC, alpha, t))]


def _class_3r_ultraviolet(wavelength_nm, t):
    """Class 3R row, 302.5-400 nm, as (effect, dose in J).  IEC 60825-1:2014 Table 6, from memory."""
    if t < 1e-9:
        return ("thermal", 1.2e5 * t)
    if wavelength_nm < 315:
        if t < _t_1(wavelength_nm):
            return ("thermal", 4.0e-6 * _c_1(t))
        return ("photochemical", 4.0e-6 * _c_2(wavelength_nm))
    if t < 10:
        return ("thermal", 4.0e-6 * _c_1(t))
    if t < 1e3:
        return ("photochemical", 4.0e-2)
    return ("photochemical", 4.0e-5 * t)


def _class_3r_retina(wavelength_nm, t, alpha):
    """Class 3R retinal thermal dose in J, 400-1400 nm.  IEC 60825-1:2014 Tables 6 and 7, from memory."""
    c_4 = c_a(wavelength_nm)
    c_6 = c_e(IEC, alpha, t)
    c_7 = c_c(IEC, wavelength_nm)

    if wavelength_nm < 700:
        if t < 1e-11:
            return 1.9e-7 * c_6
        if t < 5e-6:
            return 3.8e-7 * c_6
        if t < 0.25:
            return 3.5e-3 * t**0.75 * c_6
        return 5.0e-3 * c_6 * t

    if t >= 10:
        if alpha <= 1.5:
            return 2.0e-3 * c_4 * c_7 * t
        if t < t_2(alpha):
            return 3.5e-3 * t**0.75 * c_4 * c_6 * c_7
        return 3.5e-3 * t_2(alpha) ** -0.25 * c_4 * c_6 * c_7 * t

    if wavelength_nm < 1050:
        if t < 1e-11:
            return 1.9e-7 * c_4 * c_6
        if t < 5e-6:
            return 3.8e-7 * c_4 * c_6
        return 3.5e-3 * t**0.75 * c_4 * c_6

    if t < 1e-11:
        return 1.9e-6 * c_6 * c_7
    if t < 13e-6:
        return 3.8e-6 * c_6 * c_7
    return 1.8e-2 * t**0.75 * c_6 * c_7


def _class_3r_cornea(wavelength_nm, t):
    """Class 3R thermal row, 1400-1e6 nm, as (unit, dose).  IEC 60825-1:2014 Table 6, from memory."""
    if wavelength_nm >= 4000:
        if t < 1e-9:
            return ("J/m2", 5e11 * t)
        if t < 1e-7:
            return ("J/m2", 500.0)
        if t < 10:
            return ("J/m2", 2.8e4 * t**0.25)
        return ("J/m2", 5000.0 * t)

    if t >= 10:
        return ("J", 5e-2 * t)
    if 1500 <= wavelength_nm < 1800:
        if t < 1e-9:
            return ("J", 4e7 * t)
        if t < 0.35:
            return ("J", 4e-2)
        return ("J", 9e-2 * t**0.75)
    if t >= 0.35:
        return ("J", 5e-2 * t)
    if wavelength_nm < 2600:
        if t < 1e-9:
            return ("J", 4e6 * t)
        if t < 1e-3:
            return ("J", 4e-3)
        return ("J", 2.2e-2 * t**0.25)
    if t < 1e-9:
        return ("J", 4e5 * t)
    if t < 1e-7:
        return ("J", 4e-4)
    return ("J", 2.2e-2 * t**0.25)


def _class_3r(wavelength_nm, t, alpha):
    """Class 3R rows; none below 302.5 nm.  IEC 60825-1:2014 Tables 6 and 7, from memory."""
    tissue = band_tissue(wavelength_nm)
    if wavelength_nm < 302.5:
        return []
    if wavelength_nm < 400:
        effect, dose = _class_3r_ultraviolet(wavelength_nm, t)
        return [(tissue, effect, "J", dose)]
    if wavelength_nm < 1400:
        return [(tissue, "thermal", "J", _class_3r_retina(wavelength_nm, t, alpha))]
    unit, dose = _class_3r_cornea(wavelength_nm, t)
    return [(tissue, "thermal", unit, dose)]


def _class_3b_dose(wavelength_nm, t):
    """Class 3B dose in J, 180-1e6 nm.  IEC 60825-1:2014 Table 8, from memory."""
    if wavelength_nm < 302.5:
        if t < 1e-9:
            return 3.8e5 * t
        if t < 0.25:
            return 3.8e-4
        return 1.5e-3 * t
    if wavelength_nm < 315:
        if t < 1e-9:
            return 1.25e4 * _c_2(wavelength_nm) * t
        if t < 0.25:
            return 1.25e-5 * _c_2(wavelength_nm)
        return 5e-5 * _c_2(wavelength_nm) * t
    if 400 <= wavelength_nm < 700:
        if t < 1e-9:
            return 3e7 * t
        if t < 0.06:
            return 0.03
        return 0.5 * t
    if 700 <= wavelength_nm < 1050:
        c_4 = c_a(wavelength_nm)
        if t < 1e-9:
            return 3e7 * c_4 * t
        if t < 0.06 * c_4:
            return 0.03 * c_4
        return 0.5 * t
    if 1050 <= wavelength_nm < 1400:
        if t < 1e-9:
            return 1.5e8 * t
        if t < 0.25:
            return 0.15
        return 0.5 * t
    if t < 1e-9:
        return 1.25e8 * t
    if t < 0.25:
        return 0.125
    return 0.5 * t


def ael_iec(klass, wavelength_nm, duration_s, subtense_mrad):
    """Every row of class "1", "2", "3R" or "3B" as (tissue, effect, "J" or "J/m2", dose)."""
    alpha = subtense(subtense_mrad)
    if klass == "1":
        return _class_1(wavelength_nm, duration_s, alpha)
    if klass == "2":
        return _class_2(wavelength_nm, duration_s, alpha)
    if klass == "3R":
        return _class_3r(wavelength_nm, duration_s, alpha)
    if klass == "3B":
        return [(band_tissue(wavelength_nm), "thermal", "J", _class_3b_dose(wavelength_nm, duration_s))]
    raise ValueError(f"unknown class {klass!r}")
