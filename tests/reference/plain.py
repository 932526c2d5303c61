"""Plain evaluation of one emission line: criteria, hazard ratio and hazard distance.

Written from the published tables alone, with scalar arithmetic, to be compared with the service.
"""

from .plain_apertures import aperture_m, default_duration
from .plain_beam import beam, hazard
from .plain_factors import EU, RULES, c_p, t_2, t_i
from .plain_limits import limits

__all__ = ["RULES", "aperture_m", "default_duration", "evaluate", "limits", "train_limits"]


def _takes_pulse_factor(rules, tissue, effect):
    """Whether C_P applies to a limit row.

    Directive 2006/25/EC Annex II Table 2.6: every thermal limit.  ICNIRP 2013,
    IEC 60825-1:2014 4.3 f) and ANSI Z136.1-2014 8.2.3: retinal thermal limits only.
    """
    if effect != "thermal":
        return False
    if rules == EU:
        return True
    return tissue == "retina"


def train_limits(rules, target, line, exposure_s):
    """Limits of one pulse of a train by the pulse-factor rule: (tissue, effect, H in J/m2).

    Pulses closer than T_i are one pulse of that length: rate x T_i of them share the limit at
    T_i and C_P counts the groups.  Directive 2006/25/EC Annex II Table 2.6; ICNIRP 2013,
    IEC 60825-1:2014 4.3 f) and ANSI Z136.1-2014 8.2.3, from memory.
    """
    wavelength_nm = line["wavelength_nm"]
    alpha = line["subtense_mrad"]
    rate = line["rate_hz"]
    grouping_s = t_i(rules, wavelength_nm)

    if rules == EU:
        counting_s = exposure_s
    else:
        counting_s = min(exposure_s, t_2(alpha))

    if grouping_s is not None and rate * grouping_s > 1:
        length_s = grouping_s
        pulses = max(1.0, counting_s / grouping_s)
        sharing = rate * grouping_s
    else:
        length_s = line["pulse_s"]
        pulses = max(1.0, rate * counting_s)
        sharing = 1.0

    rows = []
    for tissue, effect, h in limits(rules, target, wavelength_nm, length_s, alpha):
        if _takes_pulse_factor(rules, tissue, effect):
            factor = c_p(rules, wavelength_nm, alpha, length_s, pulses, exposure_s)
            rows.append((tissue, effect, h / sharing * factor))
    return rows


def _criteria_limits(rules, target, line, exposure_s):
    """Every criterion as (rule, tissue, effect, H in J/m2, duration of its aperture in s).

    H is per pulse for a pulse or a train and for the whole exposure of a continuous wave.
    """
    wavelength_nm = line["wavelength_nm"]
    alpha = line["subtense_mrad"]
    found = []

    if line["mode"] == "cw":
        for tissue, effect, h in limits(rules, target, wavelength_nm, exposure_s, alpha):
            found.append(("exposure", tissue, effect, h, exposure_s))
        return found

    if line["mode"] not in ("pulse", "train"):
        raise ValueError(f"unknown mode {line['mode']!r}")
    pulse_s = line["pulse_s"]
    for tissue, effect, h in limits(rules, target, wavelength_nm, pulse_s, alpha):
        found.append(("single", tissue, effect, h, pulse_s))
    if line["mode"] == "pulse":
        return found

    pulses = max(1.0, line["rate_hz"] * exposure_s)
    for tissue, effect, h in limits(rules, target, wavelength_nm, exposure_s, alpha):
        found.append(("average", tissue, effect, h / pulses, exposure_s))
    for tissue, effect, h in train_limits(rules, target, line, exposure_s):
        found.append(("train", tissue, effect, h, pulse_s))
    return found


def _evaluate_target(rules, target, line, exposure_s):
    """Criteria, hazard ratio, hazard distance (m) and hazard zone (m) of the eye or the skin."""
    one_beam = beam(line)
    if line["mode"] == "cw":
        energy_j = line["power_w"] * exposure_s
    else:
        energy_j = line["energy_j"]

    criteria = []
    worst_ratio = 0.0
    nears = []
    fars = []
    for rule, tissue, effect, h, duration_s in _criteria_limits(rules, target, line, exposure_s):
        a = aperture_m(rules, target, line["wavelength_nm"], duration_s, tissue)
        ratio, zone = hazard(one_beam, energy_j, h, a)
        distance_m = 0.0
        if zone is not None:
            distance_m = zone[1]
            nears.append(zone[0])
            fars.append(zone[1])
        worst_ratio = max(worst_ratio, ratio)
        criteria.append(
            {
                "rule": rule,
                "tissue": tissue,
                "effect": effect,
                "limit_j_m2": h,
                "aperture_m": a,
                "hazard_ratio": ratio,
                "hazard_distance_m": distance_m,
            }
        )
    return {
        "criteria": criteria,
        "hazard_ratio": worst_ratio,
        "hazard_distance_m": max(fars) if fars else 0.0,
        "hazard_zone_m": (min(nears), max(fars)) if fars else None,
    }


def evaluate(rules, line):
    """Eye and skin evaluation of one emission line seen directly.

    line: wavelength_nm, mode ("cw", "pulse", "train"), power_w or energy_j, pulse_s and rate_hz,
    exposure_s (None = conventional duration), subtense_mrad, profile, level, diameter_m,
    divergence_rad (full angle) and waist_m (default 0).  Distances in m, infinite if unbounded.
    """
    exposure_s = line.get("exposure_s")
    if exposure_s is None:
        exposure_s = default_duration(rules, line["wavelength_nm"])
    return {
        "eye": _evaluate_target(rules, "eye", line, exposure_s),
        "skin": _evaluate_target(rules, "skin", line, exposure_s),
    }
