"""Exposure limits, one wavelength and one duration at a time.

`limits` lists every row that applies as (tissue, effect, radiant exposure in J/m2).
"""

from .plain_eu import eu_eye, eu_skin
from .plain_factors import ANSI, EU, IEC, RULES
from .plain_rows import (
    corneal_infrared,
    retina_photochemical,
    retina_thermal,
    skin_400_to_1400,
    ultraviolet_by_steps,
    ultraviolet_iec,
    ultraviolet_tissue,
)


def _ultraviolet(rules, wavelength_nm, t):
    """(effect, H in J/m2) rows, 180-400 nm.

    IEC 60825-1:2014 Tables A.1/A.2; ICNIRP 2013; ANSI Z136.1-2014 Table 5a; from memory.
    """
    if rules == IEC:
        return ultraviolet_iec(wavelength_nm, t)
    return ultraviolet_by_steps(wavelength_nm, t)


def _anterior(rules, wavelength_nm, t):
    """Thermal rows (H in J/m2) that protect cornea, iris and lens below 1400 nm.

    ICNIRP 2013 and IEC 60825-1:2014 Annex A, 1250-1400 nm: the skin limit.
    ANSI Z136.1-2014, 1200-1400 nm: its own corneal limit is not known; the stricter 1400-1500 nm
    corneal rows stand in.
    """
    if rules == ANSI:
        if 1200 <= wavelength_nm < 1400:
            return [("anterior", "thermal", corneal_infrared(1400.0, t))]
        return []
    if 1250 <= wavelength_nm < 1400:
        return [("anterior", "thermal", skin_400_to_1400(wavelength_nm, t))]
    return []


def _eye(rules, wavelength_nm, t, subtense_mrad):
    """Eye rows (tissue, effect, H in J/m2).

    ICNIRP 2013; IEC 60825-1:2014 Tables A.1/A.2; ANSI Z136.1-2014 Tables 5a-5f; from memory.
    """
    if wavelength_nm < 400:
        tissue = ultraviolet_tissue(rules, wavelength_nm)
        return [(tissue, effect, h) for effect, h in _ultraviolet(rules, wavelength_nm, t)]
    if wavelength_nm < 1400:
        rows = [("retina", "thermal", retina_thermal(rules, wavelength_nm, t, subtense_mrad))]
        if wavelength_nm < 600 and t >= 10:
            h = retina_photochemical(wavelength_nm, t, subtense_mrad)
            rows.append(("retina", "photochemical", h))
        return rows + _anterior(rules, wavelength_nm, t)
    return [("cornea", "thermal", corneal_infrared(wavelength_nm, t))]


def _skin(rules, wavelength_nm, t):
    """Skin rows (tissue, effect, H in J/m2), without any large-area rule.

    ICNIRP 2013; IEC 60825-1:2014 Table A.5; ANSI Z136.1-2014 Table 7; from memory.
    """
    if wavelength_nm < 400:
        if rules == ANSI and wavelength_nm >= 315 and t >= 1e3:
            return [("skin", "photochemical", 10.0 * t)]
        return [("skin", effect, h) for effect, h in _ultraviolet(rules, wavelength_nm, t)]
    if wavelength_nm < 1400:
        return [("skin", "thermal", skin_400_to_1400(wavelength_nm, t))]
    return [("skin", "thermal", corneal_infrared(wavelength_nm, t))]


def limits(rules, target, wavelength_nm, duration_s, subtense_mrad):
    """Every row that applies, as (tissue, effect, H in J/m2 for the duration).

    rules: rule set id.  target: "eye" or "skin".  wavelength in nm (180 to 1e6), duration in s
    (1e-13 to 3e4), angular subtense of the source in mrad.
    """
    if rules not in RULES:
        raise ValueError(f"unknown rule set {rules!r}")
    if target not in ("eye", "skin"):
        raise ValueError(f"unknown target {target!r}")
    if not 180 <= wavelength_nm <= 1e6:
        raise ValueError(f"wavelength {wavelength_nm} nm is outside 180 to 1e6 nm")
    if not 1e-13 <= duration_s <= 3e4:
        raise ValueError(f"duration {duration_s} s is outside 1e-13 to 3e4 s")

    if rules == EU:
        if target == "eye":
            return eu_eye(wavelength_nm, duration_s, subtense_mrad)
        return eu_skin(wavelength_nm, duration_s)
    if target == "eye":
        return _eye(rules, wavelength_nm, duration_s, subtense_mrad)
    return _skin(rules, wavelength_nm, duration_s)
