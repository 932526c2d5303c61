"""Direct beam: encircled fraction of an aperture and the zone where a limit is exceeded.

All lengths are in m, angles in rad.  A Gaussian diameter is the 1/e diameter here; a top-hat
diameter is the edge.  A beam is a dict with "profile", "diameter" (x, y) at the waist,
"divergence" (x, y), full angle, and "waist" (position along the beam).
"""

import math


def _pair(value):
    """A number or an (x, y) pair as an (x, y) pair."""
    if isinstance(value, (tuple, list)):
        x, y = value
        return float(x), float(y)
    return float(value), float(value)


def beam(line):
    """The beam of an emission line; 1/e2 Gaussian diameters and divergences become 1/e ones."""
    diameter_x, diameter_y = _pair(line["diameter_m"])
    divergence_x, divergence_y = _pair(line["divergence_rad"])
    profile = line["profile"]
    if profile not in ("gaussian", "tophat"):
        raise ValueError(f"unknown profile {profile!r}")
    scale = 1.0
    if profile == "gaussian":
        if line["level"] == "1/e2":
            scale = 1.0 / math.sqrt(2.0)
        elif line["level"] != "1/e":
            raise ValueError(f"unknown level {line['level']!r}")
    return {
        "profile": profile,
        "diameter": (diameter_x * scale, diameter_y * scale),
        "divergence": (divergence_x * scale, divergence_y * scale),
        "waist": line.get("waist_m", 0.0),
    }


def is_round(one_beam):
    """Whether both axes are equal at every distance."""
    diameter_x, diameter_y = one_beam["diameter"]
    divergence_x, divergence_y = one_beam["divergence"]
    return diameter_x == diameter_y and divergence_x == divergence_y


def diameters(one_beam, from_waist):
    """Beam diameters (x, y) in m at a distance in m from the waist: d^2 = d0^2 + (theta s)^2."""
    diameter_x, diameter_y = one_beam["diameter"]
    divergence_x, divergence_y = one_beam["divergence"]
    return (
        math.hypot(diameter_x, divergence_x * from_waist),
        math.hypot(diameter_y, divergence_y * from_waist),
    )


def _gaussian_round(a, d):
    """Fraction of a round Gaussian beam (1/e diameter d) inside a centred aperture a."""
    if d == 0:
        return 1.0
    return -math.expm1(-((a / d) ** 2))


def _gaussian_elliptical(a, dx, dy):
    """Fraction of an elliptical Gaussian beam (1/e diameters) inside a centred round aperture a.

    The beam is cut into strips along its wide axis w: a strip at (a/2) sin(theta) holds
    exp(-(a sin(theta)/w)^2) of the density and is open over erf(a cos(theta)/n) of the narrow
    axis n.  The integrand is smooth and has the period pi, so the trapezoidal sum over one period
    converges fast; it is doubled until it stands still.
    """
    wide = max(dx, dy)
    narrow = min(dx, dy)
    if wide == 0 or a / wide > 6.5:
        return 1.0
    if narrow < 1e-6 * a:
        return math.erf(a / wide)

    def strip(theta):
        c = math.cos(theta)
        return math.exp(-((a * math.sin(theta) / wide) ** 2)) * math.erf(a * c / narrow) * c

    count = 32
    total = math.fsum(strip(math.pi * i / count) for i in range(count))
    previous = total / count
    while count < 2**20:
        total += math.fsum(strip(math.pi * (i + 0.5) / count) for i in range(count))
        count *= 2
        mean = total / count
        if abs(mean - previous) <= 1e-12 * mean:
            break
        previous = mean
    return min(1.0, math.sqrt(math.pi) * a / wide * mean)


def _tophat_round(a, d):
    """Fraction of a round top-hat beam of diameter d inside a centred aperture a."""
    if d <= a:
        return 1.0
    return (a / d) ** 2


