"""Plain classification of a laser product: limits, accessible emission, ratios and class.

Written from the published tables alone, with scalar arithmetic, to be compared with the service.
Conditions are 1 (telescope) and 3 (unaided) for IEC 60825-1:2014; the one condition of
21 CFR 1040.10 is numbered 1.
"""

import math

from .plain_ael_iec import IEC_CLASSES, ael_iec
from .plain_ael_us import US_CLASSES, ael_us
from .plain_beam import beam, encircled_fraction
from .plain_factors import IEC, c_p, t_2, t_i

US = "us-21cfr1040"
SCHEMES = (IEC, US)


def ael(scheme, klass, wavelength_nm, duration_s, subtense_mrad):
    """Every row of a class as (tissue, effect, "J" or "J/m2", dose over the duration).

    IEC 60825-1:2014 Tables 3 to 8; 21 CFR 1040.10(d) Tables I to III-B; from memory.
    """
    if not 180 <= wavelength_nm <= 1e6:
        raise ValueError(f"wavelength {wavelength_nm} nm is outside 180 to 1e6 nm")
    if not 1e-13 <= duration_s <= 3e4:
        raise ValueError(f"duration {duration_s} s is outside 1e-13 to 3e4 s")
    if scheme == IEC:
        return ael_iec(klass, wavelength_nm, duration_s, subtense_mrad)
    if scheme == US:
        return ael_us(klass, wavelength_nm, duration_s)
    raise ValueError(f"unknown scheme {scheme!r}")


def time_base_s(scheme, klass, wavelength_nm):
    """Time base T in s.  IEC 60825-1:2014 4.3 e); 21 CFR 1040.10(d) table limits; from memory."""
    if scheme == US:
        return {"I": 3e4, "IIa": 1e3, "II": 0.25, "IIIa": 0.25, "IIIb": 10.0}[klass]
    if klass in ("2", "3R") and 400 <= wavelength_nm < 700:
        return 0.25
    if wavelength_nm >= 400:
        return 100.0
    return 3e4


def limiting_class(scheme, klass, wavelength_nm):
    """The class whose limits a line must keep for a product of class klass.

    A line where klass has no limits keeps those of the lowest class, with its time base.
    """
    if scheme == US:
        if klass in ("IIa", "II", "IIIa") and not 400 <= wavelength_nm < 710:
            return "I"
        return klass
    if klass == "2" and not 400 <= wavelength_nm < 700:
        return "1"
    if klass == "3R" and wavelength_nm < 302.5:
        return "1"
    return klass


def _graded_aperture_m(t):
    """1 mm, 1.5 t^(3/8) mm or 3.5 mm, in m, at a duration t in s.  IEC 60825-1:2014 Table 10, from memory."""
    if t < 0.35:
        return 1e-3
    if t < 10:
        return 1.5e-3 * t**0.375
    return 3.5e-3


def has_condition_1(wavelength_nm):
    """Whether condition 1 exists: 302.5-4000 nm.  IEC 60825-1:2014 Table 10, from memory."""
    return 302.5 <= wavelength_nm < 4000


def measurement(scheme, condition, wavelength_nm, duration_s):
    """(aperture in m, distance in m) of a condition; condition 3 where there is no condition 1.

    IEC 60825-1:2014 Table 10; 21 CFR 1040.10(e); from memory.
    """
    if scheme == US:
        return 7e-3, 0.2
    if condition == 1 and has_condition_1(wavelength_nm):
        if wavelength_nm < 400:
            return 7e-3, 2.0
        if wavelength_nm < 1400:
            return 50e-3, 2.0
        return 7 * _graded_aperture_m(duration_s), 2.0
    if wavelength_nm < 302.5:
        return 1e-3, 0.0
    if wavelength_nm < 400:
        return 1e-3, 0.1
    if wavelength_nm < 1400:
        return 7e-3, 0.1
    if wavelength_nm < 4000:
        return _graded_aperture_m(duration_s), 0.1
    if wavelength_nm < 1e5:
        return _graded_aperture_m(duration_s), 0.0
    return 11e-3, 0.0


def _train_rows(klass, line, time_base):
    """Limits of one pulse of a train: (tissue, effect, unit, dose), retinal thermal rows only.

    Pulses closer than T_i are one pulse of that length: rate x T_i of them share the limit at T_i
    and C5 counts the groups within T or T2.  IEC 60825-1:2014 4.3 f), from memory.
    """
    wavelength_nm = line["wavelength_nm"]
    alpha = line["subtense_mrad"]
    rate = line["rate_hz"]
    if klass == "3B" or not 400 <= wavelength_nm < 1400:
        return []

    grouping_s = t_i(IEC, wavelength_nm)
    counting_s = min(time_base, t_2(alpha))
    if rate * grouping_s > 1:
        length_s = grouping_s
        pulses = max(1.0, counting_s / grouping_s)
        sharing = rate * grouping_s
    else:
        length_s = line["pulse_s"]
        pulses = max(1.0, rate * counting_s)
        sharing = 1.0
    c_5 = c_p(IEC, wavelength_nm, alpha, length_s, pulses, time_base)

    rows = []
    for tissue, effect, unit, dose in ael(IEC, klass, wavelength_nm, length_s, alpha):
        if tissue == "retina" and effect == "thermal":
            rows.append((tissue, effect, unit, dose / sharing * c_5))
    return rows