def _tophat_elliptical(a, dx, dy):
    """Fraction of an elliptical top-hat beam inside a centred round aperture a.

    Area common to the circle (radius r) and the ellipse (semi-axes p > q) over the area of the
    ellipse; they cross at x = xc, the ellipse bounding the area inside and the circle outside.
    """
    r = a / 2
    p = max(dx, dy) / 2
    q = min(dx, dy) / 2
    if r >= p:
        return 1.0
    if r <= q:
        return r * r / (p * q)
    if q == 0:
        return r / p
    xc = p * math.sqrt((r - q) * (r + q) / ((p - q) * (p + q)))
    u = min(1.0, xc / p)
    v = min(1.0, xc / r)
    inside = p * q * (math.asin(u) + u * math.sqrt(1 - u * u))
    outside = r * r * (math.acos(v) - v * math.sqrt(1 - v * v))
    return 2 * (inside + outside) / (math.pi * p * q)


def encircled_fraction(one_beam, a, from_waist):
    """Fraction of the energy inside a centred round aperture of diameter a, unit 1."""
    dx, dy = diameters(one_beam, from_waist)
    if one_beam["profile"] == "gaussian":
        if is_round(one_beam):
            return _gaussian_round(a, dx)
        return _gaussian_elliptical(a, dx, dy)
    if is_round(one_beam):
        return _tophat_round(a, dx)
    return _tophat_elliptical(a, dx, dy)


def radiant_exposure(one_beam, energy_j, a, z):
    """Radiant exposure in J/m2 averaged over the aperture a at the position z."""
    area = math.pi * a * a / 4
    return energy_j * encircled_fraction(one_beam, a, abs(z - one_beam["waist"])) / area


def _reach_round(one_beam, a, allowed):
    """Distance in m from the waist to where a round beam has widened to the allowed fraction.

    Gaussian: 1 - exp(-(a/d)^2) = allowed; top hat: (a/d)^2 = allowed;
    then d^2 = d0^2 + (theta s)^2.
    """
    if allowed >= 1:
        return 0.0
    if one_beam["profile"] == "gaussian":
        allowed_diameter = a / math.sqrt(-math.log1p(-allowed))
    else:
        allowed_diameter = a / math.sqrt(allowed)
    d0 = one_beam["diameter"][0]
    theta = one_beam["divergence"][0]
    return math.sqrt(max(0.0, (allowed_diameter - d0) * (allowed_diameter + d0))) / theta


def _reach_elliptical(one_beam, a, allowed):
    """Distance in m from the waist to where an elliptical beam has the allowed fraction left.

    The fraction falls with the distance from the waist; doubling brackets it, halving finds it.
    """
    lower = 0.0
    upper = 1e-3
    while encircled_fraction(one_beam, a, upper) > allowed:
        lower = upper
        upper *= 2
    while upper - lower > 1e-12 * upper:
        middle = (lower + upper) / 2
        if middle <= lower or middle >= upper:
            break
        if encircled_fraction(one_beam, a, middle) > allowed:
            lower = middle
        else:
            upper = middle
    return upper


def hazard(one_beam, energy_j, limit_j_m2, a):
    """(hazard ratio, zone) of one limit H in J/m2 averaged over the aperture a.

    The ratio is taken at the most hazardous accessible place, z = max(0, waist).  The zone is
    (near, far) in m, far being infinite for a beam that never widens; None if nothing is exceeded.
    """
    waist = one_beam["waist"]
    ratio = radiant_exposure(one_beam, energy_j, a, max(0.0, waist)) / limit_j_m2
    if ratio <= 1:
        return ratio, None
    if one_beam["divergence"] == (0.0, 0.0):
        return ratio, (0.0, math.inf)

    allowed = limit_j_m2 * (math.pi * a * a / 4) / energy_j
    if is_round(one_beam):
        reach = _reach_round(one_beam, a, allowed)
    else:
        reach = _reach_elliptical(one_beam, a, allowed)
    return ratio, (max(0.0, waist - reach), max(0.0, waist + reach))