def criteria(scheme, klass, line):
    """Every criterion of a line as (rule, tissue, unit, limit, energy in J, duration of its aperture in s).

    Limit and energy are per pulse for a pulse or a train, and over the time base for a
    continuous wave.
    """
    wavelength_nm = line["wavelength_nm"]
    alpha = line["subtense_mrad"]
    klass = limiting_class(scheme, klass, wavelength_nm)
    time_base = time_base_s(scheme, klass, wavelength_nm)
    found = []

    if line["mode"] == "cw":
        energy_j = line["power_w"] * time_base
        for tissue, _, unit, dose in ael(scheme, klass, wavelength_nm, time_base, alpha):
            found.append(("exposure", tissue, unit, dose, energy_j, time_base))
        return found

    if line["mode"] not in ("pulse", "train"):
        raise ValueError(f"unknown mode {line['mode']!r}")
    pulse_s = line["pulse_s"]
    energy_j = line["energy_j"]
    for tissue, _, unit, dose in ael(scheme, klass, wavelength_nm, pulse_s, alpha):
        found.append(("single", tissue, unit, dose, energy_j, pulse_s))
    if line["mode"] == "pulse":
        return found

    pulses = max(1.0, line["rate_hz"] * time_base)
    for tissue, _, unit, dose in ael(scheme, klass, wavelength_nm, time_base, alpha):
        found.append(("average", tissue, unit, dose / pulses, energy_j, time_base))
    if scheme == IEC:
        for tissue, _, unit, dose in _train_rows(klass, line, time_base):
            found.append(("train", tissue, unit, dose, energy_j, pulse_s))
    return found


def _accessible(scheme, condition, line, energy_j, duration_s, unit):
    """Accessible emission in J, or in J/m2 averaged over the aperture."""
    aperture, distance = measurement(scheme, condition, line["wavelength_nm"], duration_s)
    one_beam = beam(line)
    z = max(distance, one_beam["waist"])
    collected = energy_j * encircled_fraction(one_beam, aperture, abs(z - one_beam["waist"]))
    if unit == "J/m2":
        return collected / (math.pi * aperture * aperture / 4)
    return collected


def _additivity_group(wavelength_nm, tissue):
    """Lines of one group add.  IEC 60825-1:2014 additivity table (eye), as in BGI 832 Tabelle 1."""
    if wavelength_nm < 315:
        return "180-315"
    if wavelength_nm < 400 or wavelength_nm >= 1400:
        return "315-400 and 1400-1e6"
    if tissue == "anterior":
        return "400-1400 anterior"
    return "400-1400 retina"


def class_ratio(scheme, klass, condition, lines):
    """Worst sum, over the additivity groups, of accessible emission over limit; unit 1."""
    aided = any(has_condition_1(line["wavelength_nm"]) for line in lines)
    if scheme == IEC and condition == 1 and not aided:
        return 0.0

    sums = {}
    for line in lines:
        worst = {}
        for _, tissue, unit, limit, energy_j, duration_s in criteria(scheme, klass, line):
            ratio = _accessible(scheme, condition, line, energy_j, duration_s, unit) / limit
            group = _additivity_group(line["wavelength_nm"], tissue)
            worst[group] = max(worst.get(group, 0.0), ratio)
        for group, ratio in worst.items():
            sums[group] = sums.get(group, 0.0) + ratio
    return max(sums.values())


def _decide_iec(lines, ratios):
    """Class from the ratios.  IEC 60825-1:2014 4.3 and 5.3, from memory."""

    def within(klass, condition):
        return ratios[(klass, condition)] <= 1

    aided = any(has_condition_1(line["wavelength_nm"]) for line in lines)
    visible = any(400 <= line["wavelength_nm"] < 700 for line in lines)
    if within("1", 1) and within("1", 3):
        return "1"
    if aided and within("1", 3) and within("3B", 1):
        return "1M"
    if visible and within("2", 1) and within("2", 3):
        return "2"
    if visible and within("2", 3) and within("3B", 1):
        return "2M"
    if within("3R", 1) and within("3R", 3):
        return "3R"
    if within("3B", 1) and within("3B", 3):
        return "3B"
    return "4"


def _decide_us(lines, ratios):
    """Class from the ratios.  21 CFR 1040.10(c) and (d), from memory."""
    visible = any(400 <= line["wavelength_nm"] < 710 for line in lines)
    for klass in US_CLASSES:
        if klass in ("IIa", "II", "IIIa") and not visible:
            continue
        if ratios[(klass, 1)] <= 1:
            return klass
    return "IV"


def classify(scheme, lines):
    """{"class": name, "ratios": {(class, condition): ratio}} of a product with these lines.

    A line: wavelength_nm, mode ("cw", "pulse", "train"), power_w or energy_j, pulse_s and rate_hz,
    subtense_mrad, profile, level, diameter_m, divergence_rad (full angle) and waist_m (default 0).
    """
    if not lines:
        raise ValueError("no emission line")
    if scheme == IEC:
        classes, conditions, decide = IEC_CLASSES, (1, 3), _decide_iec
    elif scheme == US:
        classes, conditions, decide = US_CLASSES, (1,), _decide_us
    else:
        raise ValueError(f"unknown scheme {scheme!r}")
    ratios = {}
    for klass in classes:
        for condition in conditions:
            ratios[(klass, condition)] = class_ratio(scheme, klass, condition, lines)
    return {"class": decide(lines, ratios), "ratios": ratios}
